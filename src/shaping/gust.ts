/** The loop's answer to a push from outside: a step of angular acceleration, as a gust on the rotors gives. */
import { LoopRun } from './loopRun.ts';
import type { RateLoop } from './rateLoop.ts';

export interface GustResponse {
  readonly t_s: Float64Array;
  /** The body's true rate, deg/s. */
  readonly rate_dps: Float64Array;
  readonly angle_deg: Float64Array;
  readonly peakRate_dps: number;
  /** Angle by which the craft stays turned while the push lasts; with pure rate control nothing brings it back. */
  readonly lastingAngle_deg: number;
  /** Until the rate stays within a tenth of its peak, s; null: not within the record. */
  readonly recovery_s: number | null;
}

const LENGTH_S = 2;
const MOST_TICKS = 40_000;
const RECOVERED = 0.1;

/**
 * @param loop a stable loop around a craft
 * @param acceleration_dps2 of the push, from t = 0 on
 */
export function gustResponse(loop: RateLoop, acceleration_dps2: number, length_s = LENGTH_S): GustResponse {
  const count = Math.min(MOST_TICKS, Math.ceil(length_s / loop.tick_s) + 1);
  const rate_dps = new Float64Array(count);
  const angle_deg = new Float64Array(count);
  const run = new LoopRun(loop);
  let peak = 0;
  let outside = 0;
  for (let k = 0; k < count; k++) {
    rate_dps[k] = run.bodyRate_dps;
    angle_deg[k] = k === 0 ? 0 : angle_deg[k - 1] + (loop.tick_s / 2) * (rate_dps[k - 1] + rate_dps[k]);
    peak = Math.max(peak, Math.abs(rate_dps[k]));
    run.tick(0, acceleration_dps2);
  }
  for (let k = 0; k < count; k++) if (Math.abs(rate_dps[k]) > RECOVERED * peak) outside = k;
  return {
    t_s: Float64Array.from({ length: count }, (_, k) => k * loop.tick_s),
    rate_dps,
    angle_deg,
    peakRate_dps: peak,
    lastingAngle_deg: angle_deg[count - 1],
    recovery_s: outside >= count - 1 ? null : (outside + 1) * loop.tick_s,
  };
}
