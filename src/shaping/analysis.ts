/** Everything that is asked of one axis: stability, margins, step, noise; numbers or null, never NaN. */
import { EigenvalueDecomposition, Matrix } from 'ml-matrix';
import { marginsOf, type Margins } from './margins.ts';
import { closedLoopMatrices, linearTick, openLoopAt, type RateLoop, type TickOutput } from './rateLoop.ts';

export interface StepMetrics {
  /** 10 to 90 % of the final value, s. */
  readonly rise_s: number | null;
  readonly overshoot_pct: number | null;
  /** Until it stays within 2 % of the final value, s. */
  readonly settle_s: number | null;
}

export interface StepResponse {
  readonly t_s: Float64Array;
  readonly y: Float64Array;
  readonly u_us: Float64Array;
}

export interface AxisAnalysis {
  readonly stable: boolean;
  /** Some gain crossing or lower margin means: less gain would also lose it. */
  readonly conditionallyStable: boolean;
  readonly polesMaxRadius: number;
  readonly margins: Margins;
  readonly step: StepMetrics;
  readonly noiseAtMotor_us_rms: number | null;
  /** The margin that is used up first, in words. */
  readonly statement: string;
}

/** Poles within this of the unit circle count as on it. */
const ON_CIRCLE = 1e-9;
/** Lowest frequency looked at, as a share of the Nyquist frequency. */
const LOW_SHARE = 2e-5;

export function closedLoopPoles(loop: RateLoop): { re: number; im: number }[] {
  const { A } = closedLoopMatrices(loop);
  const eigen = new EigenvalueDecomposition(A);
  return eigen.realEigenvalues.map((re, i) => ({ re, im: eigen.imaginaryEigenvalues[i] }));
}

/**
 * @param noise_dps standard deviation of the gyro's noise at a sample, deg/s
 * @param noiseCorrelation of neighbouring samples (first-order), 0 for white
 * @param coarse a quarter of the frequencies and no step: for maps
 */
export function analyse(
  loop: RateLoop,
  noise_dps: number,
  noiseCorrelation = 0,
  coarse = false,
): AxisAnalysis {
  const polesMaxRadius = closedLoopPoles(loop).reduce(
    (most, pole) => Math.max(most, Math.hypot(pole.re, pole.im)),
    0,
  );
  const stable = polesMaxRadius < 1 - ON_CIRCLE;
  const nyquist = Math.PI / loop.tick_s;
  const margins = marginsOf({
    at: (omega) => openLoopAt(loop, omega),
    low: nyquist * LOW_SHARE,
    high: nyquist,
    sampled: true,
    coarse,
  });
  const conditionallyStable = stable && margins.gainReduction_dB !== null;
  return {
    stable,
    conditionallyStable,
    polesMaxRadius,
    margins,
    step:
      stable && !coarse
        ? stepMetrics(stepResponse(loop, polesMaxRadius), loop)
        : { rise_s: null, overshoot_pct: null, settle_s: null },
    noiseAtMotor_us_rms: stable ? noiseAtMotor(loop, noise_dps, noiseCorrelation) : null,
    statement: statementOf(stable, conditionallyStable, margins),
  };
}

function statementOf(stable: boolean, conditional: boolean, margins: Margins): string {
  if (!stable) return 'unstable: the craft would oscillate or depart with these gains';
  const parts: string[] = [];
  if (conditional && margins.gainReduction_dB !== null) {
    parts.push(`conditionally stable: ${(-margins.gainReduction_dB).toFixed(1)} dB less gain loses it too`);
  }
  const delay = margins.delayMargin_ms;
  const gain = margins.gainMargin_dB;
  if (delay !== null && (gain === null || (margins.phaseMargin_deg ?? 180) / 60 <= gain / 8)) {
    parts.push(`${delay.toFixed(delay < 10 ? 1 : 0)} ms more delay and it starts to ring`);
  } else if (gain !== null) {
    parts.push(`${gain.toFixed(1)} dB more gain (× ${(10 ** (gain / 20)).toFixed(2)}) and it starts to ring`);
  } else parts.push('no crossing: neither gain nor delay limits it below half the loop rate');
  return parts.join('; ');
}

