import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  biquadLowPass,
  biquadNotch,
  FilterChain,
  firstOrderLowPass,
  type BiquadCoefficients,
} from '../../src/control/filters.ts';
import { Mixer, mixerMatrix } from '../../src/control/mixer.ts';
import { RatePid } from '../../src/control/ratePid.ts';
import { compileCraft } from '../../src/craft/compile.ts';
import { parseGains, type Gains } from '../../src/craft/gains.ts';
import { demoBuild, rawDemo } from '../physics/builds.ts';

/** |H(e^{jωT})|. */
function gainAt(c: BiquadCoefficients, f_Hz: number, sample_Hz: number): number {
  const w = (2 * Math.PI * f_Hz) / sample_Hz;
  const at = (b0: number, b1: number, b2: number) =>
    Math.hypot(b0 + b1 * Math.cos(w) + b2 * Math.cos(2 * w), b1 * Math.sin(w) + b2 * Math.sin(2 * w));
  return at(c.b0, c.b1, c.b2) / at(1, c.a1, c.a2);
}

describe('filters', () => {
  it('have the Audio EQ Cookbook’s landmarks: −3.01 dB at the corner, 0 at the notch, 1 at 0 Hz', () => {
    expect(gainAt(biquadLowPass(60, 400), 60, 400)).toBeCloseTo(Math.SQRT1_2, 9);
    expect(gainAt(biquadLowPass(60, 400), 0, 400)).toBeCloseTo(1, 12);
    expect(gainAt(biquadNotch(90, 4, 1000), 90, 1000)).toBeLessThan(1e-12);
    // A notch of quality q is down 3 dB at the edges of a band centre/q wide (bilinear-warped).
    expect(gainAt(biquadNotch(90, 4, 1000), 0, 1000)).toBeCloseTo(1, 12);
    expect(gainAt(firstOrderLowPass(10, 1000), 10, 1000)).toBeCloseTo(Math.SQRT1_2, 2);
  });

  it('first-order low-pass answers a step as 1 − exp(−2π f_c t) at the samples (step-invariant)', () => {
    const chain = new FilterChain([firstOrderLowPass(30, 400)]);
    for (let k = 1; k <= 20; k++) {
      expect(chain.next(1)).toBeCloseTo(1 - Math.exp((-2 * Math.PI * 30 * k) / 400), 12);
    }
  });

  it('settled on a value pass it on unchanged', () => {
    fc.assert(
      fc.property(fc.double({ min: -2000, max: 2000, noNaN: true }), (value) => {
        const chain = new FilterChain([
          biquadLowPass(80, 1000),
          biquadNotch(120, 3, 1000),
          firstOrderLowPass(50, 1000),
        ]);
        chain.settle(value);
        for (let k = 0; k < 5; k++) expect(chain.next(value)).toBeCloseTo(value, 8);
      }),
    );
  });
});

function gainsWith(change: object, axis: object): Gains {
  const base = rawDemo('sandpiper.gains.json') as { axes: object };
  const one = { p_us_per_dps: 0, i_us_per_deg: 0, d_us_per_dps2: 0, feedforward_us_per_dps: 0, ...axis };
  return parseGains({
    ...base,
    derivativeLowPass_Hz: 0,
    ...change,
    axes: { roll: one, pitch: one, yaw: one },
  });
}

describe('rate PID in discrete form', () => {
  const T = 1 / 400;

  it('integrates by the trapezoidal rule: i·T·(k − ½) after k ticks of unit error', () => {
    const pid = new RatePid(gainsWith({}, { i_us_per_deg: 3 }), 'roll');
    pid.update(0, 0, false, 0);
    for (let k = 1; k <= 50; k++) expect(pid.update(1, 0, false, 0)).toBeCloseTo(3 * T * (k - 0.5), 12);
  });

  it('differentiates measurement by backward difference, without a kick from the setpoint', () => {
    const pid = new RatePid(gainsWith({ derivativeOn: 'measurement' }, { d_us_per_dps2: 0.02 }), 'roll');
    pid.update(0, 0, false, 0);
    expect(pid.update(100, 0, false, 0)).toBe(0);
    expect(pid.update(100, 5, false, 0)).toBeCloseTo((-0.02 * 5) / T, 12);
    const onError = new RatePid(gainsWith({ derivativeOn: 'error' }, { d_us_per_dps2: 0.02 }), 'roll');
    onError.update(0, 0, false, 0);
    expect(onError.update(1, 0, false, 0)).toBeCloseTo(0.02 / T, 12);
  });

  it('weights the setpoint in P and adds feed-forward', () => {
    const pid = new RatePid(
      gainsWith({}, { p_us_per_dps: 2, setpointWeight: 0.5, feedforward_us_per_dps: 0.3 }),
      'pitch',
    );
    expect(pid.update(10, 4, false, 0)).toBeCloseTo(2 * (5 - 4) + 3, 12);
  });

  it('never leaves its limits and does not wind up: the integral comes back within one reversal (clamping)', () => {
    const pid = new RatePid(
      gainsWith({ outputLimit_us: 50, integralLimit_us: 40 }, { p_us_per_dps: 1, i_us_per_deg: 10 }),
      'roll',
    );
    for (let k = 0; k < 4000; k++) expect(Math.abs(pid.update(500, 0, false, 0))).toBeLessThanOrEqual(50);
    expect(pid.i_us).toBeLessThanOrEqual(40);
    const before = pid.i_us;
    pid.update(-100, 0, false, 0);
    pid.update(-100, 0, false, 0);
    expect(pid.i_us).toBeLessThan(before + 1e-12);
  });

  it('back-calculation pulls the integral back while the output is limited (Åström & Hägglund)', () => {
    const gains = gainsWith(
      { outputLimit_us: 50, integralLimit_us: 500, antiWindup: 'back-calculation' },
      { p_us_per_dps: 1, i_us_per_deg: 10 },
    );
    const pid = new RatePid(gains, 'roll');
    for (let k = 0; k < 4000; k++) pid.update(60, 0, false, 0);
    // Steady: i·e = (limit excess)/T_t with T_t = T_i = p/i.
    expect(pid.i_us).toBeCloseTo(50, -1);
  });
});

