import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { GRAVITY_MPS2 } from '../../src/math/angles.ts';
import { quaternionFromEuler } from '../../src/math/quaternion.ts';
import { ContactWorld } from '../../src/physics/contact.ts';
import { ATTITUDE, RATES } from '../../src/physics/state.ts';
import {
  ContactBench,
  LEG_M,
  MASS_KG,
  optionsAt,
  RADIUS_M,
  siteWith,
  STEP_S,
  TRACK_M,
} from './contactBench.ts';

const WALL = { name: 'wall', centre_m: [3, 0, -5], size_m: [0.4, 20, 10], look: 'wall' };
const KERB = {
  name: 'kerb',
  centre_m: [0.6, 0.1, -0.15],
  size_m: [0.5, 0.7, 0.3],
  heading_deg: 25,
  look: 'rock',
};
const CHANNEL = {
  name: 'channel',
  centre_m: [0, 0, 0.2],
  size_m: [9, 9, 0.4],
  look: 'water',
  collides: false,
};

describe('contact: closed forms of elementary mechanics', () => {
  it.each([0, 0.3, 0.6])(
    'falls flat on its feet and leaves with e times the speed of impact (Newton), e = %d',
    (e) => {
      const bench = new ContactBench(siteWith([], { restitution: e })).at(-LEG_M - 0.46);
      let impact = 0;
      let leaves = 0;
      bench.run(0.4, (s) => {
        impact = Math.max(impact, s[5]);
        leaves = Math.max(leaves, -s[5]);
      });
      expect(impact).toBeCloseTo(Math.sqrt(2 * GRAVITY_MPS2 * 0.46), 1);
      expect(leaves / impact, 'rebound ratio').toBeCloseTo(e, 3);
    },
  );

  it.each([0.2, 0.5, 0.7])('slides to rest in v²/2μg (Coulomb), μ = %d', (friction) => {
    // Below μ = track over leg height a sliding craft does not tip.
    expect(friction).toBeLessThan(TRACK_M / LEG_M);
    const bench = new ContactBench(siteWith([], { friction, restitution: 0 })).at(-LEG_M, [2, 1, 0]).run(2);
    const way = Math.hypot(bench.state[0], bench.state[1]);
    expect(Math.hypot(bench.state[3], bench.state[4]), 'stands').toBe(0);
    expect(way / (5 / (2 * friction * GRAVITY_MPS2)), 'way over closed form').toBeCloseTo(1, 2);
    expect(bench.tilt_rad()).toBeLessThan(1e-3);
  });

  it('with more friction than track over leg height, sliding sideways trips it', () => {
    const bench = new ContactBench(siteWith([], { friction: 1.4, restitution: 0 })).at(-LEG_M, [0, 4, 0]);
    bench.run(1.5);
    expect(bench.tilt_rad()).toBeGreaterThan(1);
  });

  it('tips over its feet when the torque exceeds weight times half track, and not before', () => {
    const tilt = (share: number) => {
      const bench = new ContactBench(siteWith([])).at(-LEG_M).run(0.3);
      bench.torque_Nm[0] = share * MASS_KG * GRAVITY_MPS2 * TRACK_M;
      return bench.run(1).tilt_rad();
    };
    expect(tilt(0.97), 'stays down').toBeLessThan(1e-6);
    expect(tilt(1.03), 'tips').toBeGreaterThan(0.3);
  });

  it('stays where it stands while pushed by less than μ times its weight, slides when pushed by more', () => {
    const way = (share: number) => {
      const bench = new ContactBench(siteWith([], { friction: 0.5 })).at(-LEG_M).run(0.3);
      bench.push_mps2[0] = share * 0.5 * GRAVITY_MPS2;
      const from = bench.state[0];
      return bench.run(1).state[0] - from;
    };
    expect(way(0.97)).toBeLessThan(1e-6);
    // x = (a − μ g) t²/2
    expect(way(1.2) / (0.5 * 0.2 * 0.5 * GRAVITY_MPS2)).toBeCloseTo(1, 1);
  });

  it('a wall that it does not press takes nothing from a craft that slides along it', () => {
    const bench = new ContactBench(siteWith([WALL]));
    bench.gravity_mps2 = 0;
    bench.at(-5, [0, 2, 0]);
    // Rim of the front discs at the wall's face, 2.8 m north.
    bench.state[0] = 2.8 - 0.16 - RADIUS_M - 0.0005;
    bench.run(1);
    expect(bench.state[4]).toBe(2);
  });

  it('a light lift-off is not held back: thrust of weight plus 1 % leaves the ground', () => {
    const bench = new ContactBench(siteWith([])).at(-LEG_M).run(0.3);
    bench.push_mps2[2] = -1.01 * GRAVITY_MPS2;
    const from = bench.state[2];
    bench.run(1);
    expect((from - bench.state[2]) / (0.5 * 0.01 * GRAVITY_MPS2)).toBeCloseTo(1, 1);
  });
});

