/**
 * How well a fitted plant foretells a piece of the log it has not seen, what is left over, and in which
 * conditions it fails.
 */
import type { Build } from '../craft/build.ts';
import type { AxisPiece, PlantParameters } from './axisData.ts';
import type { AxisFit } from './axisFitter.ts';
import { plantOf } from './fitAxis.ts';
import { DisturbanceFilter } from './disturbanceFilter.ts';
import { meanCommand_us, unitResponse } from './plantResponse.ts';
import { crossSpectra } from './spectra.ts';

/** Length of each simulation over the validation piece: several lags of a motor. */
export const HORIZON_S = 0.3;
const WARM_UP_S = 0.5;
const LINE_OVER_MEDIAN = 20;
const MOST_LINES = 6;
/** Below this what is left over is motion the model missed, not vibration. */
const LOWEST_LINE_HZ = 15;

export interface Validation {
  readonly t_s: Float64Array;
  readonly measured_dps: Float64Array;
  /** Simulated from the command, started anew every HORIZON_S from what was known then. */
  readonly simulated_dps: Float64Array;
  /** 100 (1 − ‖y − ŷ‖/‖y − mean y‖). */
  readonly fit_pct: number;
  readonly seconds: number;
}

/** Runs the fit over pieces that were held back; null when they are too short. */
export function validate(
  pieces: readonly AxisPiece[],
  plant: PlantParameters,
  fit: AxisFit,
): Validation | null {
  const t: number[] = [];
  const measured: number[] = [];
  const simulated: number[] = [];
  let seconds = 0;
  for (const piece of pieces) {
    const period_s = piece.t_s[1] - piece.t_s[0];
    const first = Math.ceil(WARM_UP_S / period_s);
    const horizon = Math.max(2, Math.round(HORIZON_S / period_s));
    if (piece.t_s.length < first + 2 * horizon) continue;
    const { response, forecast } = foretell(piece, plant, fit, first, horizon);
    seconds += piece.t_s[piece.t_s.length - 1] - piece.t_s[first];
    for (let k = first; k < piece.t_s.length; k++) {
      if (Number.isNaN(piece.y_dps[k])) continue;
      t.push(piece.t_s[k]);
      measured.push(piece.y_dps[k]);
      simulated.push(response[k] + forecast[k]);
    }
  }
  if (t.length < 50) return null;
  const mean = measured.reduce((sum, y) => sum + y, 0) / measured.length;
  let off = 0;
  let all = 0;
  measured.forEach((y, k) => {
    off += (y - simulated[k]) ** 2;
    all += (y - mean) ** 2;
  });
  return {
    t_s: Float64Array.from(t),
    measured_dps: Float64Array.from(measured),
    simulated_dps: Float64Array.from(simulated),
    fit_pct: all > 0 ? 100 * (1 - Math.sqrt(off / all)) : 0,
    seconds,
  };
}

function foretell(piece: AxisPiece, plant: PlantParameters, fit: AxisFit, first: number, horizon: number) {
  const n = piece.t_s.length;
  const { response, shape, gain } = openResponse(piece, plant);
  const filter = new DisturbanceFilter(piece);
  filter.prepare(fit.noise, { gain, ...shape });
  const residual = piece.y_dps.map((y, k) => y - response[k]);
  const forecast = new Float64Array(n);
  filter.forecast(residual, first, horizon, forecast);
  const innovation = new Float64Array(n);
  filter.innovations(residual, innovation);
  return { response, forecast, innovation };
}

/** What the command alone makes of the plant, deg/s. */
function openResponse(piece: AxisPiece, plant: PlantParameters) {
  const { lag_s, delay_s, lead_s = 0, damping_per_s = 0, gain_dps2_per_us: gain } = plant;
  const shape = { lag_s, delay_s, lead_s, damping_per_s };
  const response = new Float64Array(piece.t_s.length);
  unitResponse(piece, shape, meanCommand_us(piece), response);
  for (let k = 0; k < response.length; k++) response[k] *= gain;
  return { response, shape, gain };
}

/** 1 − power of what the plant leaves over / power of the rate, between 0.7 and 10 Hz, mean of the logarithms. */
export function explainedShare(pieces: readonly AxisPiece[], fit: AxisFit, period_s: number): number {
  const residual = pieces.map((piece) => openLoopResidual(piece, fit));
  const runs = residual.map(({ y, r }) => [y, r]);
  const longest = runs.reduce((most, run) => Math.max(most, run[0].length), 0);
  const segment = 2 ** Math.floor(Math.log2(Math.max(32, Math.min(2 / period_s, longest))));
  const spectra = crossSpectra(runs, 1 / period_s, segment);
  let logs = 0;
  let weight = 0;
  spectra.f_Hz.forEach((f, k) => {
    if (f < 0.7 || f > 10 || spectra.auto[0][k] === 0) return;
    // Equal weight per octave.
    logs += Math.log(spectra.auto[1][k] / spectra.auto[0][k]) / f;
    weight += 1 / f;
  });
  return weight > 0 ? 1 - Math.exp(logs / weight) : 0;
}

