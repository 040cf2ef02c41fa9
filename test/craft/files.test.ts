import { readdirSync, readFileSync } from 'node:fs';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { parseBuild, type Build } from '../../src/craft/build.ts';
import { parseJson, parseWith, quantity } from '../../src/craft/fields.ts';
import { parseGains } from '../../src/craft/gains.ts';
import { withoutPayload } from '../../src/craft/payload.ts';
import { InputError } from '../../src/craft/problem.ts';
import { parseScene } from '../../src/craft/scene.ts';
import { parseWind } from '../../src/craft/wind.ts';
import { demoBuild, rawDemo } from '../physics/builds.ts';

type Change = [path: string, value: unknown, message: RegExp];

/** A deep copy with one dotted path set; `undefined` deletes. */
function changed(raw: unknown, path: string, value: unknown): unknown {
  const copy = structuredClone(raw) as Record<string, unknown>;
  const keys = path.split('.');
  const last = keys.pop() as string;
  let at: Record<string, unknown> = copy;
  for (const key of keys) at = at[key] as Record<string, unknown>;
  if (value === undefined) delete at[last];
  else at[last] = value;
  return copy;
}

function problemOf(run: () => unknown): InputError {
  try {
    run();
  } catch (error) {
    if (error instanceof InputError) return error;
    throw error;
  }
  throw new Error('was accepted');
}

describe('build file', () => {
  const raw = rawDemo('sandpiper.build.json');

  const wrong: Change[] = [
    ['format', 'gustbench.build/2', /format: "gustbench.build\/2"; allowed: "gustbench.build\/1"/],
    ['airframe.mass_kg', -1, /airframe.mass_kg: -1; allowed: a number from 0.01 to 150 kg/],
    ['airframe.mass_kg', NaN, /airframe.mass_kg: NaN|null/],
    ['airframe.mass_kg', 1e308, /airframe.mass_kg: 1e\+308/],
    ['airframe.mass_kg', undefined, /airframe.mass_kg: missing/],
    ['airframe.inertia_kgm2.zz', 0.05, /airframe.inertia_kgm2.*triangle inequality/],
    ['airframe.inertia_kgm2.xy', 0.03, /airframe.inertia_kgm2.*positive definite/],
    ['airframe.mass_kg', 9, /airframe.mass_kg: 9; allowed: at most .*thrust-to-weight/],
    ['esc.idle_us', 1700, /esc.idle_us: 1700; allowed: below the hover command/],
    ['esc.max_us', 900, /esc.max_us: 900; allowed: above esc.min_us/],
    ['rotors.1.corner', 'FL', /rotors: .*allowed: the four corners FL, FR, RL, RR, each once/],
    ['rotors.0.position_m', [-0.16, -0.16, 0], /rotors\[0\].position_m: .*ahead of and left of/],
    ['rotors.1.spin', 'cw', /rotors: .*one spin on the diagonal/],
    ['propeller.powerCoefficient', 0.02, /propeller.powerCoefficient.*figure of merit below 1/],
    ['propeller.colour', 'red', /propeller.colour: "red"; allowed: no field of this name/],
    ['motor', { kv_rpm_per_V: 580 }, /motor: .*allowed: /],
    ['gyro.bias_dps', [1, 2], /gyro.bias_dps: \[1,2\]; allowed: three numbers/],
    ['battery.cells', 4.5, /battery.cells: 4.5; allowed: a whole number/],
    ['payload.mass_kg', 1.3, /payload.mass_kg: 1.3; allowed: below 80 %/],
  ];
  it.each(wrong)('refuses %s = %j by path, value and what is allowed', (path, value, message) => {
    expect(problemOf(() => parseBuild(changed(raw, path, value), 'b.json')).message).toMatch(message);
  });

  it('refuses any junk without another kind of error, and never returns a number that is not finite', () => {
    const leaf = fc.oneof(
      fc.constant(NaN),
      fc.constant(1e308),
      fc.constant(-Infinity),
      fc.string(),
      fc.constant(null),
      fc.double(),
    );
    const paths = [
      'airframe.mass_kg',
      'airframe.inertia_kgm2.xx',
      'rotors',
      'propeller.diameter_m',
      'motor.kv_rpm_per_V',
      'battery.charge',
      'gyro.noise_dps_per_rtHz',
      'esc.update_Hz',
      'airframe',
    ];
    fc.assert(
      fc.property(
        fc.constantFrom(...paths),
        fc.oneof(leaf, fc.array(leaf), fc.dictionary(fc.string(), leaf)),
        (path, value) => {
          let build: Build;
          try {
            build = parseBuild(changed(raw, path, value));
          } catch (error) {
            expect(error).toBeInstanceOf(InputError);
            return;
          }
          expect(JSON.stringify(build)).not.toMatch(/null/);
        },
      ),
      { numRuns: 400 },
    );
  });

  it('drops the payload by the parallel-axis rule: putting it back gives the loaded craft (closed form)', () => {
    const loaded = demoBuild('sandpiper');
    const bare = withoutPayload(loaded);
    const load = loaded.payload;
    if (load === undefined) throw new Error('the demo has a payload');
    expect(bare.airframe.mass_kg).toBeCloseTo(1.17, 12);
    const m1 = bare.airframe.mass_kg;
    const m2 = load.mass_kg;
    const c1 = bare.airframe.centreOfMass_m;
    for (let axis = 0; axis < 3; axis++) {
      const centre = (m1 * c1[axis] + m2 * load.position_m[axis]) / (m1 + m2);
      expect(centre).toBeCloseTo(loaded.airframe.centreOfMass_m[axis], 12);
    }
    // I_loaded = I_bare + I_load + reduced mass × (d² 1 − d dᵀ), about the common centre.
    const d = [0, 1, 2].map((axis) => load.position_m[axis] - c1[axis]);
    const reduced = (m1 * m2) / (m1 + m2);
    const own = (m2 * (load.size_m[1] ** 2 + load.size_m[2] ** 2)) / 12;
    const xx = bare.airframe.inertia_kgm2.xx + own + reduced * (d[1] ** 2 + d[2] ** 2);
    expect(xx).toBeCloseTo(loaded.airframe.inertia_kgm2.xx, 12);
    expect(bare.airframe.inertia_kgm2.xz - reduced * d[0] * d[2]).toBeCloseTo(
      loaded.airframe.inertia_kgm2.xz,
      12,
    );
    expect(() => parseBuild({ ...bare, format: 'gustbench.build/1' })).not.toThrow();
  });
});

