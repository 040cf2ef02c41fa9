/** Worked examples of the literature through the same code as the rate loops. */
import { describe, expect, it } from 'vitest';
import { responseAt } from '../../src/shaping/axisModel.ts';
import { analyse } from '../../src/shaping/analysis.ts';
import { complex, over, polynomialAt, times, unit, type Complex } from '../../src/shaping/complex.ts';
import { sampled, transferSystem } from '../../src/shaping/continuous.ts';
import { marginsOf } from '../../src/shaping/margins.ts';
import { simcGains } from '../../src/shaping/startingGains.ts';
import { stepInfo } from '../../src/shaping/stepInfo.ts';
import { gainsOf, loopOf, plantOf } from './plants.ts';

const continuous = (at: (omega: number) => Complex) =>
  marginsOf({ at, low: 1e-3, high: 1e3, sampled: false });
const transfer = (b: number[], a: number[]) => (omega: number) =>
  over(polynomialAt(b, complex(0, omega)), polynomialAt(a, complex(0, omega)));

/** Exact samples of the unit step of b(s)/a(s). */
function stepOf(b: number[], a: number[], dt: number, count: number) {
  const { states, transition, now, C } = sampled(transferSystem(b, a), dt);
  let x = new Float64Array(states);
  const y = new Float64Array(count);
  for (let k = 0; k < count; k++) {
    y[k] = C.reduce((sum, c, j) => sum + c * x[j], 0);
    const next = now.slice();
    for (let i = 0; i < states; i++)
      for (let j = 0; j < states; j++) next[i] += transition[i * states + j] * x[j];
    x = next;
  }
  return { t_s: Float64Array.from({ length: count }, (_, k) => k * dt), y };
}

describe('steps', () => {
  // python-control’s step-info example prints rise 1.256, settling 9.071, overshoot 20.85 and peak time 4.187 on a
  // grid of 0.0698 s; scipy.signal.step on a grid of 0.1 ms gives what is held here.
  it('(1−s)/(s²+s+1): rise 1.2661, settling 8.993, overshoot 20.871 %, peak at 4.232 (SciPy, and python-control’s example to its grid)', () => {
    const { t_s, y } = stepOf([-1, 1], [1, 1, 1], 0.002, 20_000);
    const info = stepInfo(t_s, y, 1);
    expect(info.rise_s).toBeCloseTo(1.2661, 3);
    expect(info.settle_s).toBeCloseTo(8.993, 2);
    expect(info.overshoot_pct).toBeCloseTo(20.871, 2);
    const peak = y.indexOf(Math.max(...y));
    expect(Math.abs(t_s[peak] - 4.2322)).toBeLessThan(0.003);
    expect(Math.abs((info.rise_s ?? 0) - 1.256)).toBeLessThan(0.0698);
    expect(Math.abs((info.settle_s ?? 0) - 9.071)).toBeLessThan(2 * 0.0698);
  });

  it.each([
    [0.3, 37.2326],
    [0.5, 16.3034],
    [0.7, 4.5988],
  ])('second order, ζ = %d: overshoot %d %% (exp(−πζ/√(1−ζ²)), closed form)', (zeta, overshoot) => {
    const { t_s, y } = stepOf([1], [1, 2 * zeta, 1], 0.001, 30_000);
    expect(stepInfo(t_s, y, 1).overshoot_pct).toBeCloseTo(overshoot, 3);
  });

  it('a step that does not arrive has no rise and no settling', () => {
    const info = stepInfo(Float64Array.from([0, 1, 2]), Float64Array.from([0, 0.2, 0.5]), 1);
    expect(info).toEqual({ rise_s: null, overshoot_pct: 0, settle_s: null });
  });

  it('a transfer that is not strictly proper is refused', () => {
    expect(() => transferSystem([1, 0], [1, 1])).toThrow(/higher order/);
  });
});

