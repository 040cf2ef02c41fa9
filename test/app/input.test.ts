import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  CalibrationWalk,
  GamepadSticks,
  settingsFor,
  STANDARD_DEVICE,
} from '../../src/app/input/gamepadSticks.ts';
import {
  actionOn,
  FIRST_KEYS,
  FLY_KEYS,
  keyMapFrom,
  keyName,
  rebound,
  type KeyMap,
} from '../../src/app/input/keyMap.ts';
import { KeyboardSticks } from '../../src/app/input/keyboardSticks.ts';
import { PadChoice } from '../../src/app/input/padChoice.ts';
import { Seat } from '../../src/app/input/seat.ts';

const pad = (axes: number[], connected = true) => ({ id: 'pad', index: 0, connected, axes });

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
    sticks.read(pad([0, -1, 1, -1]), STANDARD_DEVICE, 0.02);
    expect(sticks.throttle).toBeCloseTo(1, 6);
    expect(sticks.roll).toBeCloseTo(1, 6);
    expect(sticks.pitch).toBeCloseTo(-1, 6);
  });

  it('unplugged in flight: sticks neutral, throttle held, told once', () => {
    const sticks = new GamepadSticks();
    sticks.read(pad([0.5, -0.4, 0.9, 0.2]), STANDARD_DEVICE, 0.02);
    const held = sticks.throttle;
    expect(sticks.read(null, STANDARD_DEVICE, 0.02)).toBe(false);
    expect([sticks.roll, sticks.pitch, sticks.yaw]).toEqual([0, 0, 0]);
    expect(sticks.throttle).toBe(held);
    expect(sticks.lost).toBe(true);
  });

  it('a slew keeps roll, pitch and yaw from jumping, and leaves the throttle to the hand', () => {
    const sticks = new GamepadSticks();
    sticks.read(pad([0, -1, 1, 0]), { ...STANDARD_DEVICE, slew_per_s: 4 }, 0.05);
    expect(sticks.roll).toBeCloseTo(0.2, 9);
    expect(sticks.throttle).toBeCloseTo(1, 6);
  });

  it('settings that were kept before slew was there are still read', () => {
    const { slew_per_s: _later, ...earlier } = STANDARD_DEVICE;
    expect(settingsFor(earlier, false)).toMatchObject({ known: true, settings: { slew_per_s: 0 } });
  });

  it('a reading that is not a number leaves the stick in its middle', () => {
    const sticks = new GamepadSticks();
    sticks.read(pad([NaN, Infinity]), STANDARD_DEVICE, 0.02);
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

describe('several devices', () => {
  const two = (first: number[], second: number[], connected = true) => [
    { index: 0, connected: true, axes: first },
    null,
    { index: 2, connected, axes: second },
  ];

  it('the one that was moved last flies; drift and unplugging do not confuse it', () => {
    const choice = new PadChoice();
    expect(choice.of(two([0, 0], [0, 0]))?.index).toBe(0);
    expect(choice.of(two([0.02, 0], [0, 0.9]))?.index).toBe(2);
    expect(choice.of(two([0.04, 0.05], [0, 0.9]))?.index).toBe(2);
    expect(choice.of(two([NaN, 0.05], [0, 0.9]))?.index).toBe(2);
    expect(choice.of(two([0, 0.7], [0, 0.9]))?.index).toBe(0);
    expect(choice.of(two([0, 0.7], [0, 0], false))?.index).toBe(0);
    expect(choice.of([null])).toBeNull();
    expect(choice.of([{ index: 0, connected: true, axes: [0] }])).toBeNull();
  });
});

describe('keys on other keys', () => {
  it('an action goes on a free key; on a taken one the two change places', () => {
    const free = rebound(FIRST_KEYS, 'arm', 'KeyQ');
    expect(free?.arm).toBe('KeyQ');
    const swapped = rebound(FIRST_KEYS, 'up', 'KeyS');
    expect([swapped?.up, swapped?.down]).toEqual(['KeyS', 'KeyW']);
  });

  it('keys of the page and the browser are refused', () => {
    for (const code of ['Escape', 'Tab', 'F5', 'ShiftLeft', 'ControlRight', 'AltLeft', 'MetaLeft']) {
      expect(rebound(FIRST_KEYS, 'arm', code), code).toBeNull();
    }
  });

  it('what was kept comes back, whatever it was; each key has one action', () => {
    fc.assert(
      fc.property(
        fc.array(
          fc.tuple(fc.constantFrom(...FLY_KEYS), fc.constantFrom('KeyQ', 'KeyW', 'F5', 'Space', 'Digit1')),
          {
            maxLength: 12,
          },
        ),
        (changes) => {
          let map: KeyMap = FIRST_KEYS;
          for (const [action, code] of changes) map = rebound(map, action, code) ?? map;
          expect(new Set(Object.values(map)).size).toBe(FLY_KEYS.length);
          expect(keyMapFrom(JSON.parse(JSON.stringify(map)))).toEqual(map);
          for (const action of FLY_KEYS) expect(actionOn(map, map[action])).toBe(action);
        },
      ),
    );
    expect(keyMapFrom('junk')).toEqual(FIRST_KEYS);
    expect(keyMapFrom({ arm: 7 })).toEqual(FIRST_KEYS);
    expect(keyMapFrom({ nothing: 'KeyQ', arm: 'KeyQ' }).arm).toBe('KeyQ');
  });

  it('names what stands on the key, by the layout where it is known', () => {
    expect(['KeyW', 'ArrowUp', 'Space', 'Minus'].map((code) => keyName(code, null))).toEqual([
      'W',
      '↑',
      'Space',
      '−',
    ]);
    expect(keyName('KeyW', new Map([['KeyW', 'z']]))).toBe('Z');
  });

  it('bound keys move the sticks, the old ones no longer', () => {
    const keys = new KeyboardSticks();
    const map = rebound(FIRST_KEYS, 'rollRight', 'KeyO');
    if (map === null) throw new Error('KeyO is free');
    keys.bind(map);
    expect(keys.press('ArrowRight', false)).toBe(false);
    expect(keys.press('KeyO', false)).toBe(true);
    keys.advance(0.1, true);
    expect(keys.roll).toBeGreaterThan(0);
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

  /** A seat with one device, whose axes and mapping a test moves. */
  function withDevice(device: { axes: number[]; mapping: string }, kept: unknown = undefined) {
    return new Seat(
      () => kept,
      () => [{ ...pad(device.axes), mapping: device.mapping } as unknown as Gamepad],
    );
  }

  it('a device of unknown axes does not fly until it was calibrated', () => {
    const device = { axes: [0, 0, 0, -1], mapping: '' };
    const seat = withDevice(device);
    seat.advance(0.02);
    device.axes = [0, 0, 0.9, -1];
    seat.advance(0.02);
    expect(seat.state.value).toMatchObject({ source: 'keys', uncalibrated: true, levelling: true });
    const known = withDevice(device, STANDARD_DEVICE);
    known.advance(0.02);
    known.advance(0.02);
    expect(known.state.value).toMatchObject({ source: 'gamepad', uncalibrated: false });
  });

  it('throttle alone takes over, and arming waits until it is down', () => {
    const device = { axes: [0, 0, 0, 0], mapping: 'standard' };
    const seat = withDevice(device);
    seat.advance(0.02);
    expect(seat.state.value.source).toBe('keys');
    device.axes = [0, -0.9, 0, 0];
    seat.advance(0.02);
    expect(seat.state.value.source).toBe('gamepad');
    expect(seat.arm(true)).toBe(false);
    expect(seat.state.value.armed).toBe(false);
    device.axes = [0, 1, 0, 0];
    seat.advance(0.02);
    expect(seat.arm(true)).toBe(true);
    expect(seat.state.value.armed).toBe(true);
  });

  it('while it is being calibrated a device moves nothing', () => {
    const device = { axes: [0, 0, 0.9, 0], mapping: 'standard' };
    const seat = withDevice(device);
    seat.advance(0.02);
    seat.advance(0.02);
    expect(seat.sticks.roll).toBeGreaterThan(0.5);
    const throttle = seat.sticks.throttle;
    seat.calibrating = true;
    device.axes = [0, -1, -0.9, 1];
    seat.advance(0.02);
    expect(seat.sticks).toMatchObject({ roll: 0, pitch: 0, yaw: 0, throttle });
  });

  it('with height hold the motors idle on the ground until the person asks to climb', () => {
    const seat = new Seat(
      () => undefined,
      () => [],
    );
    seat.arm(true);
    seat.advance(0.02, true);
    expect(seat.sticks).toMatchObject({ armed: true, heightHold: false, throttle: 0 });
    seat.keys.press('KeyW', false);
    seat.advance(0.05, true);
    seat.advance(0.05, true);
    expect(seat.sticks.heightHold).toBe(true);
    expect(seat.sticks.throttle).toBeGreaterThan(0.5);
    seat.keys.release('KeyW', false);
    for (let k = 0; k < 50; k++) seat.advance(0.02, false);
    expect(seat.sticks).toMatchObject({ heightHold: true, throttle: 0.5 });
    for (let k = 0; k < 50; k++) seat.advance(0.02, true);
    expect(seat.sticks).toMatchObject({ heightHold: false, throttle: 0 });
  });

  it('after a rewind arming, assists and throttle are as they were then', () => {
    const seat = new Seat(
      () => undefined,
      () => [],
    );
    seat.restore({ ...seat.sticks, armed: true, levelling: false, heightHold: false, throttle: 0.43 });
    seat.advance(0.02, false);
    expect(seat.sticks).toMatchObject({ armed: true, levelling: false, heightHold: false, throttle: 0.43 });
  });
});
