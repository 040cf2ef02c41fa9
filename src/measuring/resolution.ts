/** Smallest step of a sampled signal, and what step and noise say about its unit. */
import { median } from 'simple-statistics';
import type { Estimate } from './estimate.ts';

const SAMPLE = 60_000;
/** Where more values than this share differ from all others, the record is finer than its noise. */
const MOST_DISTINCT = 0.5;

/** @returns value 0 when the steps are too fine to show. */
export function resolutionOf(values: Float64Array): Estimate {
  const sample = values.subarray(0, SAMPLE);
  const sorted = Float64Array.from(new Set(sample)).sort();
  const span = sorted[sorted.length - 1] - sorted[0];
  const steps: number[] = [];
  for (let i = 1; i < sorted.length; i++) {
    const step = sorted[i] - sorted[i - 1];
    // Rounding in a text file leaves values that are the same but for the last digit.
    if (step > 1e-6 * span) steps.push(step);
  }
  if (steps.length === 0 || steps.length > MOST_DISTINCT * sample.length)
    return { value: 0, sigma: 0, unit: '' };
  steps.sort((a, b) => a - b);
  const base = steps[Math.floor(steps.length / 10)];
  const single = steps.filter((step) => step > 0.6 * base && step < 1.5 * base);
  const mean = single.reduce((sum, step) => sum + step, 0) / single.length;
  const spread = Math.sqrt(single.reduce((sum, step) => sum + (step - mean) ** 2, 0) / single.length);
  return { value: mean, sigma: spread / Math.sqrt(single.length), unit: '' };
}

/** Steps of 16-bit gyros, deg/s: full scale over 32768, and the rounded ones some data sheets state. */
const USUAL_STEPS_DPS = [
  ...[125, 250, 500, 1000, 2000, 4000].map((fullScale) => fullScale / 32_768),
  0.004375,
  0.00875,
  0.0175,
  0.035,
  0.07,
  0.14,
];
/** Noise densities of small silicon gyros by their data sheets; common practice, no source. */
const USUAL_DENSITY_DPS: readonly [number, number] = [0.0015, 0.08];

export interface RateUnitDoubt {
  readonly stated: 'deg/s' | 'rad/s';
  readonly likely: 'deg/s' | 'rad/s';
  readonly why: string;
}

const usualStep = (step: number): boolean => USUAL_STEPS_DPS.some((one) => Math.abs(step / one - 1) < 0.01);
const usualDensity = (density: number): boolean =>
  density >= USUAL_DENSITY_DPS[0] && density <= USUAL_DENSITY_DPS[1];

/**
 * A gyro at rest whose numbers are those of the other unit.
 * @param densities noise densities of the axes in the unit as written, per √Hz
 * @param step resolution in the unit as written, 0 when unknown
 */
export function doubtRateUnit(
  stated: 'deg/s' | 'rad/s',
  densities: readonly number[],
  step: number,
): RateUnitDoubt | null {
  const degrees = 180 / Math.PI;
  const [asStated, other] = stated === 'deg/s' ? [1, degrees] : [degrees, 1];
  const likely = stated === 'deg/s' ? 'rad/s' : 'deg/s';
  if (step > 0 && usualStep(step * other) && !usualStep(step * asStated)) {
    return {
      stated,
      likely,
      why: `its smallest step, ${step.toPrecision(4)}, is that of a 16-bit gyro in ${likely}, not in ${stated}`,
    };
  }
  const density = median([...densities]);
  if (usualDensity(density * other) && !usualDensity(density * asStated) && !usualStep(step * asStated)) {
    return {
      stated,
      likely,
      why: `a noise of ${density.toPrecision(2)} per √Hz is usual for a gyro in ${likely}, not in ${stated}`,
    };
  }
  return null;
}
