/**
 * Continuous single-input single-output systems as state-space, and their exact sampling under a zero-order
 * hold with a delay of any length.
 */
import { Matrix } from 'ml-matrix';

/** ẋ = A x + B u(t − delay), y = C x. */
export interface ContinuousSystem {
  readonly A: Matrix;
  /** Column. */
  readonly B: Matrix;
  /** Row. */
  readonly C: Matrix;
  readonly delay_s: number;
  /** Column: ẋ per deg/s² of angular acceleration from outside (a gust), where the system is a craft. */
  readonly disturbance?: Matrix;
  /** Row: the body's rate, deg/s, where the output is a sensor's. */
  readonly bodyRate?: Matrix;
  /** Frames of the ESC a second, where they can be slower than the loop. */
  readonly commandUpdate_Hz?: number;
}

/** The plant of the command line: K e^(−sTd)/(s(τs+1)), deg/s² per µs, seconds. */
export interface Plant {
  readonly gain_dps2_per_us: number;
  readonly lag_s: number;
  readonly delay_s: number;
}

/** A lag below this is taken as a delay of the same length: at 4 kHz that differs by 3 parts in a million. */
const LEAST_LAG_S = 1e-7;

/** Rate (deg/s) from axis command (µs). States: rate and, with a lag, angular acceleration. */
export function plantSystem(plant: Plant): ContinuousSystem {
  const { gain_dps2_per_us: K, lag_s: tau } = plant;
  const delay_s = tau < LEAST_LAG_S ? plant.delay_s + tau : plant.delay_s;
  if (tau < LEAST_LAG_S) {
    return {
      A: new Matrix([[0]]),
      B: new Matrix([[K]]),
      C: new Matrix([[1]]),
      delay_s,
      disturbance: new Matrix([[1]]),
    };
  }
  return {
    A: new Matrix([
      [0, 1],
      [0, -1 / tau],
    ]),
    B: new Matrix([[0], [K / tau]]),
    C: new Matrix([[1, 0]]),
    delay_s,
    disturbance: new Matrix([[1], [0]]),
  };
}

/**
 * A strictly proper transfer b(s)/a(s), coefficients highest power first, in controllable canonical form.
 * @throws RangeError when it is not strictly proper.
 */
export function transferSystem(b: readonly number[], a: readonly number[]): ContinuousSystem {
  const n = a.length - 1;
  if (n < 1 || b.length > n || a[0] === 0)
    throw new RangeError(
      `a transfer of order ${b.length - 1} over ${n}: the lower one must be of higher order`,
    );
  const A = Matrix.zeros(n, n);
  const C = Matrix.zeros(1, n);
  for (let j = 0; j < n; j++) {
    A.set(n - 1, j, -a[n - j] / a[0]);
    if (j < n - 1) A.set(j, j + 1, 1);
    C.set(0, j, (b[b.length - 1 - j] ?? 0) / a[0]);
  }
  const B = Matrix.zeros(n, 1);
  B.set(n - 1, 0, 1);
  return { A, B, C, delay_s: 0 };
}

/** `first` followed by a first-order low-pass and a further delay: a sensor behind a plant. */
export function withSensor(first: ContinuousSystem, bandwidth_Hz: number, delay_s: number): ContinuousSystem {
  const total = first.delay_s + delay_s;
  if (bandwidth_Hz === 0) return { ...first, delay_s: total, bodyRate: first.bodyRate ?? first.C };
  const n = first.A.rows;
  const w = 2 * Math.PI * bandwidth_Hz;
  const A = Matrix.zeros(n + 1, n + 1);
  A.setSubMatrix(first.A, 0, 0);
  for (let j = 0; j < n; j++) A.set(n, j, w * first.C.get(0, j));
  A.set(n, n, -w);
  const B = Matrix.zeros(n + 1, 1);
  B.setSubMatrix(first.B, 0, 0);
  const C = Matrix.zeros(1, n + 1);
  C.set(0, n, 1);
  const bodyRate = Matrix.zeros(1, n + 1);
  bodyRate.setSubMatrix(first.bodyRate ?? first.C, 0, 0);
  return {
    ...first,
    A,
    B,
    C,
    delay_s: total,
    bodyRate,
    ...(first.disturbance === undefined ? {} : { disturbance: widenedColumn(first.disturbance, n + 1) }),
  };
}

function widenedColumn(column: Matrix, rows: number): Matrix {
  const wide = Matrix.zeros(rows, 1);
  wide.setSubMatrix(column, 0, 0);
  return wide;
}

/**
 * Exact samples: x_{k+1} = Φ x_k + Γ0 u_{k−m} + Γ1 u_{k−m−1}, delay = m T + δ. With δ = 0 Γ1 is zero.
 * Flat arrays, row by row. The transfer is kept as polynomials in w = z − 1, lowest power first: near z = 1,
 * where slow poles gather, polynomials in z would lose their digits.
 */
