/**
 * Check by simulation: a sum of sines on one axis's setpoint through the full nonlinear flight in hover, moored by
 * the bench, with its noise, limits and quantised commands; the measured loop over the computed one. The excitation
 * is periodic, so every line falls on a bin and needs no window; it serves as instrument, so that the feedback of
 * noise does not bias the result (Tischler & Remple, ch. 8 and 12: sine sweeps, coherence above 0.6).
 */
import FFT from 'fft.js';
import type { Build } from '../craft/build.ts';
import type { AxisName, Gains } from '../craft/gains.ts';
import { withoutPayload } from '../craft/payload.ts';
import { CALM } from '../craft/wind.ts';
import { NEUTRAL_STICKS, type Sticks } from '../flight/pilot.ts';
import { runFlight } from '../flight/run.ts';
import { RandomStream } from '../math/random.ts';
import { axisModels } from './axisModel.ts';
import { argument, complex, magnitude, over, times, type Complex } from './complex.ts';
import { marginsOfLoop } from './analysis.ts';
import { closedLoopAt, feedbackAt, openLoopAt, rateLoop } from './rateLoop.ts';

export interface SweepOptions {
  /** Root mean square of the excitation, deg/s. */
  readonly rms_dps?: number;
  readonly seed?: number;
  /** State of charge to fly at; the build's own when absent. */
  readonly charge?: number;
  readonly payloadReleased?: boolean;
}

export interface SweepCheck {
  readonly f_Hz: Float64Array;
  readonly measured_dB: Float64Array;
  readonly measured_deg: Float64Array;
  readonly computed_dB: Float64Array;
  readonly computed_deg: Float64Array;
  /** Measured over computed: of the loop, and of the closed loop from setpoint to gyro. */
  readonly difference_dB: Float64Array;
  readonly difference_deg: Float64Array;
  readonly closedDifference_dB: Float64Array;
  readonly closedDifference_deg: Float64Array;
  /** Share of the gyro's and the command's power that repeats with the excitation, 0…1; the lower of the two. */
  readonly coherence: Float64Array;
  readonly crossover_Hz: number | null;
  /** Largest differences of the loop up to crossover, where coherence is above 0.6. */
  readonly worst_dB: number;
  readonly worst_deg: number;
  readonly statement: string;
}

/** Below, a moored craft's travel sets the answer, not its rate loop. */
const LOW_HZ = 0.8;
const HIGH_HZ = 60;
const LINES = 48;
/** Shortest period, s; the next power of two of ticks is taken. */
const PERIOD_S = 8;
const SETTLING_PERIODS = 1;
const PERIODS = 6;
const DEFAULT_RMS_DPS = 25;
const HEIGHT_M = 50;
export const LEAST_COHERENCE = 0.6;
const AGREES_DB = 0.5;
const AGREES_DEG = 3;

/**
 * Flies the excitation and compares.
 * @throws RangeError when the craft cannot hover, or when the flight diverges (unstable gains)
 */
export function sweepMeasure(
  build: Build,
  gains: Gains,
  axis: AxisName,
  options: SweepOptions = {},
): SweepCheck {
  const flown = prepared(build, options);
  const excitation = multisine(gains.loop_Hz, options.rms_dps ?? DEFAULT_RMS_DPS, options.seed ?? 1);
  const spectra = fly(flown, gains, axis, excitation, options.seed ?? 1);
  const loop = rateLoop(axisModels(flown)[axis].drifting, gains, axis);
  const crossover_Hz = marginsOfLoop(loop, []).crossover_Hz;
  const { bins, period } = excitation;
  const f_Hz = bins.map((bin) => (bin * gains.loop_Hz) / period);
  const omegas = f_Hz.map((f) => 2 * Math.PI * f);
  const computed = Array.from(omegas, (omega) => openLoopAt(loop, omega));
  const measured = Array.from(omegas, (omega, i) =>
    times(over(spectra.gyro[i], spectra.command[i]), feedbackAt(loop, omega)),
  );
  const ratios = measured.map((one, i) => over(one, computed[i]));
  const closed = Array.from(omegas, (omega, i) =>
    over(over(spectra.gyro[i], spectra.setpoint[i]), closedLoopAt(loop, omega)),
  );
  const result = {
    f_Hz,
    measured_dB: decibels(measured),
    measured_deg: unwrapped(measured),
    computed_dB: decibels(computed),
    computed_deg: unwrapped(computed),
    difference_dB: decibels(ratios),
    difference_deg: Float64Array.from(ratios, degrees),
    closedDifference_dB: decibels(closed),
    closedDifference_deg: Float64Array.from(closed, degrees),
    coherence: spectra.coherence,
    crossover_Hz,
  };
  return { ...result, ...verdict(result) };
}

function prepared(build: Build, options: SweepOptions): Build {
  const carried = options.payloadReleased === true ? withoutPayload(build) : build;
  if (options.charge === undefined) return carried;
  return { ...carried, battery: { ...carried.battery, charge: options.charge } };
}

interface Multisine {
  /** Ticks of a period, a power of two. */
  readonly period: number;
  readonly bins: Float64Array;
  /** One period, deg/s. */
  readonly signal_dps: Float64Array;
}

