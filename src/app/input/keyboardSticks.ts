/**
 * Keys as sticks: a held key moves a virtual stick at a finite rate, a released one springs back, so that
 * flying by keys is smooth. Throttle springs to the middle while height hold is on and stays put while not.
 */
import { FIRST_KEYS, type KeyMap } from './keyMap.ts';

const STICK_KEYS = [
  'rollLeft',
  'rollRight',
  'noseDown',
  'noseUp',
  'yawLeft',
  'yawRight',
  'up',
  'down',
] as const;
type StickKey = (typeof STICK_KEYS)[number];

/** Full travel in this time, back in that, s. */
const OUT_S = 0.35;
const BACK_S = 0.18;
const THROTTLE_S = 1.6;
/** Travel that a key asks for: gentle unless Shift is held. */
const GENTLE = 0.6;

export class KeyboardSticks {
  roll = 0;
  pitch = 0;
  yaw = 0;
  throttle = 0;
  private readonly held = new Set<string>();
  private strong = false;

  constructor(private keys: KeyMap = FIRST_KEYS) {}

  bind(keys: KeyMap): void {
    this.keys = keys;
    this.held.clear();
  }

  /** Whether the key flies; a page must then keep it from scrolling. */
  press(code: string, shift: boolean): boolean {
    this.strong = shift;
    if (!STICK_KEYS.some((one) => this.keys[one] === code)) return false;
    this.held.add(code);
    return true;
  }

  release(code: string, shift: boolean): void {
    this.strong = shift;
    this.held.delete(code);
  }

  /** All keys up: focus was lost. */
  releaseAll(): void {
    this.held.clear();
  }

  get busy(): boolean {
    return this.held.size > 0 || this.roll !== 0 || this.pitch !== 0 || this.yaw !== 0;
  }

  /** Moves the virtual sticks on by `dt_s`. */
  advance(dt_s: number, heightHold: boolean): void {
    const travel = this.strong ? 1 : GENTLE;
    this.roll = moved(this.roll, travel * this.pair('rollLeft', 'rollRight'), dt_s);
    this.pitch = moved(this.pitch, travel * this.pair('noseDown', 'noseUp'), dt_s);
    this.yaw = moved(this.yaw, travel * this.pair('yawLeft', 'yawRight'), dt_s);
    const lift = this.pair('down', 'up');
    if (heightHold) {
      this.throttle = 0.5 + 0.5 * moved(2 * this.throttle - 1, lift, dt_s);
    } else {
      this.throttle = Math.max(0, Math.min(1, this.throttle + (lift * dt_s) / THROTTLE_S));
    }
  }

  /** Throttle to a known place: idle when armed, hover when height hold is let go. */
  setThrottle(share: number): void {
    this.throttle = share;
  }

  private pair(minus: StickKey, plus: StickKey): number {
    return (this.held.has(this.keys[plus]) ? 1 : 0) - (this.held.has(this.keys[minus]) ? 1 : 0);
  }
}

function moved(now: number, wanted: number, dt_s: number): number {
  const away = Math.abs(wanted) > Math.abs(now) && wanted * now >= 0;
  const most = dt_s / (away ? OUT_S : BACK_S);
  const step = Math.max(-most, Math.min(most, wanted - now));
  const next = now + step;
  return Math.abs(next) < 1e-6 ? 0 : next;
}