describe('margins', () => {
  it('3/(s+1)³ (a worked loop of Åström & Murray, Feedback Systems, ch. 10): gain margin 8/3 and phase margin 41.7° in closed form, least distance 0.45455 on a direct grid', () => {
    const margins = continuous(transfer([3], [1, 3, 3, 1]));
    expect(10 ** ((margins.gainMargin_dB ?? NaN) / 20)).toBeCloseTo(8 / 3, 6);
    // |L| = 1 at 1 + ω² = 3^(2/3).
    const crossover = Math.sqrt(3 ** (2 / 3) - 1);
    expect(margins.phaseMargin_deg).toBeCloseTo(180 - (540 / Math.PI) * Math.atan(crossover), 6);
    expect(1 / margins.maxSensitivity).toBeCloseTo(0.454545, 5);
  });

  it('responseAt of the state-space form is the transfer itself', () => {
    const system = transferSystem([2, 5], [1, 3, 4, 7]);
    for (const omega of [0.1, 1, 3, 20]) {
      const found = responseAt(system, omega);
      const wanted = transfer([2, 5], [1, 3, 4, 7])(omega);
      expect(found.re).toBeCloseTo(wanted.re, 12);
      expect(found.im).toBeCloseTo(wanted.im, 12);
    }
  });

  // Skogestad 2003, robustness of SIMC PI with τ_c = θ; second row from memory, the first also closed form
  // (L = e^(−θs)/(2θs): gain margin π, phase margin 90° − 0.5 rad, delay 2θ·phase).
  it.each([
    [
      'first-order, τ_I = τ₁',
      false,
      { gm: 3.14, pm: 61.4, ms: 1.59, mt: 1.0, w180: 1.57, wc: 0.5, dead: 2.14 },
    ],
    [
      'integrating, τ_I = 8θ',
      true,
      { gm: 2.96, pm: 46.9, ms: 1.7, mt: 1.3, w180: 1.49, wc: 0.51, dead: 1.59 },
    ],
  ])(
    'SIMC, %s: gain margin, phase margin, Ms, Mt, frequencies, allowed delay',
    (_name, integrating, wanted) => {
      // θ = 1, k' = 1: K_c = 0.5; with the lag cancelled L = 0.5 e^(−s)/s, else times (1 + 1/(8s)).
      const at = (omega: number) => {
        const s = complex(0, omega);
        const base = over(times(complex(0.5), unit(-omega)), s);
        return integrating ? times(base, over(complex(1, 8 * omega), times(complex(8), s))) : base;
      };
      const margins = marginsOf({ at, low: 1e-3, high: 3, sampled: false });
      expect(10 ** ((margins.gainMargin_dB ?? NaN) / 20)).toBeCloseTo(wanted.gm, 2);
      expect(margins.phaseMargin_deg).toBeCloseTo(wanted.pm, 1);
      expect(margins.maxSensitivity).toBeCloseTo(wanted.ms, 2);
      expect(margins.maxComplementary).toBeCloseTo(wanted.mt, 1);
      expect(margins.phaseCrossings[0].omega).toBeCloseTo(wanted.w180, 2);
      expect(margins.gainCrossings[0].omega).toBeCloseTo(wanted.wc, 1);
      expect((margins.delayMargin_ms ?? NaN) / 1000).toBeCloseTo(wanted.dead, 2);
    },
  );

  it('SIMC for an integrating plant with lag has in this program’s parallel form the margins of its integrating row (Skogestad 2003)', () => {
    // Nearly continuous: 8 kHz, the series derivative cancels the lag but for the sampled difference.
    const plant = plantOf(50, 0.03, 0.02);
    const found = simcGains(plant, 1 / 8000, 0);
    const loop = loopOf(plant, gainsOf(8000, found.p_us_per_dps, found.i_us_per_deg, found.d_us_per_dps2));
    const { margins } = analyse(loop, 0);
    expect(10 ** ((margins.gainMargin_dB ?? NaN) / 20)).toBeGreaterThan(2.9);
    expect(margins.phaseMargin_deg).toBeCloseTo(46.9, 0);
    expect(margins.maxSensitivity).toBeCloseTo(1.7, 1);
  });
});

describe('sampled plants', () => {
  // τ = T = 1 there; here both 0.02 s, and K p T in place of K.
  const T = 0.02;

  it('1/(s(s+1)) held over T = 1: 0.3679 (z + 0.7183)/((z − 1)(z − 0.3679)) (Ogata, Discrete-Time Control Systems)', () => {
    const { transition, now, denominator } = loopOf(plantOf(1 / T, T, 0), gainsOf(50, 1, 0, 0)).plant;
    expect(now[0]).toBeCloseTo(0.3679, 4);
    expect(transition[3]).toBeCloseTo(0.3679, 4);
    // det(wI − (Φ − I)) = w (w + 1 − 0.3679).
    expect(denominator[1]).toBeCloseTo(1 - 0.3679, 4);
  });

  it('unity feedback of it is stable for 0 < K < 2.3925 (Ogata, same example)', () => {
    const at = (K: number) => analyse(loopOf(plantOf(1 / T, T, 0), gainsOf(50, K, 0, 0)), 0);
    expect(at(2.392).stable).toBe(true);
    expect(at(2.393).stable).toBe(false);
    expect(at(1).margins.gainMargin_dB).toBeCloseTo(20 * Math.log10(2.3922), 2);
  });
});