describe('gains, wind and scene files', () => {
  const gains = rawDemo('sandpiper.gains.json');
  it.each([
    ['loop_Hz', 20, /loop_Hz: 20; allowed: a number from 50 to 8000 Hz/],
    [
      'notches',
      [{ centre_Hz: 300, q: 3 }],
      /notches\[0\].centre_Hz: 300; allowed: below half the loop rate, 200 Hz/,
    ],
    ['axes.roll.p_us_per_dps', '1', /axes.roll.p_us_per_dps: "1"; allowed: a number/],
    ['axes.roll.gain', 1, /axes.roll.gain: 1; allowed: no field of this name/],
    ['derivativeOn', 'rate', /derivativeOn: "rate"; allowed: one of "error", "measurement"/],
  ] as Change[])('gains: refuses %s = %j', (path, value, message) => {
    expect(problemOf(() => parseGains(changed(gains, path, value))).message).toMatch(message);
  });

  it('wind: a gust has either a length or a rise, not both and not neither', () => {
    const wind = { format: 'gustbench.wind/1', gusts: [{ start_s: 1, peak_mps: 5, from_deg: 0 }] };
    expect(problemOf(() => parseWind(wind)).message).toMatch(
      /gusts\[0\]: .*exactly one of length_m and rise_s/,
    );
  });

  it('scene: a wrong wind inside is named with its path', () => {
    const scene = {
      format: 'gustbench.scene/1',
      name: 'x',
      title: 'X',
      elevation_m: 0,
      ground: { tone: 'grass' },
      start: { position_m: [0, 0, 0] },
      pilot_m: [0, 0, 0],
      wind: { format: 'gustbench.wind/1', mean_mps: 900 },
    };
    expect(problemOf(() => parseScene(scene)).message).toMatch(
      /wind.mean_mps: 900; allowed: a number from 0 to 60 m\/s/,
    );
  });

  it('JSON that is cut off, too long or not JSON is said so', () => {
    expect(problemOf(() => parseJson('{"a": 1', 'f')).message).toMatch(
      /f: content: .*; allowed: a complete JSON object/,
    );
    expect(problemOf(() => parseJson(`"${'x'.repeat(5_000_000)}"`, 'f')).message).toMatch(
      /at most 4000000 characters/,
    );
    expect(() => parseWith(quantity(0, 1, 'm'), 2, 'f')).toThrow(InputError);
  });

  it('the three sites are invented, marked so, and start and pilot stand outside every solid', () => {
    const sites = ['sports-hall', 'estuary-bridge', 'quarry-face'].map((name) =>
      parseScene(rawDemo(`${name}.scene.json`), name),
    );
    for (const site of sites) {
      expect(site.note).toMatch(/^Invented for demonstration/);
      expect(new Set(site.solids.map((one) => one.name)).size).toBe(site.solids.length);
      for (const place of [site.start.position_m, site.pilot_m]) {
        const inside = site.solids.filter((one) => {
          const turn = (one.heading_deg * Math.PI) / 180;
          const [dn, de] = [place[0] - one.centre_m[0], place[1] - one.centre_m[1]];
          const along = Math.abs(Math.cos(turn) * dn + Math.sin(turn) * de);
          const across = Math.abs(Math.cos(turn) * de - Math.sin(turn) * dn);
          const high = Math.abs(place[2] - 0.5 - one.centre_m[2]) < one.size_m[2] / 2;
          return high && along < one.size_m[0] / 2 + 0.5 && across < one.size_m[1] / 2 + 0.5;
        });
        expect(inside.map((one) => one.name)).toEqual([]);
      }
    }
    expect(sites.map((site) => site.wind.mean_mps > 0)).toEqual([false, true, true]);
    expect(sites[2].elevation_m).toBe(1200);
    expect(sites[1].solids.filter((one) => one.wake !== undefined).length).toBe(3);
  });

  it('every file in scenes/ is valid', () => {
    const folder = new URL('../../scenes/', import.meta.url);
    for (const name of readdirSync(folder)) {
      const raw: unknown = JSON.parse(readFileSync(new URL(name, folder), 'utf8'));
      if (name.endsWith('.build.json')) parseBuild(raw, name);
      else if (name.endsWith('.gains.json')) parseGains(raw, name);
      else if (name.endsWith('.scene.json')) parseScene(raw, name);
      else if (name.endsWith('.wind.json')) parseWind(raw, name);
    }
  });
});