describe('contact: energy, rest, repeatability', () => {
  const angle = fc.double({ min: -Math.PI, max: Math.PI, noNaN: true });
  const speed = fc.double({ min: -6, max: 6, noNaN: true });
  const spin = fc.double({ min: -25, max: 25, noNaN: true });
  const thrown = fc.record({
    roll: angle,
    pitch: angle,
    velocity: fc.tuple(speed, speed, fc.double({ min: -2, max: 6, noNaN: true })),
    rates: fc.tuple(spin, spin, spin),
    friction: fc.double({ min: 0, max: 1.5, noNaN: true }),
    restitution: fc.double({ min: 0, max: 0.9, noNaN: true }),
  });

  interface Throw {
    readonly roll: number;
    readonly pitch: number;
    readonly velocity: readonly number[];
    readonly rates: readonly number[];
    readonly friction: number;
    readonly restitution: number;
  }

  function throwIt(how: Throw): ContactBench {
    const { friction, restitution } = how;
    const bench = new ContactBench(siteWith([WALL, KERB], { friction, restitution })).at(-0.9, how.velocity);
    bench.state.set(quaternionFromEuler(how.roll, how.pitch / 2, 0), ATTITUDE);
    bench.state.set(how.rates, RATES);
    return bench;
  }

  it('no step with contact adds energy: any attitude, speed, spin, friction and bounce (fast-check)', () => {
    fc.assert(
      fc.property(thrown, (how) => {
        const bench = throwIt(how).run(1.2);
        expect(bench.contactSteps).toBeGreaterThan(0);
        expect(bench.worstGain_J, 'J in one step').toBeLessThan(1e-9);
        expect(bench.state[2], 'not through the ground').toBeLessThan(0);
        expect(bench.state.every(Number.isFinite)).toBe(true);
      }),
      { numRuns: 60 },
    );
  });

  it('a thrown craft comes to rest and then does not move at all', () => {
    fc.assert(
      fc.property(thrown, (how) => {
        const bench = throwIt({ ...how, friction: 0.6, restitution: 0.3 }).run(8);
        const before = Array.from(bench.state);
        bench.run(0.5);
        expect(Array.from(bench.state)).toEqual(before);
      }),
      { numRuns: 12 },
    );
  });

  it('stands in gusts and shaking motors without creep: not a micrometre in 10 s', () => {
    const bench = new ContactBench(siteWith([])).at(-LEG_M - 0.002).run(0.3);
    const before = Array.from(bench.state.subarray(0, 3));
    let k = 0;
    bench.run(10, () => {
      k++;
      bench.push_mps2.set([
        1.4 * Math.sin(k * 0.0031),
        0.9 * Math.cos(k * 0.017),
        -2 - 2 * Math.sin(k * 0.41),
      ]);
      bench.torque_Nm.set([0.3 * Math.sin(k * 0.83), 0.3 * Math.cos(k * 1.3), 0.02]);
    });
    const moved = Math.hypot(...before.map((value, i) => bench.state[i] - value));
    expect(moved, 'm').toBeLessThan(1e-6);
    expect(bench.tilt_rad()).toBeLessThan(1e-5);
  });

  it('keeps nothing from step to step: a new world goes on bit for bit from any state (fast-check)', () => {
    fc.assert(
      fc.property(thrown, fc.integer({ min: 100, max: 1500 }), (how, steps) => {
        const bench = throwIt(how).run(steps * STEP_S);
        const other = throwIt(how);
        other.state.set(bench.state);
        bench.run(0.2);
        other.run(0.2);
        expect(Array.from(other.state)).toEqual(Array.from(bench.state));
      }),
      { numRuns: 15 },
    );
  });
});

