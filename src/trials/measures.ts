/** Measures of a record that several trials share. */
import { AXES } from '../craft/gains.ts';
import { CORNERS } from '../craft/build.ts';
import { DEG_PER_RAD } from '../math/angles.ts';
import type { Recorder } from '../flight/record.ts';

/** Signals that the trials' measures need. */
export const TRIAL_SIGNALS: readonly string[] = [
  't_s',
  ...AXES.flatMap((axis) => [`sp_${axis}_dps`, `rate_${axis}_dps`, `u_${axis}_us`]),
  ...CORNERS.flatMap((corner) => [`cmd_${corner}_us`, `heat_${corner}_W`, `saturated_${corner}`]),
  ...['throttle', 'north_m', 'east_m', 'down_m', 'vn_mps', 've_mps', 'vd_mps', 'qw', 'qx', 'qy', 'qz'],
  ...['battery_V', 'current_A', 'touching'],
];

/** Rows [from, to) of times within [from_s, to_s]. */
export function rowsBetween(record: Recorder, from_s: number, to_s: number): [number, number] {
  const t = record.column('t_s');
  let from = 0;
  while (from < t.length && t[from] < from_s) from++;
  let to = from;
  while (to < t.length && t[to] <= to_s) to++;
  return [from, to];
}

export function rms(values: Float64Array, from = 0, to = values.length): number {
  let sum = 0;
  for (let k = from; k < to; k++) sum += values[k] * values[k];
  return to > from ? Math.sqrt(sum / (to - from)) : 0;
}

export function mean(values: Float64Array, from = 0, to = values.length): number {
  let sum = 0;
  for (let k = from; k < to; k++) sum += values[k];
  return to > from ? sum / (to - from) : 0;
}

/** Largest tilt from level, deg, rows [from, to). */
export function peakTilt_deg(record: Recorder, from: number, to: number): number {
  const x = record.column('qx');
  const y = record.column('qy');
  let most = 0;
  for (let k = from; k < to; k++) {
    most = Math.max(most, Math.acos(Math.max(-1, Math.min(1, 1 - 2 * (x[k] * x[k] + y[k] * y[k])))));
  }
  return most * DEG_PER_RAD;
}

/** Largest distance in the plane from where it was at row `from`, m. */
export function peakDrift_m(record: Recorder, from: number, to: number): number {
  const n = record.column('north_m');
  const e = record.column('east_m');
  let most = 0;
  for (let k = from; k < to; k++) most = Math.max(most, Math.hypot(n[k] - n[from], e[k] - e[from]));
  return most;
}

/** Largest change of height from row `from`, m. */
export function peakHeightError_m(record: Recorder, from: number, to: number): number {
  const d = record.column('down_m');
  let most = 0;
  for (let k = from; k < to; k++) most = Math.max(most, Math.abs(d[k] - d[from]));
  return most;
}

/** Below this a command follows the flight; above it the noise, Hz. */
const SLOW_PART_HZ = 5;

/** Rms over the motors of the commands less their slow part (first-order, 5 Hz), µs: what gyro noise does to them. */
export function motorActivity_us(record: Recorder, from: number, to: number): number {
  const t = record.column('t_s');
  if (to - from < 3) return 0;
  const follow = 1 - Math.exp(-2 * Math.PI * SLOW_PART_HZ * (t[from + 1] - t[from]));
  let sum = 0;
  for (const corner of CORNERS) {
    const command = record.column(`cmd_${corner}_us`);
    let slow = mean(command, from, to);
    let square = 0;
    for (let k = from; k < to; k++) {
      slow += follow * (command[k] - slow);
      square += (command[k] - slow) ** 2;
    }
    sum += square / (to - from);
  }
  return Math.sqrt(sum / 4);
}

/** Mean winding heat of a motor, W. */
export function windingHeat_W(record: Recorder, from: number, to: number): number {
  return CORNERS.reduce((sum, corner) => sum + mean(record.column(`heat_${corner}_W`), from, to) / 4, 0);
}

/** Share of ticks in which any command stood at a limit, %. */
export function saturation_pct(record: Recorder, from: number, to: number): number {
  const columns = CORNERS.map((corner) => record.column(`saturated_${corner}`));
  let hit = 0;
  for (let k = from; k < to; k++) if (columns.some((column) => column[k] !== 0)) hit++;
  return to > from ? (100 * hit) / (to - from) : 0;
}

/** Mean power drawn from the pack, W. */
export function power_W(record: Recorder, from: number, to: number): number {
  const volts = record.column('battery_V');
  const amps = record.column('current_A');
  let sum = 0;
  for (let k = from; k < to; k++) sum += volts[k] * amps[k];
  return to > from ? sum / (to - from) : 0;
}

/** Root mean square of setpoint minus rate, deg/s, over all axes. */
export function rateError_dps(record: Recorder, from: number, to: number): number {
  let sum = 0;
  for (const axis of AXES) {
    const sp = record.column(`sp_${axis}_dps`);
    const rate = record.column(`rate_${axis}_dps`);
    for (let k = from; k < to; k++) sum += (sp[k] - rate[k]) ** 2;
  }
  return to > from ? Math.sqrt(sum / (to - from)) : 0;
}

/** Time of the first touch of anything solid; the end of the rows when there was none, s. */
export function timeToTouch_s(record: Recorder, from: number, to: number): number {
  const touching = record.column('touching');
  const t = record.column('t_s');
  for (let k = from; k < to; k++) if (touching[k] !== 0) return t[k];
  return to > 0 ? t[to - 1] : 0;
}

export interface StepScores {
  /** From the first crossing of 10 % to that of 90 %, s. */
  readonly rise_s: number;
  readonly overshoot_pct: number;
  /** From the step until it stays within the settling band, s. */
  readonly settle_s: number;
  /** Difference of the mean over the last fifth from the step, % of the step. */
  readonly steadyError_pct: number;
}

/**
 * Step metrics of a response to a step of `size` (either sign) at `start_s`, held to `end_s`. NaN where a level
 * was never reached.
 * @param band settling band, share of the step
 */
export function stepScores(
  t_s: Float64Array,
  response: Float64Array,
  start_s: number,
  end_s: number,
  size: number,
  band = 0.05,
): StepScores {
  // Times are sums of ticks: a step due at the tick's own time must find it.
  let from = t_s.findIndex((t) => t >= start_s - 1e-9);
  if (from === -1) from = t_s.length;
  let to = t_s.findIndex((t) => t > end_s + 1e-9);
  if (to === -1) to = t_s.length;
  if (to <= from) return { rise_s: NaN, overshoot_pct: NaN, settle_s: NaN, steadyError_pct: NaN };
  const share = (k: number) => response[k] / size;
  const crossing = (level: number): number => {
    for (let k = from; k < to; k++) {
      if (share(k) < level) continue;
      if (k === from) return t_s[k];
      const part = (level - share(k - 1)) / (share(k) - share(k - 1));
      return t_s[k - 1] + part * (t_s[k] - t_s[k - 1]);
    }
    return NaN;
  };
  let peak = 0;
  let settled = from;
  for (let k = from; k < to; k++) {
    peak = Math.max(peak, share(k));
    if (Math.abs(share(k) - 1) > band) settled = k + 1;
  }
  const tail = from + Math.floor(0.8 * (to - from));
  return {
    rise_s: crossing(0.9) - crossing(0.1),
    overshoot_pct: Math.max(0, (peak - 1) * 100),
    settle_s: settled < to ? t_s[settled] - start_s : NaN,
    steadyError_pct: Math.abs(mean(response, tail, to) / size - 1) * 100,
  };
}
