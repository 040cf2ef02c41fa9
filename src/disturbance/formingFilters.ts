/**
 * Forming filters of Dryden turbulence in units of their own correlation time: each depends only on the
 * distance flown in a step over a length, and its states have fixed variances. A change of airspeed, height or
 * intensity therefore changes how fast and how large, and never makes the air jump.
 */
import type { RandomStream } from '../math/random.ts';
import type { SnapshotReader, SnapshotWriter, Stateful } from '../math/snapshot.ts';
import { ExactStep } from './exactStep.ts';

const SQRT_3 = Math.sqrt(3);

/** First order, unit variance: x' = −x + √2 w; exact for any step. */
export class FirstOrderFilter implements Stateful {
  value = 0;
  private keep = 1;
  private add = 0;

  constructor(private readonly stream: RandomStream) {}

  /** Draws the state from the stationary distribution. */
  start(): void {
    this.value = this.stream.gaussian();
  }

  /** @param advance step over correlation time. */
  set(advance: number): void {
    this.keep = Math.exp(-advance);
    this.add = Math.sqrt(-Math.expm1(-2 * advance));
  }

  step(): void {
    this.value = this.keep * this.value + this.add * this.stream.gaussian();
  }

  save(out: SnapshotWriter): void {
    out.put(this.value);
    this.stream.save(out);
  }

  load(from: SnapshotReader): void {
    this.value = from.take();
    this.stream.load(from);
  }
}

/**
 * Transverse gust of unit variance, H(s) = (1 + √3 s)/(1 + s)², and its gradient along the flight path seen
 * over the span, s/(1 + βs) H(s): one system of three states y, y', e with one noise, so that gust and
 * gradient belong to each other. e = √β · gradient, of order one for any β.
 *
 * y' = z; z' = −y − 2z + w; gust = y + √3 z; β·gradient' = gust' − gradient.
 */
export class TransverseFilter implements Stateful {
  /** Gust, unit variance. */
  gust = 0;
  /** √β times the gradient in units of 1/length. */
  scaledGradient = 0;
  private readonly state = new Float64Array(3);
  private readonly sampled = new ExactStep();
  private readonly A = new Float64Array(9);
  private readonly B = new Float64Array(3);

  constructor(private readonly stream: RandomStream) {}

  /** Draws the state from the stationary distribution for `beta`. */
  start(beta: number): void {
    const { sampled, state, stream } = this;
    transverseSystem(beta, this.A, this.B);
    sampled.setStationary(this.A, this.B);
    const c = sampled.noise;
    const n0 = stream.gaussian();
    const n1 = stream.gaussian();
    const n2 = stream.gaussian();
    state[0] = c[0] * n0;
    state[1] = c[3] * n0 + c[4] * n1;
    state[2] = c[6] * n0 + c[7] * n1 + c[8] * n2;
    this.read();
  }

  /** @param advance step over correlation time; `beta` the span filter's time over correlation time. */
  set(advance: number, beta: number): void {
    transverseSystem(beta, this.A, this.B);
    this.sampled.set(this.A, this.B, advance);
  }

  step(): void {
    const { state, stream } = this;
    const f = this.sampled.transition;
    const c = this.sampled.noise;
    const n0 = stream.gaussian();
    const n1 = stream.gaussian();
    const n2 = stream.gaussian();
    const y = state[0];
    const z = state[1];
    state[0] = f[0] * y + f[1] * z + c[0] * n0;
    state[1] = f[3] * y + f[4] * z + c[3] * n0 + c[4] * n1;
    state[2] = f[6] * y + f[7] * z + f[8] * state[2] + c[6] * n0 + c[7] * n1 + c[8] * n2;
    this.read();
  }

  save(out: SnapshotWriter): void {
    out.putAll(this.state);
    this.stream.save(out);
  }

  load(from: SnapshotReader): void {
    from.takeInto(this.state);
    this.stream.load(from);
    this.read();
  }

  private read(): void {
    const { state } = this;
    this.gust = state[0] + SQRT_3 * state[1];
    this.scaledGradient = state[2];
  }
}

/** Writes A (3 × 3) and B (3) of the transverse system for `beta`. */
export function transverseSystem(beta: number, A: Float64Array, B: Float64Array): void {
  const root = 1 / Math.sqrt(beta);
  A[0] = 0;
  A[1] = 1;
  A[2] = 0;
  A[3] = -1;
  A[4] = -2;
  A[5] = 0;
  A[6] = -SQRT_3 * root;
  A[7] = (1 - 2 * SQRT_3) * root;
  A[8] = -1 / beta;
  B[0] = 0;
  B[1] = 1;
  B[2] = SQRT_3 * root;
}
