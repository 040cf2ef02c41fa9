import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { CALM } from '../../src/craft/wind.ts';
import { OPEN_FIELD, parseScene } from '../../src/craft/scene.ts';
import { Flight } from '../../src/flight/flight.ts';
import { NEUTRAL_STICKS } from '../../src/flight/pilot.ts';
import { GRAVITY_MPS2 } from '../../src/math/angles.ts';
import { quaternionFromEuler } from '../../src/math/quaternion.ts';
import { ContactWorld } from '../../src/physics/contact.ts';
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

/** Kinetic and potential energy of the body alone, J. */
function energy(flight: Flight): number {
  const s = flight.state;
  const I = flight.craft.inertia;
  const kinetic =
    0.5 * flight.craft.mass_kg * (s[3] ** 2 + s[4] ** 2 + s[5] ** 2) +
    0.5 * (I[0] * s[10] ** 2 + I[4] * s[11] ** 2 + I[8] * s[12] ** 2);
  return kinetic - flight.craft.mass_kg * GRAVITY_MPS2 * s[2];
}

describe('contact', () => {
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

  it('never gains energy through a contact, dropped at any attitude, speed and spin (fast-check)', () => {
    const angle = fc.double({ min: -Math.PI, max: Math.PI, noNaN: true });
    const speed = fc.double({ min: -4, max: 4, noNaN: true });
    fc.assert(
      fc.property(
        angle,
        angle,
        speed,
        speed,
        fc.double({ min: 0, max: 6, noNaN: true }),
        speed,
        (roll, pitch, vn, ve, vd, spin) => {
          const flight = flightAt({ height_m: 0.6 });
          const s = flight.state;
          s.set(quaternionFromEuler(roll, pitch / 2, 0), 6);
          s.set([vn, ve, vd], 3);
          s.set([spin, 2 * spin, -spin], 10);
          s.fill(0, 13, 21);
          let last = energy(flight);
          const start = last;
          for (let k = 0; k < 500; k++) {
            flight.tick(NEUTRAL_STICKS);
            const now = energy(flight);
            // Windmilling propellers may give or take a little by the air; a contact must not.
            expect(now - last, `gain in tick ${k}`).toBeLessThan(0.002 * start + 1e-3);
            last = now;
          }
          expect(last).toBeLessThan(start);
          expect(s[2], 'not through the ground').toBeLessThan(0.02);
          expect(flight.stopped).toBeNull();
        },
      ),
      { numRuns: 25 },
    );
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

  it('is near only where something can be touched', () => {
    const world = new ContactWorld({
      scene: WALLED,
      mass_kg: 1,
      inertiaDiagonal_kgm2: [0.01, 0.01, 0.02],
      rotorPositions_m: [
        [0.16, -0.16, 0],
        [0.16, 0.16, 0],
        [-0.16, -0.16, 0],
        [-0.16, 0.16, 0],
      ],
      propellerRadius_m: 0.127,
      legHeight_m: 0.14,
      legHalfTrack_m: 0.12,
    });
    const at = (...position: number[]) => {
      const state = new Float64Array(22);
      state.set(position);
      return world.near(state);
    };
    expect(at(0, 0, -5)).toBe(false);
    expect(at(0, 0, -0.2)).toBe(true);
    expect(at(2.6, 0, -5)).toBe(true);
    expect(at(-4, 0, -5)).toBe(false);
    expect(at(2.6, 0, -20)).toBe(false);
  });
});
