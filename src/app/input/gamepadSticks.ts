/**
 * Gamepads and USB transmitters through the W3C Gamepad API: which axis means what, calibrated per device,
 * and safe when unplugged: sticks neutral, throttle held, and said so.
 */
import { z } from 'zod';
import {
  calibrated,
  demandOf,
  PLAIN_FEEL,
  shaped,
  slewed,
  throttleShare,
  type StickCalibration,
  type StickDemand,
  type StickWays,
} from '../../control/sticks.ts';

/** The four ways of the two sticks, in the order the walk-through asks for them. */
export const WAYS = ['leftX', 'leftY', 'rightX', 'rightY'] as const;
export type Way = (typeof WAYS)[number];

const calibration = z.strictObject({
  axis: z.number().int().min(0).max(63),
  low: z.number().min(-10).max(10),
  centre: z.number().min(-10).max(10),
  high: z.number().min(-10).max(10),
  reverse: z.boolean(),
});

export const deviceSchema = z.strictObject({
  ways: z.strictObject({
    leftX: calibration,
    leftY: calibration,
    rightX: calibration,
    rightY: calibration,
  }),
  mode: z.union([z.literal(1), z.literal(2), z.literal(3), z.literal(4)]),
  deadband: z.number().min(0).max(0.3),
  curve: z.number().min(0).max(1),
  /** Fastest movement of roll, pitch and yaw, shares of half the travel a second; 0: as fast as the hand. */
  slew_per_s: z.number().min(0).max(50).default(0),
  /** The throttle stick stays where it is put (a transmitter), or springs back (a gamepad). */
  throttleStays: z.boolean(),
});
export type DeviceSettings = z.output<typeof deviceSchema>;

const standardAxis = (axis: number, reverse: boolean): StickCalibration => ({
  axis,
  low: -1,
  centre: 0,
  high: 1,
  reverse,
});

/** What the API's standard mapping says: axes 0…3 are left x, left y, right x, right y; y is down positive. */
export const STANDARD_DEVICE: DeviceSettings = {
  ways: {
    leftX: standardAxis(0, false),
    leftY: standardAxis(1, true),
    rightX: standardAxis(2, false),
    rightY: standardAxis(3, true),
  },
  mode: 2,
  deadband: 0.08,
  curve: PLAIN_FEEL.curve,
  slew_per_s: 0,
  throttleStays: false,
};

/** What this code needs of a Gamepad; a test hands in its own. */
export interface PadReading {
  readonly id: string;
  readonly connected: boolean;
  readonly axes: readonly number[];
}

/** Settings kept for a device, or what can be assumed of it; `known` is false for an uncalibrated transmitter. */
export function settingsFor(kept: unknown, standard: boolean): { settings: DeviceSettings; known: boolean } {
  const parsed = deviceSchema.safeParse(kept);
  if (parsed.success) return { settings: parsed.data, known: true };
  return { settings: STANDARD_DEVICE, known: standard };
}

export class GamepadSticks {
  roll = 0;
  pitch = 0;
  yaw = 0;
  /** 0 … 1. */
  throttle = 0;
  /** The device went away since it was last there. */
  lost = false;
  private present = false;
  private readonly ways: StickWays = { leftX: 0, leftY: 0, rightX: 0, rightY: 0 };
  private readonly demand: StickDemand = { roll: 0, pitch: 0, yaw: 0, lift: 0 };

  /** Takes one reading, `dt_s` after the last; null: no device. Returns whether a device is there. */
  read(pad: PadReading | null, settings: DeviceSettings, dt_s: number): boolean {
    if (pad === null || !pad.connected) {
      if (this.present) this.lost = true;
      this.present = false;
      // Sticks neutral, throttle held.
      this.roll = this.pitch = this.yaw = 0;
      return false;
    }
    this.present = true;
    this.lost = false;
    for (const way of WAYS) {
      const c = settings.ways[way];
      this.ways[way] = calibrated(pad.axes[c.axis] ?? c.centre, c);
    }
    demandOf(this.ways, settings.mode, this.demand);
    const slew = settings.slew_per_s;
    this.roll = slewed(this.roll, shaped(this.demand.roll, settings), slew, dt_s);
    this.pitch = slewed(this.pitch, shaped(this.demand.pitch, settings), slew, dt_s);
    this.yaw = slewed(this.yaw, shaped(this.demand.yaw, settings), slew, dt_s);
    this.throttle = throttleShare(
      settings.throttleStays ? this.demand.lift : shaped(this.demand.lift, settings),
    );
    return true;
  }
}

