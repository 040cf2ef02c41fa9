import { describe, expect, it } from 'vitest';
import {
  CalibrationWalk,
  GamepadSticks,
  settingsFor,
  STANDARD_DEVICE,
} from '../../src/app/input/gamepadSticks.ts';
import { KeyboardSticks } from '../../src/app/input/keyboardSticks.ts';
import { Seat } from '../../src/app/input/seat.ts';

const pad = (axes: number[], connected = true) => ({ id: 'pad', connected, axes });

describe('keys as sticks', () => {
  it('move with a finite speed, spring back, and full travel needs Shift', () => {
    const keys = new KeyboardSticks();
    expect(keys.press('ArrowRight', false)).toBe(true);
    keys.advance(0.05, true);
    expect(keys.roll).toBeGreaterThan(0);
    expect(keys.roll).toBeLessThan(0.3);
    for (let k = 0; k < 40; k++) keys.advance(0.05, true);
    expect(keys.roll).toBeCloseTo(0.6, 6);
    keys.press('ArrowRight', true);
    for (let k = 0; k < 40; k++) keys.advance(0.05, true);
    expect(keys.roll).toBeCloseTo(1, 6);
    keys.release('ArrowRight', false);
    for (let k = 0; k < 10; k++) keys.advance(0.05, true);
    expect(keys.roll).toBe(0);
    expect(keys.press('KeyQ', false)).toBe(false);
  });

  it('throttle springs to the middle with height hold and stays put without', () => {
    const keys = new KeyboardSticks();
    keys.setThrottle(0.5);
    keys.press('KeyW', false);
    for (let k = 0; k < 20; k++) keys.advance(0.05, true);
    expect(keys.throttle).toBeCloseTo(1, 6);
    keys.release('KeyW', false);
    for (let k = 0; k < 20; k++) keys.advance(0.05, true);
    expect(keys.throttle).toBeCloseTo(0.5, 6);
    keys.press('KeyW', false);
    for (let k = 0; k < 5; k++) keys.advance(0.05, false);
    keys.release('KeyW', false);
    const left = keys.throttle;
    for (let k = 0; k < 20; k++) keys.advance(0.05, false);
    expect(keys.throttle).toBe(left);
  });
});

describe('gamepad', () => {
  it('flies Mode 2 from the standard mapping: stick away from the pilot lowers the nose', () => {
    const sticks = new GamepadSticks();
    sticks.read(pad([0, -1, 1, -1]), STANDARD_DEVICE);
    expect(sticks.throttle).toBeCloseTo(1, 6);
    expect(sticks.roll).toBeCloseTo(1, 6);
    expect(sticks.pitch).toBeCloseTo(-1, 6);
  });

  it('unplugged in flight: sticks neutral, throttle held, told once', () => {
    const sticks = new GamepadSticks();
    sticks.read(pad([0.5, -0.4, 0.9, 0.2]), STANDARD_DEVICE);
    const held = sticks.throttle;
    expect(sticks.read(null, STANDARD_DEVICE)).toBe(false);
    expect([sticks.roll, sticks.pitch, sticks.yaw]).toEqual([0, 0, 0]);
    expect(sticks.throttle).toBe(held);
    expect(sticks.lost).toBe(true);
  });

  it('a reading that is not a number leaves the stick in its middle', () => {
    const sticks = new GamepadSticks();
    sticks.read(pad([NaN, Infinity]), STANDARD_DEVICE);
    expect([sticks.roll, sticks.pitch, sticks.yaw]).toEqual([0, 0, 0]);
    expect(sticks.throttle).toBeCloseTo(0.5, 6);
  });

  it('the walk-through finds odd axes, ends, reversal and a throttle that rests low', () => {
    const walk = new CalibrationWalk(STANDARD_DEVICE);
    // A transmitter with eight axes: throttle on 5 resting at −0.8, the others on 2, 0, 7 with odd ends.
    const rest = [0.02, 0, -0.03, 0, 0, -0.8, 0, 0.01];
    const push = (axis: number, ...values: number[]) => {
      for (const value of values) {
        const axes = [...rest];
        axes[axis] = value;
        walk.feed(axes);
      }
    };
    walk.feed(rest);
    walk.next();
    push(2, -0.9, 0.85);
    walk.next();
    push(5, 0.82, -0.8);
    walk.next();
    push(0, 0.7, -0.75);
    walk.next();
    push(7, -1, 1);
    walk.next();
    expect(walk.step.kind).toBe('done');
    if (walk.step.kind !== 'done') return;
    const { ways, throttleStays } = walk.step.settings;
    expect(ways.leftX).toMatchObject({ axis: 2, low: -0.9, high: 0.85, reverse: true });
    expect(ways.leftY).toMatchObject({ axis: 5, reverse: false });
    expect(ways.leftY.centre).toBeCloseTo(0.01, 6);
    expect(ways.rightX).toMatchObject({ axis: 0, reverse: false });
    expect(ways.rightY).toMatchObject({ axis: 7, reverse: true });
    expect(throttleStays).toBe(true);
    expect(settingsFor(walk.step.settings, false).known).toBe(true);
    expect(settingsFor({ junk: 1 }, false).known).toBe(false);
  });

  it('a device with too few axes is told so', () => {
    const walk = new CalibrationWalk(STANDARD_DEVICE);
    walk.feed([0, 0]);
    walk.next();
    expect(walk.step).toMatchObject({ kind: 'failed' });
  });
});

describe('seat', () => {
  it('assists are on for keys, go off when sticks take over and come back with keys', () => {
    let axes = [0, 0, 0, 0];
    let connected = true;
    const gamepad = () => [{ ...pad(axes, connected), mapping: 'standard' } as unknown as Gamepad];
    const seat = new Seat(() => undefined, gamepad);
    const lost: string[] = [];
    seat.onLost = (id) => lost.push(id);
    seat.advance(0.02);
    expect(seat.state.value).toMatchObject({
      source: 'keys',
      levelling: true,
      heightHold: true,
      device: 'pad',
    });
    axes = [0, 0, 0.8, 0];
    seat.advance(0.02);
    expect(seat.state.value).toMatchObject({ source: 'gamepad', levelling: false, heightHold: false });
    expect(seat.sticks.roll).toBeGreaterThan(0.5);
    connected = false;
    seat.advance(0.02);
    expect(lost).toEqual(['pad']);
    expect(seat.sticks.roll).toBe(0);
    seat.keys.press('ArrowLeft', false);
    seat.advance(0.1);
    expect(seat.state.value).toMatchObject({ source: 'keys', levelling: true, heightHold: true });
    expect(seat.sticks.roll).toBeLessThan(0);
  });
});
