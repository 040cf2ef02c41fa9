import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { parseGains, type Gains } from '../../src/craft/gains.ts';
import { complex, over, polynomialAt } from '../../src/shaping/complex.ts';
import { plantSystem } from '../../src/shaping/continuous.ts';
import { analyse } from '../../src/shaping/analysis.ts';
import { marginsOf } from '../../src/shaping/margins.ts';
import { rateLoop } from '../../src/shaping/rateLoop.ts';
import { gyroNoise } from '../../src/shaping/report.ts';

interface Case {
  loop_Hz: number;
  K: number;
  tau: number;
  Td: number;
  p: number;
  i: number;
  d: number;
  dcut: number;
  dkind: 'first-order' | 'biquad';
  gyro: number;
  notches: [number, number][];
  noise: number;
  expected: {
    radius: number | null;
    stable: boolean;
    pm?: number;
    wc?: number;
    dm?: number;
    gm_dB: number | null;
    gr_dB: number | null;
    ms: number;
    rise?: number;
    overshoot?: number;
    settle?: number | null;
    noise?: number;
  };
}
const cases = JSON.parse(
  readFileSync(new URL('../reference/shaping/loops.json', import.meta.url), 'utf8'),
) as Case[];

function gainsOf(c: Case): Gains {
  const axis = { p_us_per_dps: c.p, i_us_per_deg: c.i, d_us_per_dps2: c.d, feedforward_us_per_dps: 0 };
  return parseGains({
    format: 'gustbench.gains/1',
    loop_Hz: c.loop_Hz,
    axes: { roll: axis, pitch: axis, yaw: axis },
    derivativeLowPass_Hz: c.dcut,
    derivativeLowPassKind: c.dkind,
    gyroLowPass_Hz: c.gyro,
    notches: c.notches.map(([centre_Hz, q]) => ({ centre_Hz, q })),
  });
}

const near = (found: number | null | undefined, wanted: number, share: number, floor = 0) =>
  expect(Math.abs((found ?? NaN) - wanted), `${found} for ${wanted}`).toBeLessThan(
    share * Math.abs(wanted) + floor,
  );

/** Of an unstable loop: the smallest change of gain, up or down, to a crossing. */
function nearer(up: number | null, down: number | null): number | null {
  if (up === null || down === null) return up ?? down;
  return up < -down ? up : down;
}

describe('70 loops from 250 Hz to 8 kHz against SciPy (test/reference/shaping/loops.py)', () => {
  it('has unstable and conditionally stable ones among them', () => {
    expect(cases.length).toBeGreaterThanOrEqual(60);
    expect(cases.filter((c) => !c.expected.stable).length).toBeGreaterThan(4);
    expect(cases.filter((c) => c.expected.stable && c.expected.gr_dB !== null).length).toBeGreaterThan(2);
  });

  it.each(cases.map((c, index) => [index, c.loop_Hz, c] as const))(
    'loop %d at %d Hz: poles, margins within 0.1 % and 0.05°, step, noise',
    (_index, _rate, c) => {
      const loop = rateLoop(
        plantSystem({ gain_dps2_per_us: c.K, lag_s: c.tau, delay_s: c.Td }),
        gainsOf(c),
        'roll',
      );
      const found = analyse(loop, gyroNoise(c.noise, 0, c.loop_Hz).sigma_dps);
      const wanted = c.expected;
      expect(found.stable).toBe(wanted.stable);
      if (wanted.radius !== null) near(found.polesMaxRadius, wanted.radius, 1e-5);
      near(found.margins.maxSensitivity, wanted.ms, 1e-3);
      const gainMargin = wanted.stable ? wanted.gm_dB : nearer(wanted.gm_dB, wanted.gr_dB);
      if (gainMargin === null) expect(found.margins.gainMargin_dB).toBeNull();
      else near(found.margins.gainMargin_dB, gainMargin, 1e-3, 1e-4);
      if (wanted.gr_dB === null) expect(found.margins.gainReduction_dB).toBeNull();
      else near(found.margins.gainReduction_dB, wanted.gr_dB, 1e-3, 1e-4);
      if (wanted.pm !== undefined && wanted.wc !== undefined && wanted.dm !== undefined) {
        near(found.margins.phaseMargin_deg, wanted.pm, 0, 0.05);
        near((found.margins.crossover_Hz ?? NaN) * 2 * Math.PI, wanted.wc, 1e-3);
        near(found.margins.delayMargin_ms, wanted.dm, 1e-3);
      }
      if (!wanted.stable) return;
      if (wanted.rise !== undefined) near(found.step.rise_s, wanted.rise, 1e-3);
      if (wanted.overshoot !== undefined) near(found.step.overshoot_pct, wanted.overshoot, 1e-3, 1e-3);
      if (wanted.settle !== undefined && wanted.settle !== null)
        near(found.step.settle_s, wanted.settle, 1e-3);
      if (wanted.noise !== undefined) near(found.noiseAtMotor_us_rms, wanted.noise, 1e-3);
    },
  );
});

describe('textbook loops through the same margin code', () => {
  it('1/(s³+2s²+3s+4): gain margin 2.000 at 1.7321 rad/s, least distance 0.4170 at 1.6620 rad/s (python-control’s margin tests)', () => {
    const margins = marginsOf({
      at: (omega) => over(complex(1), polynomialAt([1, 2, 3, 4], complex(0, omega))),
      low: 1e-3,
      high: 1e3,
      sampled: false,
    });
    near(10 ** ((margins.gainMargin_dB ?? NaN) / 20), 2, 1e-4);
    near(margins.phaseCrossings[0].omega, 1.7321, 1e-4);
    near(1 / margins.maxSensitivity, 0.417, 1e-3);
    near(2 * Math.PI * margins.sensitivityPeak_Hz, 1.662, 1e-3);
    expect(margins.gainCrossings).toEqual([]);
  });

  it('k/(s(s+1)²): gain margin 2/k at 1 rad/s (closed form: arg = −90° − 2 arctan 1)', () => {
    const k = 0.5;
    const margins = marginsOf({
      at: (omega) => over(complex(k), polynomialAt([1, 2, 1, 0], complex(0, omega))),
      low: 1e-4,
      high: 1e3,
      sampled: false,
    });
    near(10 ** ((margins.gainMargin_dB ?? NaN) / 20), 2 / k, 1e-6);
    near(margins.phaseCrossings[0].omega, 1, 1e-6);
  });

  it('finds all crossings of a loop that is stable only between two gains (Åström & Murray, ch. 10: conditional stability)', () => {
    // L = 3 (s+6)²/(s (s+1)²): phase falls below −180° and returns.
    const at = (omega: number) => {
      const s = complex(0, omega);
      return over(polynomialAt([3, 36, 108], s), polynomialAt([1, 2, 1, 0], s));
    };
    const margins = marginsOf({ at, low: 1e-3, high: 1e3, sampled: false });
    expect(margins.phaseCrossings.length).toBe(2);
    expect(margins.gainReduction_dB).not.toBeNull();
  });
});
