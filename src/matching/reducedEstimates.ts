/**
 * The numbers of an axis in the one form all places share, K e^(−sTd)/(s(τs+1)), with their standard errors. A
 * fit that needed a lead or a damping is told in that form over the band where rate loops cross over.
 */
import type { AxisFit, Estimate } from './axisFitter.ts';
import { plantOf } from './fitAxis.ts';
import { reducePlant, responseOf } from './reducedPlant.ts';

export interface ReducedEstimates {
  readonly gain_dps2_per_us: Estimate;
  readonly lag_s: Estimate;
  readonly delay_s: Estimate;
  /** How far the three numbers are from the fit over 2 … 25 Hz; 0 when they are the fit itself. */
  readonly error_dB: number;
  readonly error_deg: number;
  /** The fit found a delay below zero; 0 stands in its place. */
  readonly delayBelowZero_s: number | null;
}

/** Step of the differentiation, in standard errors. */
const STEP = 0.3;

/** A log that holds only some of the controller's ticks: what its fit's delay and errors need. */
export interface Thinned {
  /** Part of the fitted delay that is the hold between ticks, not the plant's, s. */
  readonly hold_s: number;
  readonly period_s: number;
}

/**
 * Systematic error of a thinned-out log as a share of its row period, for lag and delay: what lies between the
 * rows is only guessed. Found on simulated loops, 2 and 4 ticks a row; no source.
 */
const THINNED_LAG_SHARE = 0.15;
const THINNED_DELAY_SHARE = 0.1;

/** @param thinned null when the log holds every tick */
export function reducedEstimates(fit: AxisFit, thinned: Thinned | null = null): ReducedEstimates {
  const plain = reducedFit(fit, thinned?.hold_s ?? 0);
  if (thinned === null) return plain;
  const widened = (one: Estimate, share: number) => ({
    ...one,
    sigma: Math.hypot(one.sigma, share * thinned.period_s),
  });
  return {
    ...plain,
    lag_s: widened(plain.lag_s, THINNED_LAG_SHARE),
    delay_s: widened(plain.delay_s, THINNED_DELAY_SHARE),
  };
}

function reducedFit(fit: AxisFit, hold_s: number): ReducedEstimates {
  if (fit.lead_s === undefined && fit.damping_per_s === undefined) {
    const delay_s = fit.delay_s.value - hold_s;
    const below = delay_s < 0;
    return {
      gain_dps2_per_us: fit.gain_dps2_per_us,
      lag_s: fit.lag_s,
      delay_s: { ...fit.delay_s, value: below ? 0 : delay_s },
      error_dB: 0,
      error_deg: 0,
      delayBelowZero_s: below ? delay_s : null,
    };
  }
  const places = ['gain_dps2_per_us', 'lag_s', 'delay_s', 'lead_s', 'damping_per_s'] as const;
  const present = places.filter((place) => fit[place] !== undefined);
  const centre = { ...plantOf(fit), delay_s: Math.max(0, fit.delay_s.value - hold_s) };
  const { plant, error_dB, error_deg } = reducePlant(responseOf(centre));
  const keys = ['gain_dps2_per_us', 'lag_s', 'delay_s'] as const;
  const slopes = present.map((place) => {
    const step = STEP * (fit[place]?.sigma ?? 0);
    if (step === 0) return [0, 0, 0];
    const high = reducePlant(responseOf({ ...centre, [place]: (centre[place] ?? 0) + step })).plant;
    const low = reducePlant(responseOf({ ...centre, [place]: (centre[place] ?? 0) - step })).plant;
    return keys.map((key) => (high[key] - low[key]) / (2 * step));
  });
  // J C Jᵀ, its diagonal.
  const sigma = keys.map((_, i) => {
    let variance = 0;
    present.forEach((_a, a) => {
      present.forEach((_b, b) => {
        variance += slopes[a][i] * fit.covariance[a][b] * slopes[b][i];
      });
    });
    return Math.sqrt(Math.max(0, variance));
  });
  return {
    gain_dps2_per_us: { value: plant.gain_dps2_per_us, sigma: sigma[0] },
    // At the end of its range a number does not move with the fit; it is no better known for that.
    lag_s: { value: plant.lag_s, sigma: Math.max(sigma[1], fit.lag_s.sigma) },
    delay_s: { value: plant.delay_s, sigma: Math.max(sigma[2], fit.delay_s.sigma) },
    error_dB,
    error_deg,
    delayBelowZero_s: null,
  };
}
