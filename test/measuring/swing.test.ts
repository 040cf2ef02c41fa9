import { describe, expect, it } from 'vitest';
import { RandomStream } from '../../src/math/random.ts';
import { centreFromKnifeEdge, centreFromScales, heightFromTilt } from '../../src/measuring/balance.ts';
import { propagate, student95 } from '../../src/measuring/estimate.ts';
import { inertiaFromParts, parseParts } from '../../src/measuring/parts.ts';
import { analyseSwing } from '../../src/measuring/swing.ts';
import { parseSwing, readSwing } from '../../src/measuring/swingFile.ts';
import { holds, reference, refusal } from './support.ts';

const G = 9.80665;
const swing = (test: object, mass_kg = 1.35, more: object = {}) =>
  analyseSwing(parseSwing({ format: 'gustbench.swing/1', mass_kg, tests: [test], ...more }));
const many = (period: number, swings = 20, times = 5) =>
  Array.from({ length: times }, () => ({ swings, time_s: swings * period }));

describe('bifilar swing test', () => {
  it('reproduces a published example: 0.98 kg on wires 0.35 m apart and 1.55 m long, 9 swings in 16.5 s, 0.0161 kg·m²', () => {
    // "Measuring the Moment of Inertia of a UAV", web article of 22 April 2025, with its own figure.
    const result = swing(
      {
        axis: 'roll',
        method: 'bifilar',
        wireDistance_m: 0.35,
        wireLength_m: 1.55,
        timings: [{ swings: 9, time_s: 16.5 }],
      },
      0.98,
    );
    const inertia = result.quantities.inertia_xx_kgm2;
    expect(inertia?.value).toBeCloseTo(0.0161, 3);
    expect(Math.abs((inertia?.value ?? 0) - 0.0161)).toBeLessThan(1.96 * (inertia?.sigma ?? 0));
  });

  it('is I = m g D² T²/(16 π² L) (Jardin & Mueller, AIAA 2007-6822)', () => {
    const result = swing({
      axis: 'yaw',
      method: 'bifilar',
      wireDistance_m: 0.3,
      wireLength_m: 1.2,
      timings: many(1.5),
    });
    const closed = (1.35 * G * 0.3 ** 2 * 1.5 ** 2) / (16 * Math.PI ** 2 * 1.2);
    expect((result.quantities.inertia_zz_kgm2?.value ?? 0) / closed).toBeCloseTo(1, 12);
  });

  const nonlinear = reference().swings;
  it.each(nonlinear)('undoes the amplitude of the true pendulum (SciPy): $method, $amplitude_deg°', (one) => {
    const geometry =
      one.method === 'bifilar' ? { wireDistance_m: one.D, wireLength_m: one.L } : { pivotDistance_m: one.d };
    const result = swing(
      {
        axis: 'roll',
        method: one.method,
        ...geometry,
        amplitude_deg: one.amplitude_deg,
        timings: many(one.period_s),
      },
      one.m,
    );
    expect((result.quantities.inertia_xx_kgm2?.value ?? 0) / one.I).toBeCloseTo(1, 6);
  });

  it('says what an unstated amplitude may cost, and that cost is the true one', () => {
    const one = nonlinear.find((row) => row.amplitude_deg === 30);
    if (one === undefined) throw new Error('fixture lacks 30°');
    const result = swing(
      {
        axis: 'roll',
        method: 'bifilar',
        wireDistance_m: one.D,
        wireLength_m: one.L,
        timings: many(one.period_s),
      },
      one.m,
    );
    expect(result.notes.join(' ')).toMatch(/No amplitude .* ±30° 3.5 %/);
    expect((result.quantities.inertia_xx_kgm2?.value ?? 0) / one.I - 1).toBeCloseTo(0.035, 2);
  });

  it('takes the support out: craft and cradle swung together, cradle alone', () => {
    const period = (I: number, m: number) => ((4 * Math.PI) / 0.3) * Math.sqrt((I * 1.2) / (m * G));
    const result = swing({
      axis: 'roll',
      method: 'bifilar',
      wireDistance_m: 0.3,
      wireLength_m: 1.2,
      timings: many(period(0.0152 + 0.0011, 1.35 + 0.09)),
      support: { mass_kg: 0.09, timings: many(period(0.0011, 0.09)) },
    });
    expect((result.quantities.inertia_xx_kgm2?.value ?? 0) / 0.0152).toBeCloseTo(1, 9);
    expect(result.tests[0].support_kgm2 / 0.0011).toBeCloseTo(1, 9);
  });

  it('shows a miscounted swing and leaves it out', () => {
    const timings = many(1.5);
    timings[2] = { swings: 20, time_s: 19 * 1.5 };
    const result = swing({
      axis: 'roll',
      method: 'bifilar',
      wireDistance_m: 0.3,
      wireLength_m: 1.2,
      timings,
    });
    expect(result.tests[0].period.value).toBeCloseTo(1.5, 9);
    expect(result.tests[0].timings[2].leftOut).toBe('swings miscounted');
    expect(result.notes.join(' ')).toMatch(/1 timings lie about a whole swing/);
  });

  it('holds the truth in 90 to 98 % of 200 runs, timings and tools drawn anew', () => {
    const random = new RandomStream(5, 'swing');
    const truth = 0.0152;
    let held = 0;
    for (let run = 0; run < 200; run++) {
      // What is written down: readings rounded to the tools' steps, times with a hand's scatter.
      const m = 1.35 + 0.1 * random.uniform();
      const D = 0.25 + 0.1 * random.uniform();
      const L = 1 + 0.5 * random.uniform();
      const period = ((4 * Math.PI) / D) * Math.sqrt((truth * L) / (m * G));
      const timings = Array.from({ length: 5 }, () => ({
        swings: 20,
        time_s: Math.round(100 * (20 * period + 0.08 * random.gaussian())) / 100,
      }));
      const result = swing(
        {
          axis: 'roll',
          method: 'bifilar',
          wireDistance_m: Math.round(D * 1000) / 1000,
          wireLength_m: Math.round(L * 1000) / 1000,
          timings,
        },
        Math.round(m * 1000) / 1000,
      );
      if (result.quantities.inertia_xx_kgm2 !== undefined && holds(result.quantities.inertia_xx_kgm2, truth))
        held++;
    }
    expect(held).toBeGreaterThanOrEqual(180);
    expect(held).toBeLessThanOrEqual(196);
  });
});