export interface SampledSystem {
  readonly states: number;
  readonly transition: Float64Array;
  readonly now: Float64Array;
  readonly before: Float64Array;
  readonly C: Float64Array;
  /** Held over a tick: state change per deg/s² from outside; zero where the system is no craft. */
  readonly disturbance: Float64Array;
  /** The body's rate, deg/s. */
  readonly bodyRate: Float64Array;
  readonly wholeTicks: number;
  /** Share of a tick in which the command before is still in force. */
  readonly oldShare: number;
  readonly tick_s: number;
  /** det(wI − (Φ − I)). */
  readonly denominator: Float64Array;
  /** C adj(wI − (Φ − I)) Γ0 and Γ1. */
  readonly numeratorNow: Float64Array;
  readonly numeratorBefore: Float64Array;
}

/** @param tick_s period of the loop, s */
export function sampled(system: ContinuousSystem, tick_s: number): SampledSystem {
  const ticks = system.delay_s / tick_s;
  // A delay given as a decimal of the tick must not become the tick before by rounding.
  let wholeTicks = Math.floor(ticks + 1e-9);
  let part_s = Math.max(0, system.delay_s - wholeTicks * tick_s);
  if (part_s >= tick_s * (1 - 1e-12)) {
    wholeTicks += 1;
    part_s = 0;
  }
  const late = transitionOver(system, tick_s - part_s);
  const early = transitionOver(system, part_s);
  const transition = late.transition.mmul(early.transition);
  const now = late.input;
  const before = late.transition.mmul(early.input);
  const adjugate = adjugatePolynomial(Matrix.sub(transition, Matrix.eye(transition.rows)));
  const numerator = (input: Matrix) =>
    Float64Array.from(adjugate.matrices, (one) => system.C.mmul(one).mmul(input).get(0, 0));
  return {
    states: transition.rows,
    transition: Float64Array.from(transition.to1DArray()),
    now: Float64Array.from(now.to1DArray()),
    before: Float64Array.from(before.to1DArray()),
    C: Float64Array.from(system.C.to1DArray()),
    disturbance: heldDisturbance(system, tick_s),
    bodyRate: Float64Array.from((system.bodyRate ?? system.C).to1DArray()),
    wholeTicks,
    oldShare: part_s / tick_s,
    tick_s,
    denominator: adjugate.determinant,
    numeratorNow: numerator(now),
    numeratorBefore: numerator(before),
  };
}

function heldDisturbance(system: ContinuousSystem, tick_s: number): Float64Array {
  if (system.disturbance === undefined) return new Float64Array(system.A.rows);
  const { input } = transitionOver({ ...system, B: system.disturbance }, tick_s);
  return Float64Array.from(input.to1DArray());
}

/** det(wI − M) and the matrices of adj(wI − M) by powers of w, lowest first (Faddeev–LeVerrier). */
function adjugatePolynomial(M: Matrix): { determinant: Float64Array; matrices: Matrix[] } {
  const n = M.rows;
  const determinant = new Float64Array(n + 1);
  const matrices: Matrix[] = new Array<Matrix>(n);
  determinant[n] = 1;
  let N = Matrix.eye(n);
  for (let k = n - 1; k >= 0; k--) {
    matrices[k] = N;
    const product = M.mmul(N);
    determinant[k] = -product.trace() / (n - k);
    N = Matrix.add(product, Matrix.mul(Matrix.eye(n), determinant[k]));
  }
  return { determinant, matrices };
}

/** e^{At} and ∫₀ᵗ e^{As} B ds, by Taylor series of the augmented matrix and doubling. */
function transitionOver(system: ContinuousSystem, time_s: number): { transition: Matrix; input: Matrix } {
  const n = system.A.rows;
  const M = Matrix.zeros(n + 1, n + 1);
  M.setSubMatrix(Matrix.mul(system.A, time_s), 0, 0);
  M.setSubMatrix(Matrix.mul(system.B, time_s), 0, n);
  // The scale of B is the units' business; only A decides how often to halve.
  const size = Math.max(...system.A.to1DArray().map((value) => Math.abs(value))) * time_s * n;
  const halvings = Math.max(0, Math.ceil(Math.log2(Math.max(size, 1e-300))) + 3);
  const small = Matrix.mul(M, 2 ** -halvings);
  let result = Matrix.eye(n + 1);
  let term = Matrix.eye(n + 1);
  for (let k = 1; k <= 14; k++) {
    term = term.mmul(small).mul(1 / k);
    result = Matrix.add(result, term);
  }
  for (let k = 0; k < halvings; k++) result = result.mmul(result);
  return {
    transition: result.subMatrix(0, n - 1, 0, n - 1),
    input: result.subMatrix(0, n - 1, n, n),
  };
}
