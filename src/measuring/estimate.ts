/**
 * A measured quantity with its standard uncertainty, and first-order propagation (JCGM 100:2008, "GUM",
 * clause 5.1; sensitivities by central differences over ±u as in 5.1.3 note 2).
 *
 * One rule holds for every sigma given out by this folder: value ± 1.96 sigma is the 95 % interval. Where
 * sigma comes from few repeats it is widened by Student's t (GUM annex G) so that the rule stays true.
 */
import type { AxisName } from '../craft/gains.ts';

export interface Estimate {
  readonly value: number;
  /** Standard uncertainty; value ± 1.96 sigma holds the truth 95 times in 100. */
  readonly sigma: number;
  readonly unit: string;
}

/** An estimate with what it means for the craft, in a sentence. */
export interface Quantified extends Estimate {
  /** sigma over |value|, per cent; absent where value is 0. */
  readonly relative_pct?: number;
  readonly meaning: string;
}

export const NORMAL_95 = 1.959964;

export interface Input {
  readonly name: string;
  readonly value: number;
  readonly sigma: number;
}

export interface Contribution {
  readonly name: string;
  /** Share of the variance, per cent. */
  readonly share_pct: number;
}

export interface Propagated extends Estimate {
  /** What makes up the uncertainty, the largest first. */
  readonly contributions: readonly Contribution[];
}

/** f(inputs) with its standard uncertainty for independent inputs. */
export function propagate(
  unit: string,
  inputs: readonly Input[],
  f: (values: readonly number[]) => number,
): Propagated {
  const centre = inputs.map((input) => input.value);
  const value = f(centre);
  const variances = inputs.map((input, i) => {
    if (input.sigma === 0) return 0;
    const up = centre.slice();
    const down = centre.slice();
    up[i] += input.sigma;
    down[i] -= input.sigma;
    return ((f(up) - f(down)) / 2) ** 2;
  });
  const variance = variances.reduce((sum, one) => sum + one, 0);
  const contributions = inputs
    .map((input, i) => ({ name: input.name, share_pct: variance > 0 ? (100 * variances[i]) / variance : 0 }))
    .filter((one) => one.share_pct > 0)
    .sort((a, b) => b.share_pct - a.share_pct);
  return { value, sigma: Math.sqrt(variance), unit, contributions };
}

/** Two-sided 95 % points of Student's t for 1 to 6 degrees of freedom (any table of the distribution). */
const STUDENT_95 = [12.7062, 4.3027, 3.1824, 2.7764, 2.5706, 2.4469];

/** Two-sided 95 % point of Student's t; beyond the table by Hill's expansion (Abramowitz & Stegun 26.7.5). */
export function student95(degrees: number): number {
  if (degrees < 1) return Infinity;
  if (degrees <= STUDENT_95.length) return STUDENT_95[Math.floor(degrees) - 1];
  const z = NORMAL_95;
  const v = degrees;
  return (
    z +
    (z ** 3 + z) / (4 * v) +
    (5 * z ** 5 + 16 * z ** 3 + 3 * z) / (96 * v * v) +
    (3 * z ** 7 + 19 * z ** 5 + 17 * z ** 3 - 15 * z) / (384 * v ** 3)
  );
}

/** Factor by which a sigma from `degrees` degrees of freedom is widened for the 95 % rule above. */
export const smallSampleFactor = (degrees: number): number => student95(degrees) / NORMAL_95;

/** Standard uncertainty of a reading with smallest step `step` (rectangular, GUM 4.3.7). */
export const stepSigma = (step: number): number => step / Math.sqrt(12);

export function quantified(estimate: Estimate, meaning: string): Quantified {
  const { value, sigma, unit } = estimate;
  return {
    value,
    sigma,
    unit,
    ...(value === 0 ? {} : { relative_pct: (100 * sigma) / Math.abs(value) }),
    meaning,
  };
}

/** "6.2 %", "0.35 %": two significant figures, not below 0.01 %. */
export function percent(share: number): string {
  const value = Math.max(0.01, 100 * Math.abs(share));
  return `${value >= 10 ? value.toFixed(0) : value.toPrecision(2)} %`;
}

/** Relative 95 % half-width. */
export const halfWidth95 = (estimate: Pick<Estimate, 'value' | 'sigma'>): number =>
  (NORMAL_95 * estimate.sigma) / Math.abs(estimate.value);

/** Change of a loop's gain margin for a relative change of the plant's gain, dB. */
export const gainMarginChange_dB = (share: number): number => 20 * Math.log10(1 + Math.abs(share));

/** What an uncertain plant gain does to the gains of an axis. */
export function loopGainSentence(what: string, estimate: Estimate, axis?: AxisName): string {
  const share = halfWidth95(estimate);
  const place = axis === undefined ? 'every axis' : axis;
  return (
    `${what} is known to ±${percent(share)} (95 %): the plant gain of ${place} is uncertain by the same share, ` +
    `which takes or gives ${gainMarginChange_dB(share).toFixed(1)} dB of gain margin; ` +
    (share > 0.15
      ? 'measure again before trusting gains close to a limit.'
      : `keep P at least ${percent(share)} below where its margin ends.`)
  );
}
