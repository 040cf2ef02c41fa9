/** One axis of a log: is it excited, what is its plant, how far can that be trusted. */
import type { Build } from '../craft/build.ts';
import type { AxisName } from '../craft/gains.ts';
import { DEG_PER_RAD } from '../math/angles.ts';
import type { TimeBase } from './align.ts';
import type { AxisPiece, PlantParameters, Reading } from './axisData.ts';
import type { AxisFit, Estimate, OptionalTerm } from './axisFitter.ts';
import { axisPiece } from './axisPieces.ts';
import { bestStart, fitPlain, plantOf, withTerms } from './fitAxis.ts';
import { describeFit, reasonsOf } from './axisNote.ts';
import {
  excitedBySetpoint,
  excitedParts,
  FITTED_SHARE,
  LEAST_USABLE_S,
  refusalOf,
  type ExcitedParts,
} from './excited.ts';
import type { Column, FlightLog } from './log.ts';
import { reducedEstimates, type ReducedEstimates } from './reducedEstimates.ts';
import type { MeasuredResponse } from './spectra.ts';
import { plantFromResponse } from './startValues.ts';
import { suspectAxis, turnedSign, type Offer } from './suspicions.ts';
import { spanSeconds, splitSpans, type LeftOut, type Span, type UsableRows } from './usable.ts';
import { explainedShare, residualOf, validate, type Residual, type Validation } from './validation.ts';

/** Estimates less certain than these are no numbers. */
const LARGEST_GAIN_ERROR = 0.15;
const LARGEST_LAG_ERROR = 0.6;
const LARGEST_DELAY_ERROR_S = 0.006;
/** Stamps that jitter by less than this share of the period are regular. */
const JITTER_SHARE = 0.01;
/** Without a moving setpoint the model must explain this much of the rate's power between 0.7 and 10 Hz. */
const LEAST_EXPLAINED = 0.75;

export interface AxisContext {
  readonly log: FlightLog;
  readonly build: Build;
  readonly base: TimeBase;
  readonly usable: UsableRows;
  /** Null while it is not known which is right. */
  readonly reading: Reading | null;
  readonly command: Reading['command'];
  /** Tick of the controller, s. */
  readonly tick_s: number;
  readonly rotor_Hz: number | null;
}

export interface AxisResult {
  /** The plant K e^(−sTd)/(s(τs+1)); null when the axis has no numbers. */
  readonly estimates: ReducedEstimates | null;
  readonly fit: AxisFit | null;
  /** Share of the held-back piece that is foretold over 0.3 s; null without one. */
  readonly fit_pct: number | null;
  readonly usable_s: number;
  /** Sentences: what was used, how good it is, where the model fails; or why there are no numbers. */
  readonly note: string;
  readonly response: MeasuredResponse | null;
  readonly validation: Validation | null;
  readonly residual: Residual | null;
  readonly leftOut: readonly LeftOut[];
  readonly offers: readonly Offer[];
  readonly reading: Reading | null;
}

const NOTHING = {
  estimates: null,
  fit: null,
  fit_pct: null,
  usable_s: 0,
  response: null,
  validation: null,
  residual: null,
  leftOut: [],
  offers: [],
  reading: null,
} as const;

/** Identifies one axis. */
export function identifyAxis(
  axis: AxisName,
  context: AxisContext,
  u_us: Column | null,
  model: PlantParameters,
): AxisResult {
  const y_dps = context.log.gyro_dps[axis];
  if (y_dps === undefined) return { ...NOTHING, note: `The log has no gyro_${axis}.` };
  if (u_us === null) {
    return { ...NOTHING, note: `The log has neither u_${axis} nor all four motor commands.` };
  }
  const { usable } = context;
  if (usable.usable_s < LEAST_USABLE_S) {
    const why = `Only ${usable.usable_s.toFixed(1)} s of the log can be used (${reasonsOf(usable.leftOut)}); ${LEAST_USABLE_S} s are the least.`;
    return { ...NOTHING, note: why };
  }
  const setpoint = context.log.setpoint_dps[axis] ?? null;
  const parts = excitedParts(usable, context.base.period_s, setpoint, u_us, y_dps);
  const { response, spectra } = parts;
  // A setpoint that stands still leaves only the controller's answer to noise, which tells no units.
  const telling = setpoint === null || spectra.count === 3;
  const offers = telling ? suspectAxis(axis, response, spectra, model) : [];
  const scale = offers.some((offer) => offer.unit === 'rad/s') ? DEG_PER_RAD : 1;
  const refusal = refusalOf(axis, parts, scale);
  const result =
    refusal === null
      ? fitParts(axis, context, u_us, y_dps, model, parts, excitedBySetpoint(parts, scale))
      : { ...NOTHING, response, note: refusal };
  if (offers.length === 0) return result;
  const doubts = offers.map((one) => one.because).join(' ');
  return { ...result, offers: [...offers, ...result.offers], note: `${doubts} ${result.note}` };
}

// --- Fit ----------------------------------------------------------------------------------------------------

