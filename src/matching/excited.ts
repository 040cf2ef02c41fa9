/**
 * Is an axis excited, and where? A fit without a manoeuvre would describe the controller's answer to noise and
 * gusts, not the craft.
 */
import type { AxisName } from '../craft/gains.ts';
import type { Column } from './log.ts';
import { crossSpectra, measuredResponse, type CrossSpectra, type MeasuredResponse } from './spectra.ts';
import { trustedBins } from './startValues.ts';
import { activeSpans, spanSeconds, type LeftOut, type Span, type UsableRows } from './usable.ts';

/** Rows of one axis that are fitted at most: more make the fit slower, not better. */
const MOST_FITTED_ROWS = 40_000;
/** Share of the excited time that is fitted; the rest is held back for the check. */
export const FITTED_SHARE = 0.75;
export const LEAST_USABLE_S = 6;
/** A setpoint that moves less than this is no manoeuvre, deg/s rms. */
const LEAST_SETPOINT_DPS = 2;
const LEAST_RATE_DPS = 3;
const SEGMENT_S = 3;
const LEAST_SEGMENTS = 4;
const LEAST_BINS = 5;
/** The trusted band must span an octave. */
const LEAST_BAND_RATIO = 2;

export interface ExcitedParts {
  readonly spans: readonly Span[];
  readonly leftOut: readonly LeftOut[];
  readonly spectra: CrossSpectra;
  readonly response: MeasuredResponse;
  /** The rate follows the setpoint with coherence above 0.6 over an octave or more. */
  readonly coherent: boolean;
  readonly trusted: number;
  readonly seconds: number;
  readonly setpointRms_dps: number;
  readonly rateRms_dps: number;
}

/** The setpoint moves and carries the response; otherwise the fit has to show that the command does. */
export function excitedBySetpoint(parts: ExcitedParts, scale: number): boolean {
  return parts.coherent && scale * parts.setpointRms_dps >= LEAST_SETPOINT_DPS;
}

/**
 * Why the axis is not excited, or null.
 * @param scale deg/s per unit of the rates, where the unit is in doubt
 */
export function refusalOf(axis: AxisName, parts: ExcitedParts, scale: number): string | null {
  const { seconds, setpointRms_dps, rateRms_dps, trusted } = parts;
  if (seconds < LEAST_USABLE_S) {
    return `Not excited: ${axis} moves in only ${seconds.toFixed(1)} s of the usable log; ${LEAST_USABLE_S} s are the least.`;
  }
  if (excitedBySetpoint(parts, scale)) return null;
  if (scale * rateRms_dps < LEAST_RATE_DPS) {
    return `Not excited: the ${axis} setpoint moves by ${setpointRms_dps.toFixed(1)} deg/s rms and the rate by ${rateRms_dps.toFixed(1)} deg/s rms; noise and gusts alone do not show the plant. Fly ${axis} doublets or a sweep.`;
  }
  if (scale * setpointRms_dps >= LEAST_SETPOINT_DPS) {
    return `Not excited enough: the ${axis} rate follows the setpoint with coherence above 0.6 in ${trusted} of the frequencies only; an octave is the least.`;
  }
  return null;
}

/**
 * Looks for the manoeuvres of one axis.
 * @param setpoint null when the log has none
 */
export function excitedParts(
  usable: UsableRows,
  period_s: number,
  setpoint: Column | null,
  u_us: Column,
  y_dps: Column,
): ExcitedParts {
  const rms = setpoint === null ? 0 : rmsOver(usable.spans, setpoint);
  const moving = rms > 0 ? setpoint : null;
  const { spans, leftOut } = activeSpans(
    usable.spans,
    moving ?? y_dps,
    period_s,
    MOST_FITTED_ROWS / FITTED_SHARE,
  );
  const signals = moving === null ? [u_us, y_dps] : [moving, u_us, y_dps];
  const spectra = spectraOf(spans, signals, period_s);
  const response = measuredResponse(spectra);
  const seconds = spans.reduce((sum, span) => sum + spanSeconds(span), 0);
  const bins = trustedBins(response);
  const ratio = bins.length > 0 ? response.f_Hz[bins[bins.length - 1]] / response.f_Hz[bins[0]] : 0;
  const coherent =
    bins.length >= LEAST_BINS && ratio >= LEAST_BAND_RATIO && spectra.segments >= LEAST_SEGMENTS;
  return {
    spans,
    leftOut,
    spectra,
    response,
    coherent: moving !== null && coherent,
    trusted: bins.length,
    seconds,
    setpointRms_dps: rms,
    rateRms_dps: rmsOver(spans, y_dps),
  };
}

function rmsOver(spans: readonly Span[], column: Column): number {
  let sum = 0;
  let square = 0;
  let count = 0;
  for (const { stretch, begin, end } of spans) {
    for (let i = begin; i < end; i++) {
      const row = stretch.row[i];
      if (row < 0) continue;
      sum += column[row];
      square += column[row] ** 2;
      count++;
    }
  }
  return count > 1 ? Math.sqrt(Math.max(0, square / count - (sum / count) ** 2)) : 0;
}

function spectraOf(spans: readonly Span[], columns: readonly Column[], period_s: number): CrossSpectra {
  const runs = spans.map((span) => columns.map((column) => bridged(span, column)));
  const longest = runs.reduce((most, run) => Math.max(most, run[0].length), 0);
  const total = runs.reduce((sum, run) => sum + run[0].length, 0);
  const wanted = Math.min(SEGMENT_S / period_s, total / 4, longest);
  const segment = 2 ** Math.max(5, Math.floor(Math.log2(Math.max(32, wanted))));
  return crossSpectra(runs, 1 / period_s, segment);
}

/** A column over a span, lost rows on the line between their neighbours. */
function bridged(span: Span, column: Column): Float64Array {
  const { stretch, begin, end } = span;
  const out = new Float64Array(end - begin);
  let last = -1;
  for (let i = 0; i < out.length; i++) {
    const row = stretch.row[begin + i];
    if (row < 0) continue;
    out[i] = column[row];
    for (let k = last + 1; k < i; k++) {
      const from = last < 0 ? out[i] : out[last];
      out[k] = from + ((out[i] - from) * (k - last)) / (i - last);
    }
    last = i;
  }
  if (last >= 0) out.fill(out[last], last + 1);
  return out;
}
