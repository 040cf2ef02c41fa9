/** Weighted linear least squares with covariance, and robust scale, for the fits of this folder. */
import { inverse, Matrix, solve } from 'ml-matrix';
import { median } from 'simple-statistics';

export interface LinearFit {
  readonly coefficients: readonly number[];
  /** Standard uncertainties from the residuals (not widened for few rows). */
  readonly sigmas: readonly number[];
  readonly residuals: readonly number[];
  /** Root mean square of the weighted residuals over the degrees of freedom. */
  readonly scatter: number;
  readonly degrees: number;
}

/**
 * Least squares of rows · coefficients = y, each row times its weight.
 * @returns null when there are fewer rows than coefficients or the rows do not tell them apart.
 */
export function leastSquares(
  rows: readonly (readonly number[])[],
  y: readonly number[],
  weights?: readonly number[],
): LinearFit | null {
  const size = rows[0]?.length ?? 0;
  if (size === 0 || rows.length < size) return null;
  // Columns are scaled to unit length, so that the test for singularity does not depend on units.
  const weight = (i: number) => weights?.[i] ?? 1;
  const lengths = Array.from({ length: size }, (_, c) =>
    Math.sqrt(rows.reduce((sum, row, i) => sum + (weight(i) * row[c]) ** 2, 0)),
  );
  if (lengths.some((length) => !(length > 0) || !Number.isFinite(length))) return null;
  const a = new Matrix(rows.map((row, i) => row.map((value, c) => (weight(i) * value) / lengths[c])));
  const b = Matrix.columnVector(y.map((value, i) => weight(i) * value));
  const normal = a.transpose().mmul(a);
  const spread = inverse(normal, true);
  const trace = spread.trace();
  if (!Number.isFinite(trace) || trace > 1e10) return null;
  const scaled = solve(a, b, true).to1DArray();
  const coefficients = scaled.map((value, c) => value / lengths[c]);
  const residuals = rows.map(
    (row, i) => y[i] - row.reduce((sum, value, c) => sum + value * coefficients[c], 0),
  );
  const degrees = rows.length - size;
  const squares = residuals.reduce((sum, value, i) => sum + (weight(i) * value) ** 2, 0);
  const scatter = degrees > 0 ? Math.sqrt(squares / degrees) : 0;
  const sigmas = coefficients.map((_, c) => (scatter * Math.sqrt(spread.get(c, c))) / lengths[c]);
  return { coefficients, sigmas, residuals, scatter, degrees };
}

/** 1.4826 × median absolute deviation: the standard deviation, were the values normal. */
export function robustScale(values: readonly number[]): number {
  if (values.length === 0) return 0;
  const centre = median([...values]);
  return 1.4826 * median(values.map((value) => Math.abs(value - centre)));
}

/** Limit of the modified z-score beyond which a value is an outlier, Iglewicz & Hoaglin (1993). */
export const OUTLIER_Z = 3.5;

/** Line y = a + b x through the medians of all pairwise slopes (Theil 1950, Sen 1968); at most 400 points. */
export function robustLine(x: readonly number[], y: readonly number[]): { a: number; b: number } {
  const stride = Math.max(1, Math.ceil(x.length / 400));
  const slopes: number[] = [];
  for (let i = 0; i < x.length; i += stride) {
    for (let j = i + stride; j < x.length; j += stride) {
      if (Math.abs(x[j] - x[i]) > 1e-9) slopes.push((y[j] - y[i]) / (x[j] - x[i]));
    }
  }
  const b = slopes.length === 0 ? 0 : median(slopes);
  return { a: median(x.map((value, i) => y[i] - b * value)), b };
}

/** Smallest and largest of any number of values; [Infinity, -Infinity] for none, NaN passed over. */
export function extent(values: Iterable<number>): [number, number] {
  let low = Infinity;
  let high = -Infinity;
  for (const value of values) {
    if (value < low) low = value;
    if (value > high) high = value;
  }
  return [low, high];
}