/** Odd bins only, spaced by their logarithm: even-order distortion of the motors falls between them. */
function multisine(loop_Hz: number, rms_dps: number, seed: number): Multisine {
  const period = 2 ** Math.ceil(Math.log2(PERIOD_S * loop_Hz));
  const high_Hz = Math.min(HIGH_HZ, 0.4 * loop_Hz);
  const bins = new Set<number>();
  for (let k = 0; k < LINES; k++) {
    const f = LOW_HZ * (high_Hz / LOW_HZ) ** (k / (LINES - 1));
    bins.add(2 * Math.round(((f / loop_Hz) * period - 1) / 2) + 1);
  }
  const random = new RandomStream(seed, 'shaping.sweep');
  const signal_dps = new Float64Array(period);
  const amplitude = rms_dps * Math.sqrt(2 / bins.size);
  for (const bin of bins) {
    const phase = 2 * Math.PI * random.uniform();
    for (let n = 0; n < period; n++)
      signal_dps[n] += amplitude * Math.cos((2 * Math.PI * ((bin * n) % period)) / period + phase);
  }
  return { period, bins: Float64Array.from(bins), signal_dps };
}

interface LineSpectra {
  /** Mean over the periods, relative to the excitation's own line. */
  readonly setpoint: readonly Complex[];
  readonly gyro: readonly Complex[];
  readonly command: readonly Complex[];
  readonly coherence: Float64Array;
}

function fly(build: Build, gains: Gains, axis: AxisName, excitation: Multisine, seed: number): LineSpectra {
  const { period, signal_dps, bins } = excitation;
  const sticks: Sticks = { ...NEUTRAL_STICKS, armed: true, moored: true, throttle: 0.5 };
  const names = [`sp_${axis}_dps`, `gyro_${axis}_dps`, `u_${axis}_us`];
  const { record, stopped } = runFlight(
    { build, gains, wind: CALM, seed, start: { kind: 'hover', height_m: HEIGHT_M } },
    ((SETTLING_PERIODS + PERIODS) * period) / gains.loop_Hz,
    (_time, flight) => {
      sticks[axis] = signal_dps[flight.tickIndex % period] / gains.maxRate_dps[axis];
      return sticks;
    },
    names,
  );
  if (stopped !== null)
    throw new RangeError(`the flight diverged after ${stopped.time_s.toFixed(2)} s: ${stopped.what}`);
  const fft = new FFT(period);
  const transform = fft.createComplexArray() as number[];
  const lines = names.map((name) => {
    const column = record.column(name);
    return Array.from({ length: PERIODS }, (_, p) => {
      const start = (SETTLING_PERIODS + p) * period;
      fft.realTransform(transform, Array.from(column.subarray(start, start + period)));
      return Array.from(bins, (bin) => complex(transform[2 * bin], transform[2 * bin + 1]));
    });
  });
  const [setpoint, gyro, command] = lines.map((periods) => meanOf(periods));
  const [, gyroShare, commandShare] = lines.map((periods) => repeating(periods));
  return {
    setpoint,
    gyro,
    command,
    coherence: Float64Array.from(gyroShare, (share, i) => Math.min(share, commandShare[i])),
  };
}

function meanOf(periods: readonly (readonly Complex[])[]): Complex[] {
  return periods[0].map((_, i) =>
    complex(
      periods.reduce((sum, one) => sum + one[i].re, 0) / periods.length,
      periods.reduce((sum, one) => sum + one[i].im, 0) / periods.length,
    ),
  );
}

/** |mean|² over the mean square: the coherence with an excitation that is the same in each period. */
function repeating(periods: readonly (readonly Complex[])[]): number[] {
  return meanOf(periods).map((mean, i) => {
    const power = periods.reduce((sum, one) => sum + magnitude(one[i]) ** 2, 0) / periods.length;
    return power === 0 ? 0 : magnitude(mean) ** 2 / power;
  });
}

const degrees = (value: Complex) => (argument(value) * 180) / Math.PI;
const decibels = (values: readonly Complex[]) =>
  Float64Array.from(values, (value) => 20 * Math.log10(magnitude(value)));

/** From the low end, where a rate loop lies between −180° and 0. */
function unwrapped(values: readonly Complex[]): Float64Array {
  let last = -90;
  return Float64Array.from(values, (value) => {
    const phase = degrees(value);
    last = phase - 360 * Math.round((phase - last) / 360);
    return last;
  });
}

function verdict(
  result: Omit<SweepCheck, 'worst_dB' | 'worst_deg' | 'statement'>,
): Pick<SweepCheck, 'worst_dB' | 'worst_deg' | 'statement'> {
  const top = result.crossover_Hz ?? Infinity;
  let worst_dB = 0;
  let worst_deg = 0;
  let at_Hz = 0;
  let lines = 0;
  result.f_Hz.forEach((f, i) => {
    if (f > top || result.coherence[i] < LEAST_COHERENCE) return;
    lines++;
    worst_dB = Math.max(worst_dB, Math.abs(result.difference_dB[i]));
    if (Math.abs(result.difference_deg[i]) > worst_deg) at_Hz = f;
    worst_deg = Math.max(worst_deg, Math.abs(result.difference_deg[i]));
  });
  if (lines === 0) {
    return {
      worst_dB,
      worst_deg,
      statement: 'nothing measured: no line up to crossover stands clear of the noise',
    };
  }
  const sizes = `${worst_dB.toFixed(2)} dB and ${worst_deg.toFixed(1)}° up to crossover`;
  const agrees = worst_dB <= AGREES_DB && worst_deg <= AGREES_DEG;
  return {
    worst_dB,
    worst_deg,
    statement: agrees
      ? `the flight agrees with the linear model within ${sizes}`
      : `the flight differs from the linear model by up to ${sizes}, most at ${at_Hz.toFixed(1)} Hz`,
  };
}
