import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { InputError } from '../../src/craft/problem.ts';
import { OPEN_FIELD, parseScene, type Scene } from '../../src/craft/scene.ts';
import { parseWind, type Wind } from '../../src/craft/wind.ts';
import { FirstOrderFilter } from '../../src/disturbance/formingFilters.ts';
import { WindField, type WindSample } from '../../src/disturbance/windField.ts';
import { quaternionFromEuler, rotateToBody } from '../../src/math/quaternion.ts';
import { RandomStream } from '../../src/math/random.ts';
import { SnapshotReader, SnapshotWriter } from '../../src/math/snapshot.ts';

const LEVEL = new Float64Array([1, 0, 0, 0]);
const STEP_S = 0.0005;

const wind = (fields: object): Wind => parseWind({ format: 'gustbench.wind/1', ...fields });
const rough = { model: 'MIL-F-8785C', windAt20ft_mps: 8 };

function fieldOf(fields: object, more: { scene?: Scene; seed?: number; step_s?: number } = {}): WindField {
  return new WindField({
    wind: wind(fields),
    scene: OPEN_FIELD,
    step_s: STEP_S,
    seed: 1,
    span_m: 0.7,
    ...more,
  });
}

interface Place {
  north?: number;
  east?: number;
  height?: number;
  velocity?: [number, number, number];
  q?: Float64Array;
}

/** Steps `field` from `from_s` for `steps` and returns copies of the samples. */
function run(field: WindField, steps: number, place: Place = {}, from_s = 0, step_s = STEP_S): WindSample[] {
  const { north = 0, east = 0, height = 10, velocity = [0, 0, 0], q = LEVEL } = place;
  const state = new Float64Array([north, east, -height, ...velocity, ...q]);
  return Array.from({ length: steps }, (_, i) => {
    field.advance(from_s + i * step_s, state);
    return { ...field.sample };
  });
}

const last = (samples: WindSample[]): WindSample => samples[samples.length - 1];
const meanAt = (fields: object, height: number): WindSample => last(run(fieldOf(fields), 1, { height }));

function snapshotOf(field: WindField): Float64Array {
  const out = new SnapshotWriter();
  field.save(out);
  return out.finish();
}

function restore(field: WindField, snapshot: Float64Array): void {
  const from = new SnapshotReader(snapshot);
  field.load(from);
  from.finish();
}

describe('mean wind', () => {
  test.each([
    [0, -5, 0],
    [90, 0, -5],
    [180, 5, 0],
    [225, 5 / Math.SQRT2, 5 / Math.SQRT2],
  ])('from %d° the air moves away from there', (from_deg, north, east) => {
    const air = meanAt({ mean_mps: 5, from_deg }, 10);
    expect(air.north_mps).toBeCloseTo(north, 12);
    expect(air.east_mps).toBeCloseTo(east, 12);
    expect(air.down_mps).toBe(0);
  });

  test('power law: (h/h_ref)^exponent, the speed of the file at the reference height', () => {
    const law = { mean_mps: 6, profile: { law: 'power', exponent: 1 / 7, reference_m: 10 } };
    expect(-meanAt(law, 10).north_mps).toBeCloseTo(6, 12);
    expect(-meanAt(law, 40).north_mps).toBeCloseTo(6 * 4 ** (1 / 7), 12);
    expect(-meanAt(law, 0.1).north_mps).toBeCloseTo(6 * 0.05 ** (1 / 7), 12);
    expect(meanAt(law, -3)).toEqual(meanAt(law, 0));
  });

  test('log law: the shear between two heights is u*/κ · ln of their ratio; still air at the roughness height', () => {
    const law = { mean_mps: 6, profile: { law: 'log', roughness_m: 0.8, reference_m: 10 } };
    const friction = 6 / Math.log(10 / 0.8);
    expect(-meanAt(law, 30).north_mps + meanAt(law, 15).north_mps).toBeCloseTo(friction * Math.LN2, 12);
    expect(meanAt(law, 0.6).north_mps).toBeCloseTo(0, 12);
    expect(() => wind({ profile: { law: 'log', roughness_m: 2, reference_m: 1 } })).toThrow(InputError);
  });
});

