/**
 * From a stick's raw reading to a demand: calibration (centre, ends, reverse), deadband, curve, slew; and the
 * four customary stick modes, which say what each of the two sticks' ways means. The largest rate per axis,
 * which turns a demand into deg/s, is the gains' own (`maxRate_dps`).
 */

/** One physical axis as it was calibrated. */
export interface StickCalibration {
  /** Index of the axis on its device. */
  readonly axis: number;
  readonly low: number;
  readonly centre: number;
  readonly high: number;
  readonly reverse: boolean;
}

export interface StickFeel {
  /** Share of the travel around the middle that means zero, 0 … 0.3. */
  readonly deadband: number;
  /** 0 linear … 1 all cubic: y = (1 − c) x + c x³. */
  readonly curve: number;
}

export const PLAIN_FEEL: StickFeel = { deadband: 0.03, curve: 0.35 };

/** −1 … 1 from a raw reading: each side of the centre scaled to its own end. */
export function calibrated(raw: number, c: StickCalibration): number {
  if (!Number.isFinite(raw)) return 0;
  const side = raw >= c.centre ? c.high - c.centre : c.centre - c.low;
  const share = side > 1e-6 ? (raw - c.centre) / side : 0;
  const value = Math.max(-1, Math.min(1, share));
  return c.reverse ? -value : value;
}

/** Deadband, then curve; odd, monotone, continuous, ends at ±1. */
export function shaped(value: number, feel: StickFeel): number {
  const size = Math.abs(value);
  if (size <= feel.deadband) return 0;
  const x = Math.min(1, (size - feel.deadband) / (1 - feel.deadband));
  return Math.sign(value) * ((1 - feel.curve) * x + feel.curve * x * x * x);
}

/**
 * Where a demand stands after `dt_s` when it may move no faster than `slew_per_s`, in shares of half the travel
 * (0: at once).
 */
export function slewed(now: number, wanted: number, slew_per_s: number, dt_s: number): number {
  if (slew_per_s <= 0) return wanted;
  const most = slew_per_s * dt_s;
  return now + Math.max(-most, Math.min(most, wanted - now));
}

/** 0 … 1 from a throttle stick that was calibrated like any other. */
export function throttleShare(value: number): number {
  return Math.max(0, Math.min(1, (value + 1) / 2));
}

export type StickMode = 1 | 2 | 3 | 4;

/** Ways of the two sticks. */
export interface StickWays {
  leftX: number;
  leftY: number;
  rightX: number;
  rightY: number;
}

export interface StickDemand {
  roll: number;
  pitch: number;
  yaw: number;
  /** −1 … 1, up positive. */
  lift: number;
}

/**
 * The four customary modes (common practice, no source): Mode 1 pitch left, throttle right; Mode 2 throttle
 * left, pitch right; Mode 3 is Mode 2 and Mode 4 is Mode 1 with the sticks' sides changed. Y is positive away
 * from the pilot: forward stick lowers the nose.
 */
export function demandOf(ways: StickWays, mode: StickMode, into: StickDemand): void {
  const swapped = mode === 3 || mode === 4;
  const pitchLeft = mode === 1 || mode === 3;
  const yaw = swapped ? ways.rightX : ways.leftX;
  const roll = swapped ? ways.leftX : ways.rightX;
  into.roll = roll;
  into.yaw = yaw;
  into.pitch = -(pitchLeft ? ways.leftY : ways.rightY);
  into.lift = pitchLeft ? ways.rightY : ways.leftY;
}