function openLoopResidual(piece: AxisPiece, fit: AxisFit): { y: Float64Array; r: Float64Array } {
  const { response } = openResponse(piece, plantOf(fit));
  const y = piece.y_dps.slice();
  for (let k = 0; k < y.length; k++) if (Number.isNaN(y[k])) y[k] = k > 0 ? y[k - 1] : 0;
  return { y, r: y.map((value, k) => value - response[k]) };
}

// --- What is left over --------------------------------------------------------------------------------------

export interface ResidualLine {
  readonly f_Hz: number;
  /** Amplitude of the line, deg/s. */
  readonly amplitude_dps: number;
  /** What it fits: once per turn, blade pass, or null. */
  readonly order: 'once per turn' | 'blade pass' | null;
}

export interface Residual {
  readonly t_s: Float64Array;
  /** One-step prediction errors, deg/s. */
  readonly error_dps: Float64Array;
  readonly f_Hz: Float64Array;
  /** (deg/s)²/Hz. */
  readonly density: Float64Array;
  readonly lines: readonly ResidualLine[];
}

/**
 * Prediction errors over all pieces, their spectrum and its lines.
 * @param rotor_Hz mean turns per second of the rotors over the pieces, when known
 */
export function residualOf(
  pieces: readonly AxisPiece[],
  plant: PlantParameters,
  fit: AxisFit,
  period_s: number,
  rotor_Hz: number | null,
  build: Build,
): Residual {
  const t: number[] = [];
  const errors: number[] = [];
  const runs: Float64Array[][] = [];
  for (const piece of pieces) {
    const first = Math.ceil(WARM_UP_S / period_s);
    if (piece.t_s.length < 2 * first) continue;
    const { innovation } = foretell(piece, plant, fit, first, first);
    runs.push([innovation.subarray(first)]);
    for (let k = first; k < innovation.length; k++) {
      if (Number.isNaN(piece.y_dps[k])) continue;
      t.push(piece.t_s[k]);
      errors.push(innovation[k]);
    }
  }
  const longest = runs.reduce((most, run) => Math.max(most, run[0].length), 0);
  const segment = Math.min(1024, 2 ** Math.floor(Math.log2(Math.max(2, longest))));
  const spectra = crossSpectra(runs, 1 / period_s, segment);
  const density = spectra.auto[0] ?? new Float64Array(0);
  return {
    t_s: Float64Array.from(t),
    error_dps: Float64Array.from(errors),
    f_Hz: spectra.f_Hz,
    density,
    lines: findLines(spectra.f_Hz, density, rotor_Hz, build.propeller.blades ?? 2, 1 / period_s),
  };
}

/** Peaks far above the median of the density; half-width two bins, as a Hann window makes them. */
function findLines(
  f_Hz: Float64Array,
  density: Float64Array,
  rotor_Hz: number | null,
  blades: number,
  rate_Hz: number,
): ResidualLine[] {
  const median = Float64Array.from(density).sort()[density.length >> 1] ?? 0;
  const bin_Hz = f_Hz.length > 1 ? f_Hz[1] : 1;
  const lines: ResidualLine[] = [];
  for (let k = 3; k + 3 < density.length; k++) {
    const around = density.subarray(k - 3, k + 4);
    if (
      f_Hz[k] < LOWEST_LINE_HZ ||
      density[k] < LINE_OVER_MEDIAN * median ||
      around.some((value) => value > density[k])
    )
      continue;
    let power = 0;
    for (let j = k - 3; j <= k + 3; j++) power += density[j] * bin_Hz;
    lines.push({
      f_Hz: f_Hz[k],
      amplitude_dps: Math.sqrt(2 * power),
      order: orderOf(f_Hz[k], rotor_Hz, blades, rate_Hz),
    });
  }
  return lines.sort((a, b) => b.amplitude_dps - a.amplitude_dps).slice(0, MOST_LINES);
}

function orderOf(
  f_Hz: number,
  rotor_Hz: number | null,
  blades: number,
  rate_Hz: number,
): ResidualLine['order'] {
  if (rotor_Hz === null) return null;
  // Sampling folds what lies above half the rate.
  const folded = (f: number) => Math.abs(f - rate_Hz * Math.round(f / rate_Hz));
  const near = (f: number) => Math.abs(folded(f) - f_Hz) < 0.06 * f + 1;
  if (near(rotor_Hz)) return 'once per turn';
  return near(blades * rotor_Hz) ? 'blade pass' : null;
}

/** Root mean square of the errors at the instants for which `holds` is true and for the rest. */
export function errorWhere(
  residual: Residual,
  holds: (t_s: number) => boolean,
): { inside: number; outside: number; share: number } {
  let inside = 0;
  let outside = 0;
  let count = 0;
  const n = residual.t_s.length;
  for (let k = 0; k < n; k++) {
    const square = residual.error_dps[k] ** 2;
    if (holds(residual.t_s[k])) {
      inside += square;
      count++;
    } else outside += square;
  }
  return {
    inside: count > 0 ? Math.sqrt(inside / count) : 0,
    outside: count < n ? Math.sqrt(outside / (n - count)) : 0,
    share: n > 0 ? count / n : 0,
  };
}