describe('gusts', () => {
  test('the air of a craft is the mean plus the gust; up is up; a gust from the south moves north', () => {
    const gusts = [{ start_s: 0.1, rise_s: 0.2, hold_s: 1, peak_mps: 4, from_deg: 180, up_mps: 3 }];
    const air = last(run(fieldOf({ mean_mps: 2, from_deg: 90, gusts }), 1000));
    expect(air.north_mps).toBeCloseTo(4, 12);
    expect(air.east_mps).toBeCloseTo(-2, 12);
    expect(air.down_mps).toBeCloseTo(-3, 12);
  });

  test('a gust of a length is met at the airspeed relative to the mean wind', () => {
    const gusts = [{ start_s: 0, length_m: 10, hold_s: 100, peak_mps: 6, from_deg: 0 }];
    // Hovering in 4 m/s and flying at 3 m/s across it: airspeed 5 m/s, so half of 10 m is met after 1 s.
    const samples = run(fieldOf({ mean_mps: 4, gusts }), 4001, { velocity: [0, 3, 0] });
    expect(-samples[2000].north_mps - 4).toBeCloseTo(3, 9);
    expect(-samples[4000].north_mps - 4).toBeCloseTo(6, 9);
  });

  test('a change of the list lets a running gust go on, and puts a new one where it would be', () => {
    const first = { start_s: 0, rise_s: 1, hold_s: 5, peak_mps: 4, from_deg: 0 };
    const field = fieldOf({ gusts: [first] });
    const before = last(run(field, 1001));
    field.setWind(wind({ gusts: [{ ...first, start_s: 0.25, peak_mps: 2, from_deg: 90 }, first] }));
    const after = last(run(field, 1, {}, 1001 * STEP_S));
    expect(after.north_mps).toBeCloseTo(before.north_mps, 2);
    expect(after.east_mps).toBeCloseTo(-1 + Math.cos(Math.PI / 4), 2);
  });
});

