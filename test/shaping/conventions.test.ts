import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  CONVENTIONS,
  exportConstants,
  fromConvention,
  parseConvention,
  toConvention,
  whatChangesWithRate,
} from '../../src/shaping/conventions.ts';
import { demoGains } from '../physics/builds.ts';

describe('gain conventions', () => {
  it('go there and back exactly, to the last digits of a double (fast-check)', () => {
    const gain = fc.double({ min: 1e-4, max: 50, noNaN: true });
    fc.assert(
      fc.property(
        fc.constantFrom(...CONVENTIONS),
        gain,
        gain,
        gain,
        fc.constantFrom(250, 400, 1000, 8000),
        (convention, p, i, d, loop_Hz) => {
          const base = demoGains('sandpiper');
          const axis = {
            ...base.axes.roll,
            p_us_per_dps: p,
            i_us_per_deg: i,
            d_us_per_dps2: d / 100,
            feedforward_us_per_dps: p / 3,
          };
          const gains = { ...base, loop_Hz, axes: { roll: axis, pitch: axis, yaw: axis } };
          const back = fromConvention(toConvention(gains, convention), convention, gains).axes.roll;
          for (const key of [
            'p_us_per_dps',
            'i_us_per_deg',
            'd_us_per_dps2',
            'feedforward_us_per_dps',
          ] as const) {
            expect(Math.abs(back[key] / axis[key] - 1)).toBeLessThan(8 * Number.EPSILON);
          }
        },
      ),
    );
  });

  it('worked by hand: 1.4 µs per deg/s is 1.4·57.2958/1000 of a 1000 µs span per rad/s; K_i·T and K_d/T at 400 Hz', () => {
    const gains = demoGains('sandpiper');
    const roll = { ...gains.axes.roll, p_us_per_dps: 1.4, i_us_per_deg: 4, d_us_per_dps2: 0.02 };
    const set = { ...gains, axes: { ...gains.axes, roll } };
    expect(toConvention(set, CONVENTIONS[3]).roll.p).toBeCloseTo((1.4 * 57.29577951308232) / 1000, 12);
    expect(toConvention(set, CONVENTIONS[1]).roll.i).toBeCloseTo(4 / 400, 12);
    expect(toConvention(set, CONVENTIONS[1]).roll.d).toBeCloseTo(0.02 * 400, 12);
    expect(toConvention(set, CONVENTIONS[2]).roll).toMatchObject({ i: 1.4 / 4, d: 0.02 / 1.4 });
  });

  it('say what must change with the loop rate', () => {
    expect(whatChangesWithRate(CONVENTIONS[1], 400, 800)[0]).toMatch(/I constants × 0.5/);
    expect(whatChangesWithRate(CONVENTIONS[1], 400, 800)[1]).toMatch(/D constants × 2/);
    expect(whatChangesWithRate(CONVENTIONS[0], 400, 800)[0]).toMatch(/no constant/);
  });

  it('export C that carries units and cautions', () => {
    const text = exportConstants(demoGains('sandpiper'), CONVENTIONS[0], 'c', 'Sandpiper');
    expect(text).toMatch(/#define RATE_ROLL_P 1\.4f \/\* us per deg\/s \*\//);
    expect(text).toMatch(/no clearance to fly/);
    expect(JSON.parse(exportConstants(demoGains('wren'), CONVENTIONS[4], 'json', 'Wren'))).toHaveProperty(
      'constants.yaw.p',
    );
  });

  it('a convention file is validated by name', () => {
    expect(() => parseConvention({ format: 'gustbench.convention/1', name: 'x', rate: 'rpm' })).toThrow(
      /rate: "rpm"; allowed: one of/,
    );
  });

  it('a time with P = 0 is refused plainly', () => {
    const gains = demoGains('sandpiper');
    const roll = { ...gains.axes.roll, p_us_per_dps: 0 };
    expect(() => toConvention({ ...gains, axes: { ...gains.axes, roll } }, CONVENTIONS[2])).toThrow(
      /needs P above 0/,
    );
  });
});