describe('contact: what is touched', () => {
  it('does not pass through a wall at 40 m/s, at any attitude', () => {
    fc.assert(
      fc.property(
        fc.double({ min: -3, max: 3, noNaN: true }),
        fc.double({ min: -1.5, max: 1.5, noNaN: true }),
        (roll, pitch) => {
          const bench = new ContactBench(siteWith([WALL])).at(-5, [40, 0, 0]);
          bench.state.set(quaternionFromEuler(roll, pitch, 0), ATTITUDE);
          bench.run(0.2);
          expect(bench.state[0]).toBeLessThan(2.8);
        },
      ),
      { numRuns: 40 },
    );
  });

  it('names the ground, a solid and the water', () => {
    const names = (bench: ContactBench) => [...new Set(bench.world.touching)];
    expect(names(new ContactBench(siteWith([])).at(-LEG_M).run(0.1))).toEqual(['ground']);
    expect(names(new ContactBench(siteWith([CHANNEL])).at(-LEG_M).run(0.1))).toEqual(['channel']);
    const wall = new ContactBench(siteWith([WALL])).at(-5, [5, 0, 0]);
    const seen = new Set<string>();
    wall.run(0.6, () => wall.world.touching.forEach((name) => wall.touched && seen.add(name)));
    expect([...seen]).toEqual(['wall']);
  });

  it('a disc strikes the ground exactly when its lowest point gets there: hub height = R sin(tilt)', () => {
    const roll = 0.5;
    // Hub of the right rotors, from body to world: down = y sin(roll) + z cos(roll).
    const hubBelow = 0.16 * Math.sin(roll) - 0.03 * Math.cos(roll);
    const touches = -(hubBelow + RADIUS_M * Math.sin(roll));
    const struckAt = (clearance: number) => {
      const bench = new ContactBench(siteWith([]));
      bench.gravity_mps2 = 0;
      bench.at(touches - clearance);
      bench.state.set(quaternionFromEuler(roll, 0, 0), ATTITUDE);
      bench.step();
      return Array.from(bench.world.struck);
    };
    expect(struckAt(0.006)).toEqual([0, 0, 0, 0]);
    expect(struckAt(0.003), 'blade within 4 mm').toEqual([0, 1, 0, 1]);
  });

  it('flying into a wall nose first, both front discs strike and no other', () => {
    const bench = new ContactBench(siteWith([WALL])).at(-5, [3, 0, 0]);
    let first: number[] = [];
    bench.run(1.2, () => {
      if (first.length === 0 && bench.touched) first = Array.from(bench.world.struck);
    });
    expect(first).toEqual([1, 1, 0, 0]);
  });

  it('put inside a solid it is pushed out slowly, not shot out', () => {
    const bench = new ContactBench(siteWith([WALL])).at(-5);
    bench.gravity_mps2 = 0;
    bench.state[0] = 2.6;
    let fastest = 0;
    bench.run(1, (s) => (fastest = Math.max(fastest, Math.abs(s[3]))));
    expect(bench.state[0], 'rims out of the face').toBeLessThan(2.8 - 0.16 - RADIUS_M + 0.006);
    expect(fastest, 'm/s').toBeLessThan(0.01);
  });

  it('is near only where something can be touched', () => {
    const world = new ContactWorld(optionsAt(siteWith([WALL])));
    const near = (...position: number[]) => {
      const state = new Float64Array(22);
      state.set(position);
      return world.near(state);
    };
    expect(near(0, 0, -5)).toBe(false);
    expect(near(0, 0, -0.2)).toBe(true);
    expect(near(2.6, 0, -5)).toBe(true);
    expect(near(-4, 0, -5)).toBe(false);
    expect(near(2.6, 0, -20)).toBe(false);
  });
});