describe('turbulence in the field', () => {
  test('rotation comes in body axes: turning the craft turns it', () => {
    const q = Float64Array.from(quaternionFromEuler(0.4, -0.7, 2));
    const fields = { mean_mps: 5, from_deg: 130, turbulence: rough };
    const level = run(fieldOf(fields), 50);
    const turned = run(fieldOf(fields), 50, { q });
    turned.forEach((air, i) => {
      const world = [level[i].p_radps, level[i].q_radps, level[i].r_radps];
      const body = rotateToBody(q, world);
      expect(air.p_radps).toBeCloseTo(body[0], 12);
      expect(air.q_radps).toBeCloseTo(body[1], 12);
      expect(air.r_radps).toBeCloseTo(body[2], 12);
      expect(air.north_mps).toBe(level[i].north_mps);
    });
  });

  test('turbulence axes lie along the mean wind', () => {
    // The same draws in wind from the north and from the east: components change places.
    const north = run(fieldOf({ mean_mps: 5, from_deg: 0, turbulence: rough }), 40);
    const east = run(fieldOf({ mean_mps: 5, from_deg: 90, turbulence: rough }), 40);
    east.forEach((air, i) => {
      expect(air.east_mps + 5).toBeCloseTo(north[i].north_mps + 5, 9);
      expect(air.north_mps).toBeCloseTo(-north[i].east_mps, 9);
      expect(air.down_mps).toBeCloseTo(north[i].down_mps, 12);
    });
  });

  test('scale multiplies it; twice the scale is twice the air', () => {
    const one = run(fieldOf({ turbulence: rough }), 30);
    const two = run(fieldOf({ turbulence: { ...rough, scale: 2 } }), 30);
    two.forEach((air, i) => {
      expect(air.north_mps).toBeCloseTo(2 * one[i].north_mps, 12);
      expect(air.q_radps).toBeCloseTo(2 * one[i].q_radps, 12);
    });
    expect(run(fieldOf({ turbulence: { ...rough, scale: 0 } }), 3)[2].north_mps).toBe(0);
  });

  test('another seed is other air, the same seed the same', () => {
    const [a, b, c] = [1, 1, 2].map((seed) => run(fieldOf({ turbulence: rough }, { seed }), 20));
    expect(b).toEqual(a);
    expect(c[19].north_mps).not.toBe(a[19].north_mps);
  });

  test('the longitudinal component is its own stream: its numbers do not depend on any other source', () => {
    const alone = new FirstOrderFilter(new RandomStream(1, 'turbulence.u'));
    alone.start();
    const [airspeed, height_ft] = [9, 50];
    const L = (height_ft / (0.177 + 0.000823 * height_ft) ** 1.2) * 0.3048;
    const sigma = 0.8 / (0.177 + 0.000823 * height_ft) ** 0.4;
    alone.set((airspeed * 0.001) / L);
    const gusts = [{ start_s: 0.01, rise_s: 0.05, peak_mps: 9, from_deg: 90, up_mps: 4 }];
    const all = run(fieldOf({ turbulence: rough, gusts }), 400, {
      height: height_ft * 0.3048,
      velocity: [airspeed, 0, 0],
    });
    for (let i = 0; i < 400; i += 2) {
      alone.step();
      expect(all[i].north_mps).toBeCloseTo(sigma * alone.value, 9);
    }
  });

  test('switching a gust off leaves the turbulence as it was', () => {
    const gusts = [{ start_s: 0.02, rise_s: 0.05, peak_mps: 7, from_deg: 90 }];
    const without = run(fieldOf({ mean_mps: 3, turbulence: rough }), 300);
    const withGust = run(fieldOf({ mean_mps: 3, turbulence: rough, gusts }), 300);
    withGust.forEach((air, i) => {
      expect(air.north_mps).toBeCloseTo(without[i].north_mps, 12);
      expect(air.p_radps).toBe(without[i].p_radps);
      expect(air.r_radps).toBe(without[i].r_radps);
    });
    expect(Math.min(...withGust.map((air, i) => air.east_mps - without[i].east_mps))).toBeCloseTo(-7, 3);
  });

  test('a change of height, airspeed or level in flight makes no jump beyond the turbulence’s own steps', () => {
    const field = fieldOf({ mean_mps: 6, turbulence: rough });
    let before = last(run(field, 400));
    const ownStep = largestStep(run(field, 2000, {}, 0.2)) * 1.5;
    before = { ...field.sample };
    // Twice as high, twice as fast.
    let after = run(field, 40, { height: 20, velocity: [6, 0, 0] }, 1.2);
    expect(largestStep([before, ...after])).toBeLessThan(ownStep + 0.05);
    // Turbulence off and on, the axes turned round: the level glides, the axes swing.
    for (const change of [
      { mean_mps: 6 },
      { mean_mps: 6, turbulence: rough },
      { mean_mps: 6, turbulence: { ...rough, windAt20ft_mps: 20 } },
    ]) {
      before = { ...field.sample };
      field.setWind(wind(change));
      after = run(field, 40, {}, 1.3);
      expect(largestStep([before, ...after])).toBeLessThan(3 * ownStep);
      run(field, 4000, {}, 1.4);
    }
    before = { ...field.sample };
    field.setWind(wind({ mean_mps: 6, from_deg: 180, turbulence: { ...rough, windAt20ft_mps: 20 } }));
    after = run(field, 40, {}, 5);
    // The mean wind turns at once, by 12 m/s; turbulence does not.
    const [first] = after;
    expect(Math.abs(first.north_mps - before.north_mps - 12)).toBeLessThan(3 * ownStep);
    expect(Math.abs(first.east_mps - before.east_mps)).toBeLessThan(3 * ownStep);
    expect(largestStep(after)).toBeLessThan(3 * ownStep);
  });

  test('turbulence that is switched off dies away to still air', () => {
    const field = fieldOf({ turbulence: rough });
    run(field, 100);
    field.setWind(wind({}));
    expect(last(run(field, 4000, {}, 0.05))).toEqual({
      north_mps: 0,
      east_mps: 0,
      down_mps: 0,
      p_radps: 0,
      q_radps: 0,
      r_radps: 0,
    });
  });

  test('stays finite at any height, at no airspeed, far away, at any speed and for a state that is not a number', () => {
    const extreme = fc.oneof(
      fc.double({ min: -1e9, max: 1e9, noNaN: true }),
      fc.constantFrom(0, 1e6, -1e6, 1e308, -1e308, Infinity, -Infinity, NaN),
    );
    fc.assert(
      fc.property(extreme, extreme, extreme, extreme, extreme, (north, east, height, vn, vd) => {
        for (const profile of ['uniform', { law: 'log', roughness_m: 0.1, reference_m: 10 }]) {
          const fields = {
            mean_mps: 8,
            profile,
            turbulence: rough,
            gusts: [{ start_s: 0, length_m: 1, peak_mps: 3, from_deg: 0 }],
          };
          const field = fieldOf(fields, { scene: pierScene(8) });
          for (const air of run(field, 6, { north, east, height, velocity: [vn, 0, vd] })) {
            for (const value of Object.values(air) as number[]) {
              expect(Number.isFinite(value) && Math.abs(value) < 1e4).toBe(true);
            }
          }
        }
      }),
      { numRuns: 150 },
    );
  });

  test('a step or span that is not above 0 is refused', () => {
    const options = { wind: wind({}), scene: OPEN_FIELD, step_s: STEP_S, seed: 1, span_m: 0.7 };
    expect(() => new WindField({ ...options, span_m: 0 })).toThrow(RangeError);
    expect(() => new WindField({ ...options, step_s: NaN })).toThrow(RangeError);
  });
});