describe('compound pendulum', () => {
  const period = (I: number, m: number, d: number) => 2 * Math.PI * Math.sqrt((I + m * d * d) / (m * G * d));

  it('finds inertia and pivot distance from two lengths whose difference alone is known', () => {
    const result = swing({
      axis: 'pitch',
      method: 'compound',
      suspensions: [
        { length_m: 1, timings: many(period(0.0164, 1.35, 0.11)) },
        { length_m: 1.2, timings: many(period(0.0164, 1.35, 0.31)) },
      ],
    });
    expect((result.quantities.inertia_yy_kgm2?.value ?? 0) / 0.0164).toBeCloseTo(1, 8);
    expect(result.tests[0].pivotDistance?.value).toBeCloseTo(0.11, 9);
  });

  it('takes a cradle out that swings on the same pivot', () => {
    const [I, m, d, Is, ms, ds] = [0.0164, 1.35, 0.2, 0.0008, 0.08, 0.15];
    const whole = 2 * Math.PI * Math.sqrt((I + m * d * d + Is + ms * ds * ds) / ((m * d + ms * ds) * G));
    const result = swing({
      axis: 'pitch',
      method: 'compound',
      pivotDistance_m: d,
      timings: many(whole),
      support: { mass_kg: ms, pivotDistance_m: ds, timings: many(period(Is, ms, ds)) },
    });
    expect((result.quantities.inertia_yy_kgm2?.value ?? 0) / I).toBeCloseTo(1, 9);
  });

  it('says when m d² hides the inertia', () => {
    const result = swing({
      axis: 'roll',
      method: 'compound',
      pivotDistance_m: 0.9,
      timings: many(period(0.0152, 1.35, 0.9)),
    });
    expect(result.notes.join(' ')).toMatch(/Most of what swings is m d²/);
  });
});

describe('uncertainty', () => {
  it('propagates as the GUM does for a product: relative variances add', () => {
    const result = propagate(
      'V',
      [
        { name: 'a', value: 3, sigma: 0.03 },
        { name: 'b', value: 2, sigma: 0.04 },
      ],
      ([a, b]) => a * b,
    );
    expect(result.sigma / result.value).toBeCloseTo(Math.hypot(0.01, 0.02), 9);
    expect(result.contributions[0]).toEqual({ name: 'b', share_pct: expect.closeTo(80, 6) as number });
  });

  it.each(reference().student)(
    'Student’s 95 per cent point of %i degrees is SciPy’s %f',
    (degrees, value) => {
      expect(student95(degrees)).toBeCloseTo(value, 2);
    },
  );

  it('three disagreeing tests of one axis are joined with a wider sigma and a note', () => {
    const test = (period: number) => ({
      axis: 'roll',
      method: 'bifilar',
      wireDistance_m: 0.3,
      wireLength_m: 1.2,
      timings: many(period),
    });
    const raw = { format: 'gustbench.swing/1', mass_kg: 1.35, tests: [test(1.5), test(1.6), test(1.55)] };
    const result = analyseSwing(parseSwing(raw));
    expect(result.notes.join(' ')).toMatch(/tests of roll disagree/);
    expect(result.quantities.inertia_xx_kgm2?.sigma).toBeGreaterThan(5 * result.tests[0].inertia.sigma);
  });
});

