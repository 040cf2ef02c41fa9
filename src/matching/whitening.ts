/**
 * Autoregressive whitening of normalised innovations: what the disturbance model leaves coloured (vibration
 * lines, a filtered gyro) is taken up by A(q), so that stated intervals hold. Yule–Walker by Levinson's
 * recursion, order by the Bayesian criterion (Schwarz 1978).
 */

/** Autocovariance sums Σ e_k e_{k−j}, j = 0 … order, within each sequence. */
export function autocovariance(sequences: readonly Float64Array[], order: number): Float64Array {
  const sums = new Float64Array(order + 1);
  for (const e of sequences) {
    for (let j = 0; j <= order; j++) {
      let sum = 0;
      for (let k = j; k < e.length; k++) sum += e[k] * e[k - j];
      sums[j] += sum;
    }
  }
  return sums;
}

/**
 * Levinson–Durbin.
 * @returns coefficients a_1 … a_p of f_k = e_k + Σ a_j e_{k−j} and the residual variance sum, for each order
 */
function levinson(r: Float64Array): { coefficients: Float64Array[]; residual: Float64Array } {
  const order = r.length - 1;
  const residual = new Float64Array(order + 1);
  residual[0] = r[0];
  let a: Float64Array = new Float64Array(0);
  const coefficients = [a];
  for (let p = 1; p <= order; p++) {
    let sum = r[p];
    for (let j = 1; j < p; j++) sum += a[j - 1] * r[p - j];
    const reflection = -sum / residual[p - 1];
    const next = new Float64Array(p);
    for (let j = 1; j < p; j++) next[j - 1] = a[j - 1] + reflection * a[p - j - 1];
    next[p - 1] = reflection;
    residual[p] = residual[p - 1] * (1 - reflection * reflection);
    a = next;
    coefficients.push(a);
  }
  return { coefficients, residual };
}

/** Coefficients a_1 … a_p of order `order`. */
export function whiteningFilter(r: Float64Array, order: number): Float64Array {
  return levinson(r.subarray(0, order + 1)).coefficients[order];
}

/** Order 0 … length−1 of `r` that the Bayesian criterion likes best for `count` samples. */
export function whiteningOrder(r: Float64Array, count: number): number {
  const { residual } = levinson(r);
  let best = 0;
  let least = Infinity;
  for (let p = 0; p < residual.length; p++) {
    const score = count * Math.log(residual[p]) + p * Math.log(count);
    if (score < least) {
      least = score;
      best = p;
    }
  }
  return best;
}

/** f_k = e_k + Σ a_j e_{k−j}; before the sequence e is taken as 0. */
export function whiten(e: Float64Array, a: Float64Array, out: Float64Array): void {
  const p = a.length;
  for (let k = 0; k < e.length; k++) {
    let sum = e[k];
    const most = Math.min(p, k);
    for (let j = 1; j <= most; j++) sum += a[j - 1] * e[k - j];
    out[k] = sum;
  }
}

/**
 * Portmanteau statistic of Ljung and Box (1978) over `lags`, as a z-score of its χ² distribution by the
 * Wilson–Hilferty transformation: above about 3 the sequence is not white.
 */
export function whitenessScore(sequences: readonly Float64Array[], lags: number, fitted: number): number {
  const r = autocovariance(sequences, lags);
  const n = sequences.reduce((sum, e) => sum + e.length, 0);
  let q = 0;
  for (let j = 1; j <= lags; j++) q += (r[j] / r[0]) ** 2 / (n - j);
  q *= n * (n + 2);
  const degrees = Math.max(1, lags - fitted);
  return (Math.cbrt(q / degrees) - (1 - 2 / (9 * degrees))) / Math.sqrt(2 / (9 * degrees));
}
