/**
 * Fit of gain, lag and delay of one axis from closed-loop data: maximum likelihood of the innovations
 * (prediction errors) with the disturbance and the gyro noise estimated along with the plant. Standard errors
 * come from the joint information of plant and noise.
 *
 * Why this and not a plain output-error fit: the command carries the gyro's noise and answers the gusts, so a
 * fit that takes the noise as white is biased. Prediction errors with the right noise model are not (Ljung,
 * System Identification, 2nd ed., 13.4, direct method).
 */
import type { AxisPiece, PlantParameters } from './axisData.ts';
import { AxisFitter, type AxisFit, type OptionalTerm } from './axisFitter.ts';
import type { NoiseParameters } from './disturbanceFilter.ts';

/**
 * Drop of the deviance that an optional term must bring. For a term that is not there the drop is χ² with one
 * degree of freedom: 15 is passed once in ten thousand fits.
 */
const WORTH_A_TERM = 15;

/** Gain, lag and delay alone. */
export function fitPlain(
  pieces: readonly AxisPiece[],
  start: PlantParameters,
  noise?: NoiseParameters,
): AxisFit {
  return new AxisFitter(pieces, start, [], noise).run();
}

/** Rows on which places to begin are compared. */
const SCOUT_ROWS = 6000;

/**
 * The best place to begin: the likelihood has more than one hollow where the manoeuvre is slow. Each start is
 * followed on a part of the rows; the plant of the deepest hollow is returned.
 */
export function bestStart(pieces: readonly AxisPiece[], starts: readonly PlantParameters[]): PlantParameters {
  const part: AxisPiece[] = [];
  let left = SCOUT_ROWS;
  for (const piece of pieces) {
    if (left <= 0) break;
    const rows = Math.min(left, piece.t_s.length);
    part.push({
      t_s: piece.t_s.subarray(0, rows),
      u_us: piece.u_us.subarray(0, rows),
      y_dps: piece.y_dps.subarray(0, rows),
      uError_us: piece.uError_us.subarray(0, rows),
    });
    left -= rows;
  }
  const ends = starts.map((start) => new AxisFitter(part, start, []).scout());
  // A rate that goes against the command is believed only when no start says otherwise.
  const forward = ends.filter((end) => end.plant.gain_dps2_per_us > 0);
  return (forward.length > 0 ? forward : ends).reduce((a, b) => (b.cost < a.cost ? b : a)).plant;
}

/**
 * Tries the offered terms one after the other on top of a plain fit.
 * @param other a second place to begin from, with its lead (a build's own plant)
 */
export function withTerms(
  pieces: readonly AxisPiece[],
  plain: AxisFit,
  offered: readonly OptionalTerm[],
  other?: PlantParameters,
): AxisFit {
  let free: readonly OptionalTerm[] = [];
  let best = plain;
  for (const term of offered) {
    const more = [...free, term];
    const trials = [new AxisFitter(pieces, plantOf(best), more, best.noise).run()];
    if (term === 'lead_s' && (other?.lead_s ?? 0) > 0 && other !== undefined) {
      trials.push(new AxisFitter(pieces, other, more).run());
    }
    const fit = trials.reduce((a, b) => (b.deviance < a.deviance ? b : a));
    if (fit.deviance < best.deviance - WORTH_A_TERM) {
      best = fit;
      free = more;
    }
  }
  return best;
}

/** The fitted values alone. */
export function plantOf(fit: AxisFit): PlantParameters {
  return {
    gain_dps2_per_us: fit.gain_dps2_per_us.value,
    lag_s: fit.lag_s.value,
    delay_s: fit.delay_s.value,
    lead_s: fit.lead_s?.value ?? 0,
    damping_per_s: fit.damping_per_s?.value ?? 0,
  };
}