function largestStep(samples: WindSample[]): number {
  let largest = 0;
  for (let i = 1; i < samples.length; i++) {
    const [a, b] = [samples[i - 1], samples[i]];
    largest = Math.max(
      largest,
      Math.hypot(a.north_mps - b.north_mps, a.east_mps - b.east_mps, a.down_mps - b.down_mps),
    );
  }
  return largest;
}

/** A pier 2 m wide, 3 m deep along the wind and 20 m high, standing at the origin in wind from the north. */
function pierScene(
  mean_mps: number,
  wake: object = { deficit: 0.8, turbulence_share: 0.3, length_m: 60 },
): Scene {
  return parseScene({
    format: 'gustbench.scene/1',
    name: 'pier',
    title: 'Pier',
    elevation_m: 0,
    ground: { tone: 'water' },
    solids: [{ name: 'pier', centre_m: [0, 0, -10], size_m: [3, 2, 20], look: 'pier', wake }],
    start: { position_m: [-20, 0, 0] },
    pilot_m: [0, 20, 0],
    wind: { format: 'gustbench.wind/1', mean_mps },
  });
}

describe('wakes', () => {
  const still = { deficit: 0.8, turbulence_share: 0, length_m: 1000 };
  /** Share of the mean wind that is missing at a place, without turbulence. */
  function deficit(behind: number, east: number, height = 8, wake: object = still): number {
    const scene = pierScene(10, wake);
    const field = new WindField({ wind: scene.wind, scene, step_s: STEP_S, seed: 1, span_m: 0.7 });
    // The wind comes from the north, so downwind is south; the box ends 1.5 m south of the origin.
    return 1 + last(run(field, 1, { north: -1.5 - behind, east, height })).north_mps / 10;
  }

  test('right behind the solid the stated deficit, beside, before and above it none', () => {
    expect(deficit(0.01, 0)).toBeCloseTo(0.8, 3);
    expect(deficit(0.01, 3)).toBe(0);
    expect(deficit(-4, 0)).toBe(0);
    expect(deficit(0.01, 0, 23)).toBe(0);
  });

  test('far behind a tall solid it falls as x^−½ and is Gaussian across, width as x^½ (plane wake)', () => {
    // Variance across: (0.1 d)² + 4 · 0.0222 δ d x with d = 2 m, δ = 0.8, and d²/12 of the top-hat itself.
    const sigma = (x: number): number => Math.sqrt(0.04 + 4 * 0.0222 * 0.8 * 2 * x + 4 / 12);
    const tall = (x: number, east: number): number => deficit(x, east, 2);
    expect(tall(100, 0) / tall(400, 0)).toBeCloseTo(2, 1);
    for (const x of [60, 200]) {
      expect(tall(x, sigma(x)) / tall(x, 0)).toBeCloseTo(Math.exp(-0.5), 2);
      expect(tall(x, 2 * sigma(x)) / tall(x, 0)).toBeCloseTo(Math.exp(-2), 2);
      expect(tall(x, -sigma(x))).toBeCloseTo(tall(x, sigma(x)), 12);
    }
  });

  test('the missing momentum across the wake is that of the solid at every distance', () => {
    for (const x of [0.5, 5, 20, 60]) {
      let sum = 0;
      for (let east = -20; east < 20; east += 0.1) sum += deficit(x, east, 1) * 0.1;
      expect(sum / (0.8 * 2), `at ${x} m`).toBeCloseTo(1, 2);
    }
  });

  test('it is gone at its length, and crossing its edges is fast but continuous', () => {
    const wake = { deficit: 0.8, turbulence_share: 0, length_m: 60 };
    expect(deficit(60, 0, 8, wake)).toBe(0);
    for (const line of [
      (t: number) => deficit(5, -4 + 8 * t, 8, wake),
      (t: number) => deficit(-6 + 70 * t, 0.9, 8, wake),
      (t: number) => deficit(3, 0, 30 * t, wake),
      (t: number) => deficit(-6 + 12 * t, 1.3, 8, wake),
    ]) {
      let largest = 0;
      for (let t = 0; t < 1; t += 1e-3) largest = Math.max(largest, Math.abs(line(t + 1e-3) - line(t)));
      expect(largest).toBeLessThan(0.05);
    }
  });

  test('added turbulence: its rms is the stated share of the wind in the core, none outside, with its own streams', () => {
    const scene = pierScene(10);
    const make = (seed: number, turbulence: object = { model: 'none', windAt20ft_mps: 0 }): WindField =>
      new WindField({
        wind: wind({ mean_mps: 10, turbulence }),
        scene,
        step_s: 0.05,
        seed,
        span_m: 0.7,
      });
    const inside = { north: -2, height: 8 };
    let [sum, count] = [0, 0];
    for (let seed = 1; seed <= 10; seed++) {
      for (const air of run(make(seed), 2000, inside, 0, 0.05)) {
        sum += air.down_mps ** 2;
        count++;
      }
    }
    expect(Math.sqrt(sum / count) / (0.3 * 10)).toBeCloseTo(1, 1);
    expect(last(run(make(1), 10, { north: -2, east: 8 })).down_mps).toBe(0);
    // The free turbulence outside does not feel that the craft was in the wake before.
    const [a, b] = [make(4, rough), make(4, rough)];
    run(a, 100, inside, 0, 0.05);
    run(b, 100, { ...inside, east: 30 }, 0, 0.05);
    const outside = { ...inside, east: 30 };
    expect(last(run(a, 1, outside, 5, 0.05))).toEqual(last(run(b, 1, outside, 5, 0.05)));
  });
});