describe('mixer', () => {
  it('of an X layout adds an axis command to one pair and takes it from the other, with the agreed signs', () => {
    const m = mixerMatrix(
      compileCraft({
        ...demoBuild('sandpiper'),
        airframe: { ...demoBuild('sandpiper').airframe, centreOfMass_m: [0, 0, 0] },
      }),
    );
    const column = (c: number) => [0, 1, 2, 3].map((i) => Math.round(m[4 * i + c] * 1e9) / 1e9);
    expect(column(0)).toEqual([1, 1, 1, 1]);
    expect(column(1), 'roll: FL and RL up').toEqual([1, -1, 1, -1]);
    expect(column(2), 'pitch: FL and FR up').toEqual([1, 1, -1, -1]);
    expect(column(3), 'yaw: the counter-clockwise ones, FR and RL, up').toEqual([-1, 1, 1, -1]);
  });

  it('gives pure axis moments for any four positions', () => {
    const build = demoBuild('sandpiper');
    const place = fc.double({ min: 0.12, max: 0.4, noNaN: true });
    fc.assert(
      fc.property(fc.tuple(place, place, place, place, place, place, place, place), (p) => {
        const positions = [
          [p[0], -p[1]],
          [p[2], p[3]],
          [-p[4], -p[5]],
          [-p[6], p[7]],
        ];
        const craft = compileCraft({
          ...build,
          airframe: { ...build.airframe, centreOfMass_m: [0, 0, 0] },
          rotors: build.rotors.map((rotor, i) => ({
            ...rotor,
            position_m: [...positions[i], 0],
          })) as typeof build.rotors,
        });
        const m = mixerMatrix(craft);
        const moment = (column: number) => {
          const t = [0, 1, 2, 3].map((i) => m[4 * i + column]);
          const sum = (weight: (i: number) => number) =>
            t.reduce((total, value, i) => total + weight(i) * value, 0);
          return [
            sum(() => 1),
            sum((i) => -positions[i][1]),
            sum((i) => positions[i][0]),
            sum((i) => -craft.spin[i]),
          ];
        };
        for (let column = 0; column < 4; column++) {
          const got = moment(column);
          got.forEach((value, row) => {
            if (row !== column) expect(Math.abs(value)).toBeLessThan(1e-9);
            else expect(value).toBeGreaterThan(0);
          });
        }
      }),
    );
  });

  it('keeps every command within idle and full and serves attitude before yaw before collective', () => {
    const craft = compileCraft(demoBuild('sandpiper'));
    const axis = fc.double({ min: -800, max: 800, noNaN: true });
    for (const desaturation of ['attitude-first', 'keep-collective'] as const) {
      const mixer = new Mixer(craft, desaturation);
      fc.assert(
        fc.property(
          fc.double({ min: 1070, max: 2000, noNaN: true }),
          axis,
          axis,
          axis,
          (collective, roll, pitch, yaw) => {
            mixer.mix(collective, roll, pitch, yaw);
            for (const command of mixer.command_us) {
              expect(command).toBeGreaterThanOrEqual(craft.escIdle_us - 1e-9);
              expect(command).toBeLessThanOrEqual(craft.escMax_us + 1e-9);
            }
            // What is left of roll is what the report says.
            const m = mixer.matrix;
            const applied = mixer.command_us.reduce(
              (sum, command, i) => sum + (Math.sign(m[4 * i + 1]) * command) / 4,
              0,
            );
            const asked = [0, 1, 2, 3].reduce(
              (sum, i) =>
                sum +
                (Math.sign(m[4 * i + 1]) *
                  (mixer.attitudeKept * (m[4 * i + 1] * roll + m[4 * i + 2] * pitch))) /
                  4,
              0,
            );
            if (desaturation === 'attitude-first') expect(applied).toBeCloseTo(asked, 0);
          },
        ),
      );
    }
  });
});
