/**
 * Overlapping Allan deviation of a rate (IEEE Std 952-1997 annex C for gyros, IEEE Std 1293 for
 * accelerometers; NIST SP 1065 eq. 11) and the noise terms read from it.
 */
import { leastSquares } from './regression.ts';

export interface AllanCurve {
  readonly tau_s: Float64Array;
  /** Same unit as the rate. */
  readonly deviation: Float64Array;
  /** Equivalent degrees of freedom for white rate noise (NIST SP 1065 table 5). */
  readonly degrees: Float64Array;
}

/** Averaging lengths, in samples: all of the first, then six an octave (three for long records), up to a quarter. */
function averagingLengths(samples: number): number[] {
  const lengths: number[] = [];
  const octave = samples > 500_000 ? 3 : 6;
  const most = Math.max(1, Math.floor(samples / 4));
  for (let m = 1; m <= most; m = Math.max(m + 1, Math.round(m * 2 ** (1 / octave)))) lengths.push(m);
  return lengths;
}

/**
 * @param rate evenly sampled values
 * @param lengths averaging lengths in samples, each at most half the record
 */
export function allanDeviation(
  rate: ArrayLike<number>,
  interval_s: number,
  lengths: readonly number[] = averagingLengths(rate.length),
): AllanCurve {
  const n = rate.length;
  const angle = new Float64Array(n + 1);
  let mean = 0;
  for (let i = 0; i < n; i++) mean += rate[i] / n;
  // The mean drops out of second differences; without it the sums stay small.
  for (let i = 0; i < n; i++) angle[i + 1] = angle[i] + (rate[i] - mean) * interval_s;
  const usable = lengths.filter((m) => m >= 1 && 2 * m <= n);
  const deviation = new Float64Array(usable.length);
  const degrees = new Float64Array(usable.length);
  usable.forEach((m, j) => {
    const count = n + 1 - 2 * m;
    let sum = 0;
    for (let i = 0; i < count; i++) sum += (angle[i + 2 * m] - 2 * angle[i + m] + angle[i]) ** 2;
    const tau = m * interval_s;
    deviation[j] = Math.sqrt(sum / (2 * tau * tau * count));
    degrees[j] = whiteDegrees(n + 1, m);
  });
  return { tau_s: Float64Array.from(usable, (m) => m * interval_s), deviation, degrees };
}

function whiteDegrees(points: number, m: number): number {
  const value =
    ((3 * (points - 1)) / (2 * m) - (2 * (points - 2)) / points) * ((4 * m * m) / (4 * m * m + 5));
  return Math.max(1, value);
}

export interface AllanTerms {
  /** Angle random walk, unit·s/√s: σ(τ) = N/√τ. For one-sided density D, N = D/√2. */
  readonly randomWalk: number;
  readonly randomWalkSigma: number;
  /** Least deviation over 0.664 (√(2 ln 2/π)); an upper bound when the curve still falls at its end. */
  readonly instability: number;
  readonly instabilitySigma: number;
  readonly instabilityReached: boolean;
  /** Rate random walk, unit/√s: σ(τ) = K √(τ/3); null when the curve does not show it. */
  readonly rateRandomWalk: number | null;
  readonly rateRandomWalkSigma: number;
  /** Largest K the curve allows. */
  readonly rateRandomWalkBound: number;
}

/** The points of the curve share samples; found by simulating white noise. */
const SHARED_SAMPLES = 1.3;
const FLICKER = Math.sqrt((2 * Math.LN2) / Math.PI);

/**
 * Noise terms from a curve by σ²(τ) = N²/τ + B²·2 ln 2/π + K² τ/3, coefficients not negative.
 * @param from_s shortest τ to use: beyond the sensor's own bandwidth
 */
export function allanTerms(curve: AllanCurve, from_s: number): AllanTerms | null {
  const places = Array.from(curve.tau_s.keys()).filter(
    (j) => curve.tau_s[j] >= from_s && curve.deviation[j] > 0,
  );
  if (places.length < 3) return null;
  const rows = places.map((j) => [1 / curve.tau_s[j], FLICKER ** 2, curve.tau_s[j] / 3]);
  const variances = places.map((j) => curve.deviation[j] ** 2);
  // A variance with ν degrees of freedom is uncertain by √(2/ν) of itself.
  const weights = places.map((j, i) => Math.sqrt(curve.degrees[j] / 2) / variances[i]);
  const fit = nonNegative(rows, variances, weights);
  const last = places[places.length - 1];
  const lowest = places.reduce((least, j) => (curve.deviation[j] < curve.deviation[least] ? j : least));
  const n2 = fit[0];
  const surest = Math.max(...places.map((j) => curve.degrees[j]));
  const bound = Math.sqrt(3 / curve.tau_s[last]) * curve.deviation[last];
  // Drift is believed where the end of the curve lies clear above what white noise alone would give.
  const white = Math.sqrt(n2 / curve.tau_s[last]);
  const clear = 1 + 2.5 / Math.sqrt(2 * curve.degrees[last]);
  const drifting = fit[2] > 0 && curve.deviation[last] > clear * white * 1.2;
  return {
    randomWalk: Math.sqrt(n2),
    randomWalkSigma: (SHARED_SAMPLES * Math.sqrt(n2)) / Math.sqrt(2 * surest),
    instability: curve.deviation[lowest] / FLICKER,
    instabilitySigma: curve.deviation[lowest] / FLICKER / Math.sqrt(2 * curve.degrees[lowest]),
    instabilityReached: last - lowest >= 4 && curve.deviation[last] > clear * curve.deviation[lowest],
    rateRandomWalk: drifting ? Math.sqrt(fit[2]) : null,
    rateRandomWalkSigma: drifting ? Math.sqrt(fit[2]) / Math.sqrt(2 * curve.degrees[last]) : 0,
    rateRandomWalkBound: bound,
  };
}

/** Best of the fits over all subsets of the three terms whose coefficients are all above 0. */
function nonNegative(
  rows: readonly (readonly number[])[],
  y: readonly number[],
  weights: readonly number[],
): [number, number, number] {
  let best: [number, number, number] = [0, 0, 0];
  let bestCost = Infinity;
  for (let subset = 1; subset < 8; subset++) {
    const terms = [0, 1, 2].filter((term) => (subset >> term) % 2 === 1);
    const fit = leastSquares(
      rows.map((row) => terms.map((term) => row[term])),
      y,
      weights,
    );
    if (fit === null || fit.coefficients.some((value) => !(value > 0))) continue;
    const cost = fit.residuals.reduce((sum, value, i) => sum + (weights[i] * value) ** 2, 0);
    if (cost >= bestCost) continue;
    bestCost = cost;
    best = [0, 0, 0];
    terms.forEach((term, i) => {
      best[term] = fit.coefficients[i];
    });
  }
  return best;
}
