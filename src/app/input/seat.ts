/**
 * The pilot's seat: keys, touch and gamepad brought to one set of sticks, with the bench's assists. Whatever
 * moved last flies.
 */
import { signal } from '@preact/signals';
import type { Sticks } from '../../flight/pilot.ts';
import { GamepadSticks, settingsFor, type DeviceSettings } from './gamepadSticks.ts';
import { KeyboardSticks } from './keyboardSticks.ts';
import type { TouchStick } from './touchSticks.ts';

export type Source = 'keys' | 'touch' | 'gamepad';

export interface SeatState {
  readonly source: Source;
  readonly armed: boolean;
  readonly levelling: boolean;
  readonly heightHold: boolean;
  readonly device: string | null;
  /** The device has axes that were never calibrated here. */
  readonly uncalibrated: boolean;
}

/** Stick movement that hands over to a device. */
const WAKE = 0.15;

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
  /** The device went away in flight. */
  onLost: (id: string) => void = () => undefined;
  private readonly pad = new GamepadSticks();
  private padSettings: DeviceSettings | null = null;
  private padKept: unknown = null;
  private padId: string | null = null;
  private touchThrottle = 0.5;

  constructor(
    /** Settings kept for a device, by its id. */
    private readonly kept: (id: string) => unknown,
    private readonly pads: () => readonly (Gamepad | null)[] = () => navigator.getGamepads?.() ?? [],
  ) {}

  arm(armed: boolean): void {
    this.state.value = { ...this.state.value, armed };
    // Height hold waits at the middle; without it a start is at the lowest throttle.
    this.keys.setThrottle(this.state.value.heightHold ? 0.5 : 0);
    this.touchThrottle = this.keys.throttle;
  }

  setAssists(change: { levelling?: boolean; heightHold?: boolean }, hoverThrottle: number): void {
    const before = this.state.value;
    this.state.value = { ...before, ...change };
    // Letting go of height hold leaves the craft where it was: near the throttle that hovers.
    if (before.heightHold && change.heightHold === false) {
      this.keys.setThrottle(hoverThrottle);
      this.touchThrottle = hoverThrottle;
    } else if (!before.heightHold && change.heightHold === true) {
      this.keys.setThrottle(0.5);
      this.touchThrottle = 0.5;
    }
  }

  /** Forgets a device's settings so that they are read anew. */
  forgetDevice(): void {
    this.padKept = undefined;
  }

  /** The gamepad that is plugged in, or null. */
  device(): Gamepad | null {
    return this.pads().find((pad) => pad !== null && pad.connected && pad.axes.length >= 2) ?? null;
  }

  /** Moves all inputs on by `dt_s`; the result is in `sticks`. */
  advance(dt_s: number): void {
    this.keys.advance(dt_s, this.state.value.heightHold);
    this.readPad();
    this.chooseSource();
    this.fill(dt_s);
  }

  private readPad(): void {
    const pad = this.device();
    const kept = pad === null ? null : this.kept(pad.id);
    if (pad !== null && (pad.id !== this.padId || kept !== this.padKept)) {
      const { settings, known } = settingsFor(kept, pad.mapping === 'standard');
      this.padSettings = settings;
      this.padKept = kept;
      this.padId = pad.id;
      this.state.value = { ...this.state.value, device: pad.id, uncalibrated: !known };
    }
    if (this.padSettings === null) return;
    this.pad.read(pad, this.padSettings);
    if (this.pad.lost) {
      this.pad.lost = false;
      const id = this.padId ?? '';
      this.padId = null;
      // Sticks neutral, throttle held; keys take over from that throttle, with their assists.
      this.keys.setThrottle(this.state.value.heightHold ? 0.5 : this.pad.throttle);
      this.state.value = { ...this.state.value, device: null, uncalibrated: false };
      this.onLost(id);
    }
  }

  private chooseSource(): void {
    const { source, device } = this.state.value;
    const { pad } = this;
    const padMoves =
      device !== null && Math.max(Math.abs(pad.roll), Math.abs(pad.pitch), Math.abs(pad.yaw)) > WAKE;
    let next: Source = source;
    if (this.left.active || this.right.active) next = 'touch';
    else if (this.keys.busy) next = 'keys';
    else if (padMoves) next = 'gamepad';
    if (next === source) return;
    // Assists are on for keys and touch, off for sticks, until the person says otherwise.
    const assisted = next !== 'gamepad';
    const change = (source === 'gamepad') !== (next === 'gamepad');
    this.state.value = {
      ...this.state.value,
      source: next,
      ...(change ? { levelling: assisted, heightHold: assisted } : {}),
    };
  }

  private fill(dt_s: number): void {
    const { sticks, keys, pad, left, right } = this;
    const { source, armed, levelling, heightHold } = this.state.value;
    sticks.armed = armed;
    sticks.levelling = levelling;
    sticks.heightHold = heightHold;
    if (source === 'gamepad') {
      sticks.roll = pad.roll;
      sticks.pitch = pad.pitch;
      sticks.yaw = pad.yaw;
      sticks.throttle = pad.throttle;
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
}
