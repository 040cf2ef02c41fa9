/**
 * The pilot's seat: keys, touch and gamepad brought to one set of sticks, with the bench's assists. Whatever
 * moved last flies.
 */
import { signal } from '@preact/signals';
import type { Sticks } from '../../flight/pilot.ts';
import { GamepadSticks, settingsFor, type DeviceSettings } from './gamepadSticks.ts';
import { KeyboardSticks } from './keyboardSticks.ts';
import { PadChoice } from './padChoice.ts';
import type { TouchStick } from './touchSticks.ts';

export type Source = 'keys' | 'touch' | 'gamepad';

export interface SeatState {
  readonly source: Source;
  readonly armed: boolean;
  readonly levelling: boolean;
  readonly heightHold: boolean;
  readonly device: string | null;
  /** The device's axes are not the API's standard ones and were never calibrated here: it does not fly. */
  readonly uncalibrated: boolean;
}

/** Stick movement that hands over to a device. */
const WAKE = 0.15;
/** A throttle stick above this does not arm: the craft would leap. */
const LOW_THROTTLE = 0.1;
/** Height hold's throttle stick above its middle by this much asks to climb. */
const LIFT = 0.03;
/** On the ground for so long without a wish to climb: the motors idle, s. */
const SETTLED_S = 0.3;

export class Seat {
  readonly keys = new KeyboardSticks();
  readonly left: TouchStick = { x: 0, y: 0, active: false };
  readonly right: TouchStick = { x: 0, y: 0, active: false };
  readonly state = signal<SeatState>({
    source: 'keys',
    armed: false,
    levelling: true,
    heightHold: true,
    device: null,
    uncalibrated: false,
  });
  readonly sticks: Sticks = {
    roll: 0,
    pitch: 0,
    yaw: 0,
    throttle: 0.5,
    armed: false,
    levelling: true,
    heightHold: true,
    moored: false,
  };
  /** The device went away. */
  onLost: (id: string) => void = () => undefined;
  /** Another input took over, with its own assists. */
  onSource: (source: Source) => void = () => undefined;
  /** While a device is being calibrated its sticks do not fly. */
  calibrating = false;
  private readonly pad = new GamepadSticks();
  private readonly choice = new PadChoice();
  private padSettings: DeviceSettings | null = null;
  private padKept: unknown = null;
  private padId: string | null = null;
  /** Throttle of the device when it was last not flying. */
  private padThrottle = 0;
  private touchThrottle = 0.5;
  private onGround_s = SETTLED_S;

  constructor(
    /** Settings kept for a device, by its id. */
    private readonly kept: (id: string) => unknown,
    private readonly pads: () => readonly (Gamepad | null)[] = () => navigator.getGamepads?.() ?? [],
  ) {}

  /** Arms or disarms. False: refused, because the throttle stick is not down. */
  arm(armed: boolean): boolean {
    const { source, heightHold } = this.state.value;
    if (armed && source === 'gamepad' && !heightHold && this.pad.throttle > LOW_THROTTLE) return false;
    this.state.value = { ...this.state.value, armed };
    // Height hold waits at the middle; without it a start is at the lowest throttle.
    this.setThrottle(heightHold ? 0.5 : 0);
    this.onGround_s = SETTLED_S;
    return true;
  }

  setAssists(change: { levelling?: boolean; heightHold?: boolean }, hoverThrottle: number): void {
    const before = this.state.value;
    this.state.value = { ...before, ...change };
    // Letting go of height hold leaves the craft where it was: near the throttle that hovers.
    if (before.heightHold && change.heightHold === false) this.setThrottle(hoverThrottle);
    else if (!before.heightHold && change.heightHold === true) this.setThrottle(0.5);
  }

  /** Takes up what stood at another instant of the flight, after a rewind. */
  restore({ armed, levelling, heightHold, throttle }: Sticks): void {
    this.state.value = { ...this.state.value, armed, levelling, heightHold };
    this.setThrottle(heightHold ? 0.5 : throttle);
    this.onGround_s = 0;
  }

  /** What the device's sticks ask for, after calibration, deadband, curve and slew; throttle as −1 … 1. */
  get padDemand(): Readonly<Record<'roll' | 'pitch' | 'yaw' | 'throttle', number>> {
    const { roll, pitch, yaw, throttle } = this.pad;
    return { roll, pitch, yaw, throttle: 2 * throttle - 1 };
  }

  /** The gamepad that was moved last, or the first one that is plugged in; null: none. */
  device(): Gamepad | null {
    return this.choice.of(this.pads());
  }

