/**
 * Sampled filters of the rate loop: first-order low-pass (step-invariant), biquad low-pass and notch from the
 * Audio EQ Cookbook (W3C Note), direct form II transposed.
 */
import type { SnapshotReader, SnapshotWriter, Stateful } from '../math/snapshot.ts';

/** b0 + b1 z⁻¹ + b2 z⁻² over 1 + a1 z⁻¹ + a2 z⁻². */
export interface BiquadCoefficients {
  readonly b0: number;
  readonly b1: number;
  readonly b2: number;
  readonly a1: number;
  readonly a2: number;
}

/** y_k = y_{k−1} + a (x_k − y_{k−1}) with a = 1 − exp(−2π f_c T). */
export function firstOrderLowPass(cutoff_Hz: number, sample_Hz: number): BiquadCoefficients {
  const pole = Math.exp((-2 * Math.PI * cutoff_Hz) / sample_Hz);
  return { b0: 1 - pole, b1: 0, b2: 0, a1: -pole, a2: 0 };
}

/** Audio EQ Cookbook LPF, Q = 1/√2 (Butterworth). */
export function biquadLowPass(cutoff_Hz: number, sample_Hz: number): BiquadCoefficients {
  const w = (2 * Math.PI * cutoff_Hz) / sample_Hz;
  const alpha = Math.sin(w) * Math.SQRT1_2;
  const a0 = 1 + alpha;
  const b = (1 - Math.cos(w)) / a0;
  return { b0: b / 2, b1: b, b2: b / 2, a1: (-2 * Math.cos(w)) / a0, a2: (1 - alpha) / a0 };
}

/** Audio EQ Cookbook notch. */
export function biquadNotch(centre_Hz: number, q: number, sample_Hz: number): BiquadCoefficients {
  const w = (2 * Math.PI * centre_Hz) / sample_Hz;
  const alpha = Math.sin(w) / (2 * q);
  const a0 = 1 + alpha;
  const middle = (-2 * Math.cos(w)) / a0;
  return { b0: 1 / a0, b1: middle, b2: 1 / a0, a1: middle, a2: (1 - alpha) / a0 };
}

/** A low-pass by kind; null for cutoff 0, which means none. */
export function lowPass(
  cutoff_Hz: number,
  kind: 'first-order' | 'biquad',
  sample_Hz: number,
): BiquadCoefficients | null {
  if (cutoff_Hz === 0) return null;
  return kind === 'biquad' ? biquadLowPass(cutoff_Hz, sample_Hz) : firstOrderLowPass(cutoff_Hz, sample_Hz);
}

/** A chain of filters on one signal. Empty: the signal itself. */
export class FilterChain implements Stateful {
  private coefficients: Float64Array;
  private memory: Float64Array;

  constructor(filters: readonly BiquadCoefficients[]) {
    this.coefficients = pack(filters);
    this.memory = new Float64Array(2 * filters.length);
  }

  /** New coefficients; memory is kept where the chain has the same length, so that nothing jumps. */
  retune(filters: readonly BiquadCoefficients[], settledAt: number): void {
    const next = pack(filters);
    const sameLength = next.length === this.coefficients.length;
    this.coefficients = next;
    if (!sameLength) {
      this.memory = new Float64Array(2 * filters.length);
      this.settle(settledAt);
    }
  }

  /** Puts the memory where it stands after a long constant input (all filters have unity gain at 0 Hz). */
  settle(value: number): void {
    for (let i = 0; i < this.memory.length / 2; i++) {
      const at = 5 * i;
      const c = this.coefficients;
      this.memory[2 * i + 1] = (c[at + 2] - c[at + 4]) * value;
      this.memory[2 * i] = (c[at + 1] - c[at + 3]) * value + this.memory[2 * i + 1];
    }
  }

  next(input: number): number {
    let x = input;
    const c = this.coefficients;
    const m = this.memory;
    for (let i = 0; 2 * i < m.length; i++) {
      const at = 5 * i;
      const y = c[at] * x + m[2 * i];
      m[2 * i] = c[at + 1] * x - c[at + 3] * y + m[2 * i + 1];
      m[2 * i + 1] = c[at + 2] * x - c[at + 4] * y;
      x = y;
    }
    return x;
  }

  save(out: SnapshotWriter): void {
    out.put(this.memory.length);
    out.putAll(this.coefficients);
    out.putAll(this.memory);
  }

  load(from: SnapshotReader): void {
    const size = from.take();
    this.coefficients = new Float64Array((size / 2) * 5);
    this.memory = new Float64Array(size);
    from.takeInto(this.coefficients);
    from.takeInto(this.memory);
  }
}

function pack(filters: readonly BiquadCoefficients[]): Float64Array {
  return Float64Array.from(filters.flatMap((f) => [f.b0, f.b1, f.b2, f.a1, f.a2]));
}