describe('snapshots', () => {
  test('a restored field goes on bit for bit, wherever it was saved', () => {
    const place = fc.record({
      north: fc.double({ min: -30, max: 5, noNaN: true }),
      east: fc.double({ min: -2, max: 2, noNaN: true }),
      height: fc.double({ min: 0, max: 25, noNaN: true }),
      velocity: fc.tuple(
        fc.double({ min: -15, max: 15, noNaN: true }),
        fc.double({ min: -15, max: 15, noNaN: true }),
        fc.double({ min: -3, max: 3, noNaN: true }),
      ),
    });
    const gusts = [
      { start_s: 0.004, length_m: 0.1, hold_s: 0.01, peak_mps: 5, from_deg: 20 },
      { start_s: 0.01, rise_s: 0.01, peak_mps: 3, from_deg: 200, up_mps: 1 },
    ];
    const winds = [
      { mean_mps: 6, from_deg: 10, turbulence: rough, gusts },
      { mean_mps: 4, from_deg: 80, turbulence: { ...rough, model: 'MIL-HDBK-1797' }, gusts },
      { mean_mps: 4, from_deg: 80, gusts },
    ];
    const first = fc.constantFrom(...winds);
    fc.assert(
      fc.property(place, place, first, first, fc.nat(40), fc.nat(5), (here, there, one, two, steps, more) => {
        const scene = pierScene(6);
        const make = (of: object): WindField => fieldOf(of, { scene, seed: 7 });
        const field = make(one);
        run(field, steps, here);
        field.setWind(wind(two));
        run(field, more, there, steps * STEP_S);
        const snapshot = snapshotOf(field);
        const from_s = (steps + more) * STEP_S;
        const expected = run(field, 30, here, from_s);
        restore(field, snapshot);
        expect(run(field, 30, here, from_s)).toEqual(expected);
        const fresh = make(two);
        restore(fresh, snapshot);
        expect(run(fresh, 30, here, from_s)).toEqual(expected);
      }),
      { numRuns: 100 },
    );
  });

  test('a snapshot loads under a wind with another number of gusts', () => {
    const gust = { start_s: 0, rise_s: 0.1, hold_s: 10, peak_mps: 5, from_deg: 0 };
    const field = fieldOf({ gusts: [gust] });
    run(field, 500);
    const other = fieldOf({ gusts: [gust, { ...gust, from_deg: 90 }] });
    restore(other, snapshotOf(field));
    const air = last(run(other, 1, {}, 0.25));
    expect(air.north_mps).toBeCloseTo(-5, 9);
    expect(air.east_mps).toBeCloseTo(-5, 9);
  });
});
