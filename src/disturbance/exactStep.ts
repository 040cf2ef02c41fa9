/**
 * Exact sampling of a linear stochastic system of three states, dx = A x dt + B dW (W a unit Wiener process):
 * the transition Φ = e^{Ah} and the covariance Q = ∫₀ʰ e^{As} B Bᵀ e^{Aᵀs} ds of the noise gathered over a
 * step, so that the samples have the continuous system's own statistics for any step h.
 *
 * Φ and Q are summed as series over a short part of the step (for Q: C₀ = BBᵀ, C_{k+1} = A C_k + C_k Aᵀ,
 * Q = Σ h^{k+1}/(k+1)! C_k) and doubled up, Q(2h) = Q + Φ Q Φᵀ. This is the integral of Van Loan (1978), IEEE
 * Trans. Automatic Control 23, 395; in this form a small step loses no digits and nothing is allocated.
 * Matrices are 3 × 3, row by row.
 */

/** |A|·h below which the series are summed; twelve terms then leave less than 1e-14. */
const SERIES_NORM = 0.125;
const SERIES_TERMS = 12;
/** A term this small beside the first adds nothing. */
const NEGLIGIBLE = 1e-18;
/** Doublings at most: 2^80 parts. */
const MOST_DOUBLINGS = 80;

export class ExactStep {
  /** Φ. */
  readonly transition = new Float64Array(9);
  /** Q. */
  readonly covariance = new Float64Array(9);
  /** Lower Cholesky factor of Q: x ← Φ x + noise · (independent unit normals). */
  readonly noise = new Float64Array(9);
  private readonly term = new Float64Array(9);
  private readonly next = new Float64Array(9);
  private readonly work = new Float64Array(9);

  /** Sets Φ, Q and its factor for `A`, `B` (one noise input) and step `h` > 0. */
  set(A: Float64Array, B: Float64Array, h: number): void {
    const norm = rowNorm(A) * h;
    let doublings = 0;
    if (norm > SERIES_NORM) doublings = Math.min(MOST_DOUBLINGS, Math.ceil(Math.log2(norm / SERIES_NORM)));
    this.sumSeries(A, B, h / 2 ** doublings);
    for (let k = 0; k < doublings; k++) this.double();
    this.factor();
  }

  /** Sets Q to the stationary covariance of a stable system (Φ goes to 0), and its factor. */
  setStationary(A: Float64Array, B: Float64Array): void {
    this.sumSeries(A, B, SERIES_NORM / rowNorm(A));
    for (let k = 0; k < MOST_DOUBLINGS && rowNorm(this.transition) > NEGLIGIBLE; k++) this.double();
    this.factor();
  }

  private sumSeries(A: Float64Array, B: Float64Array, h: number): void {
    const { transition, covariance, term, next, work } = this;
    // The k-th terms are at most (|A|h)^k/k! and (2|A|h)^k/k! of the first.
    const step = 2 * rowNorm(A) * h;
    let terms = 1;
    for (let size = step; terms < SERIES_TERMS && size > NEGLIGIBLE; size *= step / terms) terms++;
    term.fill(0);
    term[0] = term[4] = term[8] = 1;
    transition.set(term);
    for (let k = 1; k <= terms; k++) {
      multiply(A, term, next);
      for (let e = 0; e < 9; e++) transition[e] += term[e] = (next[e] * h) / k;
    }
    for (let i = 0; i < 3; i++) for (let j = 0; j < 3; j++) term[i * 3 + j] = h * B[i] * B[j];
    covariance.set(term);
    for (let k = 2; k <= terms; k++) {
      multiply(A, term, work);
      const per = h / k;
      for (let i = 0; i < 3; i++) {
        for (let j = 0; j < 3; j++) {
          const e = i * 3 + j;
          covariance[e] += term[e] = (work[e] + work[j * 3 + i]) * per;
        }
      }
    }
  }

  private double(): void {
    const { transition, covariance, next, work } = this;
    multiply(transition, covariance, work);
    for (let i = 0; i < 9; i += 3) {
      for (let j = 0; j < 9; j += 3) {
        covariance[i + j / 3] +=
          work[i] * transition[j] + work[i + 1] * transition[j + 1] + work[i + 2] * transition[j + 2];
      }
    }
    multiply(transition, transition, next);
    transition.set(next);
  }

  /** Cholesky; a pivot that rounding brought to or below zero is a direction without noise. */
  private factor(): void {
    const { covariance, noise } = this;
    noise.fill(0);
    for (let j = 0; j < 3; j++) {
      for (let i = j; i < 3; i++) {
        let sum = covariance[i * 3 + j];
        for (let k = 0; k < j; k++) sum -= noise[i * 3 + k] * noise[j * 3 + k];
        if (i === j) noise[i * 3 + j] = sum > 0 ? Math.sqrt(sum) : 0;
        else noise[i * 3 + j] = noise[j * 3 + j] > 0 ? sum / noise[j * 3 + j] : 0;
      }
    }
  }
}

/** Largest sum of absolute values in a row. */
function rowNorm(A: Float64Array): number {
  let norm = 0;
  for (let i = 0; i < 9; i += 3)
    norm = Math.max(norm, Math.abs(A[i]) + Math.abs(A[i + 1]) + Math.abs(A[i + 2]));
  return norm;
}

function multiply(a: Float64Array, b: Float64Array, out: Float64Array): void {
  for (let i = 0; i < 9; i += 3) {
    const a0 = a[i];
    const a1 = a[i + 1];
    const a2 = a[i + 2];
    out[i] = a0 * b[0] + a1 * b[3] + a2 * b[6];
    out[i + 1] = a0 * b[1] + a1 * b[4] + a2 * b[7];
    out[i + 2] = a0 * b[2] + a1 * b[5] + a2 * b[8];
  }
}
