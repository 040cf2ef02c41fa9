import { describe, expect, it } from 'vitest';
import { CALM } from '../../src/craft/wind.ts';
import { OPEN_FIELD, parseScene } from '../../src/craft/scene.ts';
import { Flight } from '../../src/flight/flight.ts';
import { NEUTRAL_STICKS } from '../../src/flight/pilot.ts';
import { quaternionFromEuler } from '../../src/math/quaternion.ts';
import { demoBuild, demoGains } from './builds.ts';

const WALLED = parseScene({
  ...OPEN_FIELD,
  solids: [{ name: 'wall', centre_m: [3, 0, -5], size_m: [0.4, 20, 10], look: 'wall' }],
});

function flightAt(change: { scene?: typeof OPEN_FIELD; height_m?: number } = {}) {
  return new Flight({
    build: demoBuild('sandpiper'),
    gains: demoGains('sandpiper'),
    wind: CALM,
    scene: change.scene ?? OPEN_FIELD,
    seed: 3,
    start:
      change.height_m === undefined ? { kind: 'ground' } : { kind: 'free-air', height_m: change.height_m },
  });
}

describe('contact in flight', () => {
  it('rests on its legs without jitter or creep: below 0.1 mm in 10 s', () => {
    const flight = flightAt();
    for (let k = 0; k < 800; k++) flight.tick(NEUTRAL_STICKS);
    const before = Array.from(flight.state.subarray(0, 3));
    for (let k = 0; k < 4000; k++) flight.tick(NEUTRAL_STICKS);
    const moved = Math.hypot(...before.map((value, i) => flight.state[i] - value));
    expect(moved).toBeLessThan(1e-4);
    const tilt = 2 * Math.asin(Math.hypot(flight.state[7], flight.state[8]));
    expect(tilt).toBeLessThan(0.01);
    expect(Math.abs(flight.state[2] + (0.14 - 0.012)), 'stands on its feet').toBeLessThan(0.01);
  });

  it('hitting a wall stops the rotors that struck it and not the ground’s side of it', () => {
    const flight = flightAt({ scene: WALLED, height_m: 6 });
    flight.state[0] = 2;
    flight.state[3] = 4;
    for (let k = 0; k < 200; k++) flight.tick({ ...NEUTRAL_STICKS, armed: true, throttle: 0.4 });
    const struck = [0, 1, 2, 3].map((i) => flight.signals[flight.signals.length - 10 + i]);
    expect(flight.state[0], 'in front of the wall').toBeLessThan(2.85);
    expect(struck.some((one) => one === 1)).toBe(true);
    expect(flight.stopped).toBeNull();
  });

  it('takes off from its legs and lands again', () => {
    const flight = flightAt();
    const sticks = { ...NEUTRAL_STICKS, armed: true, levelling: true, heightHold: true, throttle: 1 };
    for (let k = 0; k < 800; k++) flight.tick(sticks);
    expect(flight.state[2]).toBeLessThan(-1);
    for (let k = 0; k < 2400; k++) flight.tick({ ...sticks, throttle: 0.25 });
    for (let k = 0; k < 400; k++) flight.tick(NEUTRAL_STICKS);
    expect(flight.state[2]).toBeGreaterThan(-0.2);
    expect(Math.hypot(flight.state[3], flight.state[4], flight.state[5])).toBeLessThan(0.05);
    expect(2 * Math.asin(Math.hypot(flight.state[7], flight.state[8]))).toBeLessThan(0.05);
  });

  it('lying on its back it can be set upright and started again', () => {
    const flight = flightAt({ height_m: 1 });
    flight.state.set(quaternionFromEuler(Math.PI, 0, 0), 6);
    flight.state.fill(0, 13, 21);
    for (let k = 0; k < 1200; k++) flight.tick(NEUTRAL_STICKS);
    flight.setUpright();
    for (let k = 0; k < 1200; k++) flight.tick(NEUTRAL_STICKS);
    expect(2 * Math.asin(Math.hypot(flight.state[7], flight.state[8]))).toBeLessThan(0.1);
    for (let k = 0; k < 800; k++)
      flight.tick({ ...NEUTRAL_STICKS, armed: true, levelling: true, heightHold: true, throttle: 1 });
    expect(flight.state[2]).toBeLessThan(-1);
  });
});