/** Response of the plant's output to a unit step of the setpoint, sample by sample, from rest. */
export function stepResponse(loop: RateLoop, polesMaxRadius: number): StepResponse {
  const slow_s = polesMaxRadius >= 1 ? 1 : -loop.tick_s / Math.log(Math.max(1e-9, polesMaxRadius));
  const length_s = Math.max(60 * loop.tick_s, Math.min(30, 9 * slow_s + 20 * loop.tick_s));
  const count = Math.min(250_000, Math.ceil(length_s / loop.tick_s) + 1);
  const t_s = new Float64Array(count);
  const y = new Float64Array(count);
  const u_us = new Float64Array(count);
  let state = new Float64Array(loop.layout.size);
  let next = new Float64Array(loop.layout.size);
  const out: TickOutput = { y: 0, u: 0 };
  for (let k = 0; k < count; k++) {
    linearTick(loop, state, 1, 0, next, out);
    // The loop was at rest at setpoint 0: the first error before the step is 0, as lastError says.
    t_s[k] = k * loop.tick_s;
    y[k] = out.y;
    u_us[k] = out.u;
    [state, next] = [next, state];
  }
  return { t_s, y, u_us };
}

function stepMetrics(response: StepResponse, loop: RateLoop): StepMetrics {
  const { t_s, y } = response;
  const last = y.length - 1;
  // The plant integrates: with P or I the final value is the setpoint's, or what weight and feed-forward make.
  const final = loop.i !== 0 ? 1 : loop.p !== 0 ? loop.setpointWeight + loop.ff / loop.p : y[last];
  if (!Number.isFinite(final) || final === 0) return { rise_s: null, overshoot_pct: null, settle_s: null };
  const share = (k: number) => y[k] / final;
  const firstAbove = (level: number): number | null => {
    for (let k = 1; k <= last; k++) {
      if (share(k) >= level) {
        const part = (level - share(k - 1)) / (share(k) - share(k - 1));
        return t_s[k - 1] + part * (t_s[k] - t_s[k - 1]);
      }
    }
    return null;
  };
  const low = firstAbove(0.1);
  const high = firstAbove(0.9);
  let peak = 0;
  let outside = -1;
  for (let k = 0; k <= last; k++) {
    peak = Math.max(peak, share(k));
    if (Math.abs(share(k) - 1) > 0.02) outside = k;
  }
  return {
    rise_s: low === null || high === null ? null : high - low,
    overshoot_pct: Math.max(0, (peak - 1) * 100),
    settle_s: outside >= last ? null : settleTime(t_s, share, outside),
  };
}

function settleTime(t_s: Float64Array, share: (k: number) => number, outside: number): number {
  if (outside < 0) return 0;
  const edge = share(outside) > 1 ? 1.02 : 0.98;
  const part = (edge - share(outside)) / (share(outside + 1) - share(outside));
  return t_s[outside] + Math.max(0, Math.min(1, part)) * (t_s[outside + 1] - t_s[outside]);
}

/**
 * Standard deviation of the axis command from gyro noise: stationary covariance Σ = A Σ Aᵀ + b bᵀ by doubling,
 * with one more state for noise that a sensor bandwidth has coloured.
 */
export function noiseAtMotor(loop: RateLoop, noise_dps: number, correlation: number): number | null {
  const { A, noiseIn, commandOut, noiseToCommand } = closedLoopMatrices(loop);
  const n = A.rows;
  const F = Matrix.zeros(n + 1, n + 1);
  F.setSubMatrix(A, 0, 0);
  F.setSubMatrix(noiseIn, 0, n);
  F.set(n, n, correlation);
  const drive = Matrix.zeros(n + 1, n + 1);
  drive.set(n, n, noise_dps * noise_dps * (1 - correlation * correlation));
  let covariance = drive;
  let step = F;
  for (let k = 0; k < 60; k++) {
    const add = step.mmul(covariance).mmul(step.transpose());
    covariance = Matrix.add(covariance, add);
    step = step.mmul(step);
    const size = add.to1DArray().reduce((most, value) => Math.max(most, Math.abs(value)), 0);
    const whole = covariance.to1DArray().reduce((most, value) => Math.max(most, Math.abs(value)), 0);
    if (!(whole < 1e30)) return null;
    if (size <= 1e-14 * whole) break;
  }
  const row = Matrix.zeros(1, n + 1);
  row.setSubMatrix(commandOut, 0, 0);
  row.set(0, n, noiseToCommand);
  const variance = row.mmul(covariance).mmul(row.transpose()).get(0, 0);
  return Number.isFinite(variance) && variance >= 0 ? Math.sqrt(variance) : null;
}
