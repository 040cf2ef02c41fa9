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

/**
 * Fits the plant to all pieces together; a lead or a damping is added where the log clearly asks for it.
 * @param start where the search begins
 * @param other a second place to begin from, with its lead (a build's own plant)
 */
export function fitAxis(
  pieces: readonly AxisPiece[],
  start: PlantParameters,
  offered: readonly OptionalTerm[] = [],
  other?: PlantParameters,
): AxisFit {
  return withTerms(pieces, fitPlain(pieces, start), offered, other);
}

/** Gain, lag and delay alone. */
export function fitPlain(
  pieces: readonly AxisPiece[],
  start: PlantParameters,
  noise?: NoiseParameters,
): AxisFit {
  return new AxisFitter(pieces, start, [], noise).run();
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