  /** Moves all inputs on by `dt_s`; the result is in `sticks`. `touching`: the craft touches something. */
  advance(dt_s: number, touching = false): void {
    this.keys.advance(dt_s, this.state.value.heightHold);
    this.readPad(dt_s);
    this.chooseSource();
    this.fill(dt_s);
    this.restOnGround(dt_s, touching);
  }

  private setThrottle(share: number): void {
    this.keys.setThrottle(share);
    this.touchThrottle = share;
  }

  private readPad(dt_s: number): void {
    const pad = this.device();
    const kept = pad === null ? null : this.kept(pad.id);
    if (pad !== null && (pad.id !== this.padId || kept !== this.padKept)) {
      const { settings, known } = settingsFor(kept, pad.mapping === 'standard');
      this.padSettings = settings;
      this.padKept = kept;
      this.padId = pad.id;
      this.state.value = { ...this.state.value, device: pad.id, uncalibrated: !known };
      this.pad.read(pad, settings, dt_s);
      this.padThrottle = this.pad.throttle;
    }
    if (this.padSettings === null) return;
    this.pad.read(pad, this.padSettings, dt_s);
    if (!this.pad.lost) return;
    this.pad.lost = false;
    const id = this.padId ?? '';
    this.padId = null;
    // Sticks neutral, throttle held; keys take over from that throttle, with their assists.
    if (this.state.value.source === 'gamepad') {
      this.setThrottle(this.state.value.heightHold ? 0.5 : this.pad.throttle);
    }
    this.state.value = { ...this.state.value, device: null, uncalibrated: false };
    this.onLost(id);
  }

  private chooseSource(): void {
    const { source, device, uncalibrated } = this.state.value;
    const { pad } = this;
    const travel = Math.max(
      Math.abs(pad.roll),
      Math.abs(pad.pitch),
      Math.abs(pad.yaw),
      Math.abs(pad.throttle - this.padThrottle),
    );
    const padMoves = device !== null && !uncalibrated && !this.calibrating && travel > WAKE;
    let next: Source = source;
    if (this.left.active || this.right.active) next = 'touch';
    else if (this.keys.busy) next = 'keys';
    else if (padMoves) next = 'gamepad';
    if (next !== 'gamepad') this.padThrottle = pad.throttle;
    if (next === source) return;
    // Assists are on for keys and touch, off for sticks, until the person says otherwise.
    const assisted = next !== 'gamepad';
    const change = (source === 'gamepad') !== (next === 'gamepad');
    this.state.value = {
      ...this.state.value,
      source: next,
      ...(change ? { levelling: assisted, heightHold: assisted } : {}),
    };
    if (change && assisted) this.setThrottle(0.5);
    if (change) this.onSource(next);
  }

  private fill(dt_s: number): void {
    const { sticks, keys, pad, left, right } = this;
    const { source, armed, levelling, heightHold } = this.state.value;
    sticks.armed = armed;
    sticks.levelling = levelling;
    sticks.heightHold = heightHold;
    if (source === 'gamepad') {
      const still = this.calibrating;
      sticks.roll = still ? 0 : pad.roll;
      sticks.pitch = still ? 0 : pad.pitch;
      sticks.yaw = still ? 0 : pad.yaw;
      if (!still) sticks.throttle = pad.throttle;
    } else if (source === 'touch') {
      // Left thumb turns and lifts, right thumb tilts.
      this.touchThrottle = heightHold
        ? 0.5 + 0.5 * left.y
        : Math.max(0, Math.min(1, this.touchThrottle + 0.6 * left.y * dt_s));
      sticks.roll = right.x;
      sticks.pitch = -right.y;
      sticks.yaw = left.x;
      sticks.throttle = this.touchThrottle;
    } else {
      sticks.roll = keys.roll;
      sticks.pitch = keys.pitch;
      sticks.yaw = keys.yaw;
      sticks.throttle = keys.throttle;
    }
  }

  /**
   * Height hold on the ground would carry the craft's weight on its motors, ready to skate. Until the person
   * asks to climb, the motors idle there.
   */
  private restOnGround(dt_s: number, touching: boolean): void {
    const { sticks } = this;
    if (!touching || !sticks.heightHold || sticks.throttle > 0.5 + LIFT) this.onGround_s = 0;
    else this.onGround_s += dt_s;
    if (this.onGround_s < SETTLED_S) return;
    sticks.heightHold = false;
    sticks.throttle = 0;
  }
}
