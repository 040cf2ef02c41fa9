/**
 * Gyro noise through the closed loop, in closed form: stationary covariance of the linear loop driven by white or
 * first-order coloured noise; for loops too large for that, the integral of the noise spectrum.
 */
import { complex, magnitude, over, plus } from './complex.ts';
import { closedLoopMatrices, feedbackAt, openLoopAt, type RateLoop } from './rateLoop.ts';

/** Noise of one gyro sample: standard deviation and correlation with the next. */
export interface GyroNoise {
  readonly sigma_dps: number;
  readonly correlation: number;
}

/** White noise of density N sampled at the loop rate, σ = N √(f_s/2), or coloured by the sensor's bandwidth. */
export function gyroNoise(density: number, bandwidth_Hz: number, loop_Hz: number): GyroNoise {
  if (bandwidth_Hz === 0) return { sigma_dps: density * Math.sqrt(loop_Hz / 2), correlation: 0 };
  return {
    sigma_dps: density * Math.sqrt((Math.PI / 2) * bandwidth_Hz),
    correlation: Math.exp((-2 * Math.PI * bandwidth_Hz) / loop_Hz),
  };
}

const LARGEST_MATRIX = 64;
const MOST_DOUBLINGS = 60;

/** Standard deviation of the axis command of a stable loop, µs; null when it does not settle. */
export function noiseAtMotor(loop: RateLoop, noise: GyroNoise): number | null {
  if (loop.layout.size > LARGEST_MATRIX) return noiseBySpectrum(loop, noise);
  const noisy = noisyLoop(loop, noise);
  const covariance = stationary(noisy);
  return covariance === null ? null : deviation(covariance, noisy.command);
}

/** The closed loop with one more state, the noise itself: x ← F x + drive on the last; row that gives u. */
export interface NoisyLoop {
  readonly size: number;
  readonly F: Float64Array;
  readonly drive: number;
  readonly command: Float64Array;
}

export function noisyLoop(loop: RateLoop, noise: GyroNoise): NoisyLoop {
  const { A, noiseIn, commandOut, noiseToCommand } = closedLoopMatrices(loop);
  const n = A.rows + 1;
  const F = new Float64Array(n * n);
  const command = new Float64Array(n);
  for (let i = 0; i < n - 1; i++) {
    for (let j = 0; j < n - 1; j++) F[i * n + j] = A.get(i, j);
    F[i * n + n - 1] = noiseIn.get(i, 0);
    command[i] = commandOut.get(0, i);
  }
  F[n * n - 1] = noise.correlation;
  command[n - 1] = noiseToCommand;
  return { size: n, F, drive: noise.sigma_dps ** 2 * (1 - noise.correlation ** 2), command };
}

/** Whether the covariance of this loop is small enough to be worked out. */
export const hasCovariance = (loop: RateLoop): boolean => loop.layout.size <= LARGEST_MATRIX;

/**
 * Σ = F Σ Fᵀ + drive, by doubling: Σ ← Σ + S Σ Sᵀ, S ← S².
 * @returns row by row; null when the sum does not settle
 */
export function stationary({ size: n, F, drive }: NoisyLoop): Float64Array | null {
  let step = F;
  const sum = new Float64Array(n * n);
  sum[n * n - 1] = drive;
  for (let k = 0; k < MOST_DOUBLINGS; k++) {
    const add = sandwich(step, sum, n);
    let most = 0;
    let change = 0;
    for (let i = 0; i < n * n; i++) {
      sum[i] += add[i];
      most = Math.max(most, Math.abs(sum[i]));
      change = Math.max(change, Math.abs(add[i]));
    }
    if (!(most < 1e60)) return null;
    if (change <= 1e-13 * most) return sum;
    step = product(step, step, n);
  }
  return null;
}

/** √(r Σ rᵀ). */
export function deviation(covariance: Float64Array, row: Float64Array): number | null {
  const n = row.length;
  let variance = 0;
  for (let i = 0; i < n; i++) for (let j = 0; j < n; j++) variance += row[i] * covariance[i * n + j] * row[j];
  return variance >= 0 && Number.isFinite(variance) ? Math.sqrt(variance) : null;
}

function product(a: Float64Array, b: Float64Array, n: number): Float64Array {
  const out = new Float64Array(n * n);
  for (let i = 0; i < n; i++) {
    for (let k = 0; k < n; k++) {
      const value = a[i * n + k];
      if (value === 0) continue;
      for (let j = 0; j < n; j++) out[i * n + j] += value * b[k * n + j];
    }
  }
  return out;
}

/** S M Sᵀ. */
function sandwich(S: Float64Array, M: Float64Array, n: number): Float64Array {
  const left = product(S, M, n);
  const out = new Float64Array(n * n);
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) {
      let sum = 0;
      for (let k = 0; k < n; k++) sum += left[i * n + k] * S[j * n + k];
      out[i * n + j] = sum;
    }
  }
  return out;
}

const SPECTRUM_POINTS = 6000;

/** σ² = (1/π) ∫₀^π |C/(1+L)|² S dθ by trapezoids over a grid that is fine at both ends. */
function noiseBySpectrum(loop: RateLoop, noise: GyroNoise): number | null {
  const linear = Math.min(80_000, Math.max(SPECTRUM_POINTS, 16 * loop.plant.wholeTicks));
  const thetas = [
    ...Array.from({ length: SPECTRUM_POINTS }, (_, k) => Math.PI * 1e-7 ** (1 - k / SPECTRUM_POINTS)),
    ...Array.from({ length: linear }, (_, k) => (Math.PI * (k + 1)) / linear),
  ].sort((a, b) => a - b);
  const rho = noise.correlation;
  const density = (theta: number) => {
    const omega = theta / loop.tick_s;
    const gain = over(feedbackAt(loop, omega), plus(openLoopAt(loop, omega), complex(1)));
    const colour = (1 - rho * rho) / (1 + rho * rho - 2 * rho * Math.cos(theta));
    return magnitude(gain) ** 2 * colour;
  };
  let sum = 0;
  let last = density(thetas[0]);
  for (let k = 1; k < thetas.length; k++) {
    const value = density(thetas[k]);
    sum += 0.5 * (value + last) * (thetas[k] - thetas[k - 1]);
    last = value;
  }
  const result = noise.sigma_dps * Math.sqrt(sum / Math.PI);
  return Number.isFinite(result) ? result : null;
}