function fitParts(
  axis: AxisName,
  context: AxisContext,
  u_us: Column,
  y_dps: Column,
  model: PlantParameters,
  parts: ExcitedParts,
  bySetpoint: boolean,
): AxisResult {
  const { base, build } = context;
  const { response } = parts;
  const { first, rest } = splitSpans(parts.spans, FITTED_SHARE);
  const piecesOf = (spans: readonly Span[], { stamps, command }: Reading) =>
    spans.map((span) => {
      const times = stamps === 'regular' ? span.stretch.regular_s : span.stretch.logged_s;
      return axisPiece(span.stretch, times, span.begin, span.end, u_us, y_dps, command);
    });
  const chosen = bestReading(context, startsOf(response, model), (reading) => piecesOf(first, reading));
  // The rotors' reaction about yaw is a lead; the inflow damps roll and pitch.
  const terms: OptionalTerm[] = axis === 'yaw' ? ['lead_s', 'damping_per_s'] : ['damping_per_s'];
  const fit = withTerms(chosen.pieces, chosen.fit, terms, model);
  const plant = plantOf(fit);
  const held = piecesOf(rest, chosen.reading);
  const partial = { ...NOTHING, response, leftOut: parts.leftOut, reading: chosen.reading };
  // Held from tick to tick, a command acts half a tick later than the mean between two rows does.
  const thinned =
    chosen.reading.command === 'between' ? { hold_s: context.tick_s / 2, period_s: base.period_s } : null;
  const estimates = reducedEstimates(fit, thinned);
  if (!(fit.gain_dps2_per_us.value > 0) && bySetpoint) {
    const offer = turnedSign(axis);
    return { ...partial, offers: [offer], note: `No numbers: ${offer.because}` };
  }
  const weak = weakness(axis, fit, estimates, bySetpoint, chosen.pieces, held, base.period_s);
  if (weak !== null) return { ...partial, note: weak };
  const validation = validate(held, plant, fit);
  const residual = residualOf(
    [...chosen.pieces, ...held],
    plant,
    fit,
    base.period_s,
    context.rotor_Hz,
    build,
  );
  const fitted_s = first.reduce((sum, span) => sum + spanSeconds(span), 0);
  const held_s = rest.reduce((sum, span) => sum + spanSeconds(span), 0);
  return {
    ...partial,
    estimates,
    fit,
    fit_pct: validation?.fit_pct ?? null,
    usable_s: fitted_s + held_s,
    note: describeFit(context, fit, estimates, validation, residual, fitted_s),
    validation,
    residual,
  };
}

/** Places to begin: the measured response's plant, the model's with the measured gain, the model's own. */
function startsOf(response: MeasuredResponse, model: PlantParameters): PlantParameters[] {
  const plain = { gain_dps2_per_us: model.gain_dps2_per_us, lag_s: model.lag_s, delay_s: model.delay_s };
  const measured = plantFromResponse(response);
  if (measured === null) return [plain];
  return [measured, { ...plain, lag_s: 0.035, gain_dps2_per_us: measured.gain_dps2_per_us }, plain];
}

interface ReadFit {
  readonly reading: Reading;
  readonly fit: AxisFit;
  readonly pieces: AxisPiece[];
}

/**
 * Fits with the stamps as logged and, if they jitter, on the regular tick; the likelihood decides. Whether the
 * command went on between rows the likelihood cannot tell from a delay: the loop rate says it.
 */
function bestReading(
  context: AxisContext,
  starts: readonly PlantParameters[],
  piecesOf: (reading: Reading) => AxisPiece[],
): ReadFit {
  const { base } = context;
  const attempt = (reading: Reading, from?: AxisFit): ReadFit => {
    const pieces = piecesOf(reading);
    const start = from === undefined ? bestStart(pieces, starts) : plantOf(from);
    return { reading, fit: fitPlain(pieces, start, from?.noise), pieces };
  };
  if (context.reading !== null) return attempt(context.reading);
  const { command } = context;
  const first = attempt({ stamps: base.irregular ? 'as logged' : 'regular', command });
  let best = first;
  if (!base.irregular && base.jitter_s >= JITTER_SHARE * base.period_s) {
    const logged = attempt({ stamps: 'as logged', command }, first.fit);
    if (logged.fit.deviance < best.fit.deviance) best = logged;
  }
  return best;
}

/** Why a fit is no number, or null. */
function weakness(
  axis: AxisName,
  fit: AxisFit,
  estimates: ReducedEstimates,
  bySetpoint: boolean,
  fitted: readonly AxisPiece[],
  held: readonly AxisPiece[],
  period_s: number,
): string | null {
  const { gain_dps2_per_us: gain, lag_s, delay_s } = estimates;
  if (
    !(relative(gain) < LARGEST_GAIN_ERROR) ||
    !(lag_s.sigma < Math.max(0.01, LARGEST_LAG_ERROR * lag_s.value)) ||
    !(delay_s.sigma < LARGEST_DELAY_ERROR_S)
  ) {
    return `Not excited enough: what ${axis} movement there is leaves the gain uncertain by ${(100 * relative(gain)).toFixed(0)} %, the lag by ${(1000 * lag_s.sigma).toFixed(0)} ms and the delay by ${(1000 * delay_s.sigma).toFixed(0)} ms. Fly larger or longer ${axis} doublets or a sweep.`;
  }
  if (bySetpoint) return null;
  const explained = gain.value > 0 ? explainedShare([...fitted, ...held], fit, period_s) : 0;
  if (explained >= LEAST_EXPLAINED) return null;
  return `Not excited: the ${axis} setpoint does not move, and the command explains too little of the rate to be a manoeuvre (it answers noise and gusts). Fly ${axis} doublets or a sweep.`;
}

function relative(estimate: Estimate): number {
  return estimate.sigma / Math.abs(estimate.value);
}