// --- Calibration walk-through -------------------------------------------------------------------------------

/** The steps, in order: hands off, then each way pushed fully one way and the other. */
export type WalkStep =
  | { readonly kind: 'centre' }
  | { readonly kind: 'way'; readonly way: Way }
  | { readonly kind: 'done'; readonly settings: DeviceSettings }
  | { readonly kind: 'failed'; readonly reason: string };

/** Travel that picks an axis, of the API's −1 … 1. */
const PICK_TRAVEL = 0.5;

/**
 * Walks a person through a device: feed it readings, show `step`, press on with `next()`. Each way is found by
 * which axis moves most; its first movement gives the direction (right, or away from the pilot).
 */
export class CalibrationWalk {
  step: WalkStep = { kind: 'centre' };
  private centre: number[] = [];
  private low: number[] = [];
  private high: number[] = [];
  private firstSign: number[] = [];
  private readonly found: Partial<Record<Way, StickCalibration>> = {};

  constructor(private readonly base: DeviceSettings) {}

  /** How far the way being asked for has moved, −1 … 1 of the raw range, for the page's bar. */
  progress(): { low: number; high: number } {
    const axis = this.candidate();
    return axis === null
      ? { low: 0, high: 0 }
      : { low: this.low[axis] - this.centre[axis], high: this.high[axis] - this.centre[axis] };
  }

  feed(axes: readonly number[]): void {
    if (this.step.kind === 'centre') {
      this.centre = [...axes];
      return;
    }
    if (this.step.kind !== 'way') return;
    axes.forEach((value, i) => {
      this.low[i] = Math.min(this.low[i] ?? value, value);
      this.high[i] = Math.max(this.high[i] ?? value, value);
      const moved = value - (this.centre[i] ?? 0);
      if (this.firstSign[i] === 0 && Math.abs(moved) > PICK_TRAVEL) this.firstSign[i] = Math.sign(moved);
    });
  }

  /** The person says this step is done. */
  next(): void {
    if (this.step.kind === 'centre') {
      if (this.centre.length < 4) {
        this.step = { kind: 'failed', reason: `the device has ${this.centre.length} axes; four are needed` };
        return;
      }
      this.ask(WAYS[0]);
      return;
    }
    if (this.step.kind !== 'way') return;
    const axis = this.candidate();
    if (axis === null) return;
    const { way } = this.step;
    this.found[way] = {
      axis,
      low: this.low[axis],
      centre: this.centreOf(axis),
      high: this.high[axis],
      reverse: this.firstSign[axis] < 0,
    };
    const index = WAYS.indexOf(way) + 1;
    if (index < WAYS.length) this.ask(WAYS[index]);
    else this.finish();
  }

  /** The axis that has moved most and is not taken; null while none has moved enough. */
  private candidate(): number | null {
    const taken = Object.values(this.found).map((one) => one.axis);
    let best: number | null = null;
    let most = PICK_TRAVEL;
    this.high.forEach((high, i) => {
      const travel = high - this.low[i];
      if (!taken.includes(i) && travel > most) {
        best = i;
        most = travel;
      }
    });
    return best;
  }

  /** A throttle that stays down has its resting place at an end: then the middle of the travel is the centre. */
  private centreOf(axis: number): number {
    const { low, high } = { low: this.low[axis], high: this.high[axis] };
    const share = (this.centre[axis] - low) / (high - low);
    return share > 0.2 && share < 0.8 ? this.centre[axis] : (low + high) / 2;
  }

  private ask(way: Way): void {
    this.step = { kind: 'way', way };
    this.low = [...this.centre];
    this.high = [...this.centre];
    this.firstSign = this.centre.map(() => 0);
  }

  private finish(): void {
    const { leftX, leftY, rightX, rightY } = this.found;
    if (leftX === undefined || leftY === undefined || rightX === undefined || rightY === undefined) {
      this.step = { kind: 'failed', reason: 'a stick way was not found' };
      return;
    }
    const restsLow = [leftY, rightY].some(
      (one) => Math.abs(this.centre[one.axis] - one.centre) > 0.25 * (one.high - one.low),
    );
    this.step = {
      kind: 'done',
      settings: { ...this.base, ways: { leftX, leftY, rightX, rightY }, throttleStays: restsLow },
    };
  }
}