describe('swing files', () => {
  const csv = [
    '# method: bifilar',
    '# axis: yaw',
    '# mass_kg: 1,35',
    '# wireDistance_m = 0.3',
    '# wireLength_m: 1.2',
    '# supportMass_kg: 0.08',
    'swings;time_s;body',
    '20;30,1;craft',
    '20;30,3;craft',
    '20;8,0;support',
  ].join('\n');

  it('reads CSV like the same test in JSON', () => {
    expect(readSwing(csv, 'f')).toEqual(
      parseSwing({
        format: 'gustbench.swing/1',
        mass_kg: 1.35,
        tests: [
          {
            axis: 'yaw',
            method: 'bifilar',
            wireDistance_m: 0.3,
            wireLength_m: 1.2,
            timings: [
              { swings: 20, time_s: 30.1 },
              { swings: 20, time_s: 30.3 },
            ],
            support: { mass_kg: 0.08, timings: [{ swings: 20, time_s: 8 }] },
          },
        ],
      }),
    );
  });

  it('reads periods and two suspensions from CSV', () => {
    const text =
      '# method: compound\n# axis: roll\n# mass_kg: 1\nsuspension_m,period_s\n0.3,1.2\n0.3,1.21\n0.6,1.5\n';
    const [test] = readSwing(text, 'f').tests;
    expect(test.method === 'compound' ? test.suspensions?.map((one) => one.timings.length) : null).toEqual([
      2, 1,
    ]);
  });

  const wrong: [what: string, text: string, message: RegExp][] = [
    ['no method', 'swings,time_s\n20,30\n', /f: # method: missing; allowed: .*bifilar/],
    ['no mass', '# method: bifilar\n# axis: roll\nswings,time_s\n20,30\n', /mass_kg: missing/],
    ['no times', '# method: bifilar\nfoo,bar\n1,2\n', /columns "swings" and "time_s"/],
    [
      'an unknown key',
      '{"format":"gustbench.swing/1","mass_kg":1,"colour":1,"tests":[{"axis":"roll","method":"bifilar","wireDistance_m":1,"wireLength_m":1,"timings":[{"swings":9,"time_s":9}]}]}',
      /colour: 1; allowed: no field/,
    ],
    ['another version', '{"format":"gustbench.swing/2","mass_kg":1,"tests":[]}', /gustbench.swing\/1/],
    [
      'a negative time',
      csv.replace('30,1', '-30,1'),
      /timings\[0\].time_s: -30.1; allowed: a number above 0/,
    ],
    ['1e308', csv.replace('30,1', '1e308'), /time_s: 1e\+308/],
    ['cut-off JSON', '{"format":', /complete JSON/],
  ];
  it.each(wrong)('refuses %s', (_what, text, message) => {
    expect(refusal(() => readSwing(text, 'f'))).toMatch(message);
  });

  it('refuses numbers that give no inertia', () => {
    const test = { axis: 'roll', method: 'compound', pivotDistance_m: 2, timings: many(1) };
    expect(refusal(() => swing(test))).toMatch(
      /tests\[0\]: .*allowed: masses, lengths and times that give an inertia above 0/,
    );
  });
});

describe('inertia from parts', () => {
  const parts = (list: object[], more: object = {}) =>
    inertiaFromParts(parseParts({ format: 'gustbench.parts/1', parts: list, ...more }));

  it('two equal points 2a apart: m a² each about the middle, nothing about their line', () => {
    const result = parts([
      { name: 'a', shape: 'point', mass_kg: 0.2, position_m: [0.3, 0, 0.1] },
      { name: 'b', shape: 'point', mass_kg: 0.2, position_m: [-0.1, 0, 0.1] },
    ]);
    expect(result.centreOfMass_m.map((one) => one.value)).toEqual([
      expect.closeTo(0.1, 12),
      0,
      expect.closeTo(0.1, 12),
    ]);
    expect(result.quantities.inertia_xx_kgm2.value).toBeCloseTo(0, 12);
    expect(result.quantities.inertia_yy_kgm2.value).toBeCloseTo(2 * 0.2 * 0.2 ** 2, 12);
  });

  it('a box cut in two is the box (parallel-axis rule)', () => {
    const whole = parts([
      { name: 'w', shape: 'box', mass_kg: 0.6, position_m: [0.1, 0.2, 0.3], size_m: [0.4, 0.1, 0.06] },
    ]);
    const halves = parts([
      { name: 'f', shape: 'box', mass_kg: 0.3, position_m: [0.2, 0.2, 0.3], size_m: [0.2, 0.1, 0.06] },
      { name: 'r', shape: 'box', mass_kg: 0.3, position_m: [0, 0.2, 0.3], size_m: [0.2, 0.1, 0.06] },
    ]);
    for (const key of ['inertia_xx_kgm2', 'inertia_yy_kgm2', 'inertia_zz_kgm2', 'inertia_xy_kgm2'] as const) {
      expect(halves.quantities[key].value).toBeCloseTo(whole.quantities[key].value, 12);
    }
    // m (b² + c²)/12
    expect(whole.quantities.inertia_xx_kgm2.value).toBeCloseTo((0.6 / 12) * (0.1 ** 2 + 0.06 ** 2), 12);
  });

  it('four arms as an X have equal roll and pitch and no product; one arm at 45° has I_xy = −∫xy dm', () => {
    const arm = (heading_deg: number, x: number, y: number) => ({
      name: 'arm',
      shape: 'cylinder',
      axis: 'x',
      mass_kg: 0.04,
      radius_m: 0.008,
      length_m: 0.2,
      heading_deg,
      position_m: [x, y, 0],
    });
    const cross = parts([
      arm(45, 0.07, 0.07),
      arm(45, -0.07, -0.07),
      arm(-45, 0.07, -0.07),
      arm(-45, -0.07, 0.07),
    ]);
    expect(cross.quantities.inertia_xx_kgm2.value).toBeCloseTo(cross.quantities.inertia_yy_kgm2.value, 12);
    expect(cross.quantities.inertia_xy_kgm2.value).toBeCloseTo(0, 12);
    const one = parts([arm(45, 0.07, 0.07)]);
    const [along, across] = [(0.04 / 2) * 0.008 ** 2, (0.04 / 12) * (3 * 0.008 ** 2 + 0.2 ** 2)];
    expect(one.quantities.inertia_xy_kgm2.value).toBeCloseTo((along - across) / 2, 12);
  });

  it('says when the parts miss much of the weighed mass', () => {
    const result = parts([{ name: 'a', shape: 'point', mass_kg: 0.8, position_m: [0, 0, 0] }], {
      weighedMass_kg: 1,
    });
    expect(result.notes.join(' ')).toMatch(/weigh 0.800 kg together, the craft 1 kg/);
    expect(result.mass_kg.value).toBeCloseTo(1, 12);
  });
});

describe('centre of mass by balance', () => {
  const scales = [
    { position_m: 0.2, reading_kg: 0.75 },
    { position_m: -0.1, reading_kg: 0.5 },
  ];
  const level = { axis: 'x' as const, scales, massStep_kg: 0.001, lengthStep_m: 0.001 };

  it('is the mean of the places weighted by the readings', () => {
    const result = centreFromScales(level);
    expect(result.centre.value).toBeCloseTo((0.75 * 0.2 - 0.5 * 0.1) / 1.25, 12);
    expect(result.mass_kg).toBeCloseTo(1.25, 12);
    // dx/dp = w/W for each place, dx/dw = (p − x)/W for each reading, each step over √12.
    const step = 0.001 / Math.sqrt(12);
    const expected = step * Math.hypot(0.6, 0.4, (0.2 - 0.08) / 1.25, (-0.1 - 0.08) / 1.25);
    expect(result.centre.sigma / expected).toBeCloseTo(1, 3);
  });

  it('height from a tilt: readings of a mass 60 mm above the contacts, tilted 25°', () => {
    const x = 0.08 - 0.06 * Math.tan((25 * Math.PI) / 180);
    const front = (1.25 * (x + 0.1)) / 0.3;
    const result = heightFromTilt({
      level,
      tiltedReadings_kg: [front, 1.25 - front],
      tilt_deg: 25,
      tiltStep_deg: 0.5,
      contactDown_m: 0.1,
    });
    expect(result.centre.value).toBeCloseTo(0.1 - 0.06, 9);
  });

  it('knife edge: mean and scatter of the balance points', () => {
    const result = centreFromKnifeEdge({
      axis: 'x',
      positions_m: [0.01, 0.012, 0.008, 0.01],
      lengthStep_m: 0.0005,
    });
    expect(result.centre.value).toBeCloseTo(0.01, 12);
    expect(result.centre.sigma).toBeGreaterThan(0.0008);
  });

  it('refuses one scale, scales in one place, a flat tilt', () => {
    expect(refusal(() => centreFromScales({ ...level, scales: scales.slice(1) }))).toMatch(
      /at least two scales/,
    );
    expect(refusal(() => centreFromScales({ ...level, scales: [scales[0], scales[0]] }))).toMatch(
      /at least 0.01 m apart/,
    );
    expect(
      refusal(() =>
        heightFromTilt({ level, tiltedReadings_kg: [1, 1], tilt_deg: 1, tiltStep_deg: 1, contactDown_m: 0 }),
      ),
    ).toMatch(/tilt_deg: 1; allowed: from 5/);
  });
});
