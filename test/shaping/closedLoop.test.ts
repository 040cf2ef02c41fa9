/** Handling, disturbance rejection, the levelled loop, poles of long loops, noise and gusts. */
import { readFileSync } from 'node:fs';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { analyse } from '../../src/shaping/analysis.ts';
import { complex, over, times, unit } from '../../src/shaping/complex.ts';
import { plantSystem } from '../../src/shaping/continuous.ts';
import { gustResponse } from '../../src/shaping/gust.ts';
import { disturbanceRejection, handlingBandwidth } from '../../src/shaping/handling.ts';
import { analyseLevelled } from '../../src/shaping/levelledLoop.ts';
import { loopCurves } from '../../src/shaping/curves.ts';
import { noiseAtMotor } from '../../src/shaping/noise.ts';
import { closedLoopPoles, polesOfLongLoop, sourceOf } from '../../src/shaping/poles.ts';
import { closedLoopAt, openLoopAt, rateLoop } from '../../src/shaping/rateLoop.ts';
import { reportForPlant } from '../../src/shaping/report.ts';
import { gainsOf, loopOf, plantOf } from './plants.ts';

interface Case {
  loop_Hz: number;
  K: number;
  tau: number;
  Td: number;
  p: number;
  i: number;
  d: number;
  dcut: number;
  kappa: number;
  expected: {
    handling: { bandwidth_Hz: number; phaseDelay_s: number };
    rejection: { bandwidth_Hz: number; peak_dB: number };
    motors: { pm: number; gm_dB: number; ms: number };
    attitude: { pm: number; gm_dB: number; ms: number };
    attitudeRejection: { bandwidth_Hz: number; peak_dB: number };
    attitudeHandling: { bandwidth_Hz: number; phaseDelay_s: number };
    overshoot_pct: number;
    last_outside_s: number;
  };
}
const cases = JSON.parse(
  readFileSync(new URL('../reference/shaping/closed.json', import.meta.url), 'utf8'),
) as Case[];

const near = (found: number | null | undefined, wanted: number, share: number, floor = 0) =>
  expect(Math.abs((found ?? NaN) - wanted), `${found} for ${wanted}`).toBeLessThan(
    share * Math.abs(wanted) + floor,
  );

describe('closed loops against SciPy (test/reference/shaping/closed.py)', () => {
  it.each(cases.map((c, index) => [index, c.loop_Hz, c] as const))(
    'loop %d at %d Hz: handling, rejection, levelled margins and step',
    (_index, loop_Hz, c) => {
      const gains = gainsOf(loop_Hz, c.p, c.i, c.d, {
        derivativeLowPass_Hz: c.dcut,
        levelling: { attitude_per_s: c.kappa, maxAngle_deg: 30 },
      });
      const plant = plantOf(c.K, c.tau, c.Td);
      const wanted = c.expected;
      const { roll } = reportForPlant(plant, gains);
      near(roll.handling?.bandwidth_Hz, wanted.handling.bandwidth_Hz, 1e-3);
      near(roll.handling?.phaseDelay_s, wanted.handling.phaseDelay_s, 1e-3);
      near(roll.disturbanceRejection?.bandwidth_Hz, wanted.rejection.bandwidth_Hz, 1e-3);
      near(roll.disturbanceRejection?.peak_dB, wanted.rejection.peak_dB, 1e-3, 1e-4);
      const levelled = analyseLevelled(loopOf(plant, gains), c.kappa);
      expect(levelled.stable).toBe(true);
      near(levelled.atMotors.phaseMargin_deg, wanted.motors.pm, 0, 0.05);
      near(levelled.atMotors.gainMargin_dB, wanted.motors.gm_dB, 1e-3);
      near(levelled.atMotors.maxSensitivity, wanted.motors.ms, 1e-3);
      near(levelled.atAttitude.phaseMargin_deg, wanted.attitude.pm, 0, 0.05);
      near(levelled.atAttitude.gainMargin_dB, wanted.attitude.gm_dB, 1e-3);
      near(levelled.atAttitude.maxSensitivity, wanted.attitude.ms, 1e-3);
      near(levelled.rejection.bandwidth_Hz, wanted.attitudeRejection.bandwidth_Hz, 1e-3);
      near(levelled.handling.bandwidth_Hz, wanted.attitudeHandling.bandwidth_Hz, 1e-3);
      near(levelled.handling.phaseDelay_s, wanted.attitudeHandling.phaseDelay_s, 1e-3);
      near(levelled.step.overshoot_pct, wanted.overshoot_pct, 1e-3, 1e-3);
      // SciPy's is the last sample outside; ours is interpolated to the band's edge, within the next tick.
      const after = (levelled.step.settle_s ?? NaN) - wanted.last_outside_s;
      expect(after).toBeGreaterThanOrEqual(0);
      expect(after).toBeLessThanOrEqual(1 / loop_Hz);
    },
  );
});

describe('ADS-33E bandwidth and phase delay', () => {
  it('of e^(−sT)/(s(s/a+1)): phase bandwidth and delay in closed form at −135°, −180° and twice that', () => {
    const [T, a] = [0.02, 12];
    const at = (omega: number) => over(unit(-omega * T), times(complex(0, omega), complex(1, omega / a)));
    const found = handlingBandwidth(at, 0.05, 1000, 'rate');
    const w135 = 2 * Math.PI * (found.phaseBandwidth_Hz ?? NaN);
    expect(90 + (180 / Math.PI) * (Math.atan(w135 / a) + w135 * T)).toBeCloseTo(135, 6);
    // ω180: atan(ω/a) + ωT = 90°.
    let w = 1;
    for (let k = 0; k < 200; k++) w += 0.2 * (Math.PI / 2 - Math.atan(w / a) - w * T) * a;
    const runOff = Math.atan((2 * w) / a) + 2 * w * T - Math.PI / 2;
    expect(found.phaseDelay_s).toBeCloseTo(runOff / (2 * w), 8);
  });

  it('a response whose phase never reaches −180° has no phase delay, and says so', () => {
    const found = handlingBandwidth((omega) => over(complex(1), complex(1, omega)), 0.05, 1000, 'rate');
    expect(found.phaseDelay_s).toBeNull();
    expect(found.reason).toMatch(/−180°/);
  });

  it('an integrator k/s rejects below k/(2π) Hz (|S|² = ω²/(ω² + k²), closed form)', () => {
    const found = disturbanceRejection((omega) => over(complex(5), complex(0, omega)), 1e-3, 1e3, {
      value: 1,
      hertz: 1,
    });
    expect(found.bandwidth_Hz).toBeCloseTo(5 / (2 * Math.PI), 8);
    expect(found.peak_dB).toBe(0);
  });
});

describe('poles', () => {
  it('of long loops by Newton and Nyquist agree with the eigenvalues (fast-check)', () => {
    fc.assert(
      fc.property(
        fc.constantFrom(250, 400, 1000, 2000),
        fc.double({ min: 0.05, max: 6, noNaN: true }),
        fc.double({ min: 0, max: 8, noNaN: true }),
        fc.double({ min: 0, max: 0.03, noNaN: true }),
        fc.constantFrom(0, 0.01, 0.04),
        fc.double({ min: 0, max: 0.012, noNaN: true }),
        (loop_Hz, p, rate, time, lag, delay) => {
          const loop = loopOf(plantOf(30, lag, delay), gainsOf(loop_Hz, p, p * rate, p * time));
          const exact = closedLoopPoles(loop);
          // On the edge itself either answer is right.
          fc.pre(Math.abs(exact.maxRadius - 1) > 1e-5);
          const found = polesOfLongLoop(sourceOf(loop));
          expect(found.stable).toBe(exact.stable);
          expect(found.maxRadius).toBeCloseTo(exact.maxRadius, 5);
        },
      ),
      { numRuns: 60 },
    );
  }, 60_000);

  it('a delay of 4000 ticks is answered: the delay margin of a P-controlled integrator is what it is without it, less the delay', () => {
    const at = (delay_s: number) => analyse(loopOf(plantOf(30, 0, delay_s), gainsOf(8000, 0.02, 0, 0)), 0);
    const [short, long] = [at(0), at(0.5)];
    expect(long.stable).toBe(true);
    near((short.margins.delayMargin_ms ?? NaN) - 500, long.margins.delayMargin_ms ?? NaN, 1e-6);
  }, 60_000);
});

describe('margins are where stability ends', () => {
  const plant = plantOf(40, 0.02, 0.0031);
  const gains = gainsOf(400, 1.3, 6, 0.014, { derivativeLowPass_Hz: 60, gyroLowPass_Hz: 100 });
  const found = analyse(loopOf(plant, gains), 0);
  const radius = (gainTimes: number, extraDelay_s: number) =>
    closedLoopPoles(loopOf(plantOf(40 * gainTimes, 0.02, 0.0031 + extraDelay_s), gains)).maxRadius;

  it('gain raised by the gain margin puts a pole on the unit circle', () => {
    expect(radius(10 ** ((found.margins.gainMargin_dB ?? NaN) / 20), 0)).toBeCloseTo(1, 7);
  });

  it('delay raised by the delay margin does too', () => {
    expect(radius(1, (found.margins.delayMargin_ms ?? NaN) / 1000)).toBeCloseTo(1, 7);
  });

  it('a conditionally stable loop is lost at its lower margin as well, and is said to be so', () => {
    const conditional = analyse(loopOf(plantOf(40, 0.03, 0.0005), gainsOf(1000, 1, 60, 0.04)), 0);
    expect(conditional.conditionallyStable).toBe(true);
    expect(conditional.statement).toMatch(/conditionally stable: .* dB less gain loses it too/);
    const less = 10 ** ((conditional.margins.gainReduction_dB ?? NaN) / 20);
    const edge = closedLoopPoles(loopOf(plantOf(40 * less, 0.03, 0.0005), gainsOf(1000, 1, 60, 0.04)));
    expect(edge.maxRadius).toBeCloseTo(1, 7);
  });

  it('a narrow notch where the loop gain crosses 1 is not stepped over: it adds two crossings', () => {
    const bare = analyse(loopOf(plant, gains), 0).margins;
    const centre_Hz = (bare.crossover_Hz ?? NaN) / 2;
    const notched = gainsOf(400, 1.3, 6, 0.014, {
      derivativeLowPass_Hz: 60,
      gyroLowPass_Hz: 100,
      notches: [{ centre_Hz, q: 150 }],
    });
    const count = analyse(loopOf(plant, notched), 0).margins.gainCrossings.length;
    expect(count).toBe(bare.gainCrossings.length + 2);
  });
});

describe('noise and gusts', () => {
  it('covariance and the integral of the spectrum give the same noise at the motors', () => {
    const loop = loopOf(plantOf(40, 0.02, 0.003), gainsOf(500, 1.2, 4, 0.012, { derivativeLowPass_Hz: 70 }));
    const noise = { sigma_dps: 0.2, correlation: 0.3 };
    const exact = noiseAtMotor(loop, noise) ?? NaN;
    // Trapezoids of the same spectrum, uniform and fine: exact for a periodic function.
    const count = 40_000;
    let sum = 0;
    for (let k = 0; k < count; k++) {
      const theta = (Math.PI * (k + 0.5)) / count;
      const L = openLoopAt(loop, theta * 500);
      const back = (1 + L.re) ** 2 + L.im ** 2;
      const C = feedback(theta);
      const colour = (1 - 0.09) / (1 + 0.09 - 0.6 * Math.cos(theta));
      sum += (colour * (C.re ** 2 + C.im ** 2)) / back / count;
    }
    function feedback(theta: number) {
      const z = unit(theta);
      const a = 1 - Math.exp((-2 * Math.PI * 70) / 500);
      const difference = times(complex(0.012 * 500), over({ re: z.re - 1, im: z.im }, z));
      const low = over(times(complex(a), z), { re: z.re - (1 - a), im: z.im });
      const integral = times(complex(4 / 1000), over({ re: z.re + 1, im: z.im }, { re: z.re - 1, im: z.im }));
      const D = times(difference, low);
      return complex(1.2 + integral.re + D.re, integral.im + D.im);
    }
    near(0.2 * Math.sqrt(sum), exact, 1e-4);
  });

  it('a lasting push of a deg/s² turns the craft by a/(K·i) for good (integral term in balance, closed form)', () => {
    const loop = loopOf(plantOf(40, 0.02, 0.002), gainsOf(400, 1.2, 9, 0.01, { derivativeLowPass_Hz: 70 }));
    near(gustResponse(loop, 100, 6).lastingAngle_deg, 100 / (40 * 9), 2e-3);
  });

  it('curves made with an analysis at hand are those made without', () => {
    const loop = loopOf(plantOf(40, 0.02, 0.002), gainsOf(400, 1.2, 9, 0.01));
    const found = analyse(loop, 0.1);
    expect(loopCurves(loop, 0.01, 0.2, found)).toEqual(loopCurves(loop, 0.01));
  });

  it('closed-loop gain at rest is 1 with an integral', () => {
    const loop = rateLoop(plantSystem(plantOf(40, 0.02, 0.002)), gainsOf(400, 1.2, 9, 0.01), 'roll');
    const slow = closedLoopAt(loop, 1e-4);
    near(slow.re, 1, 1e-6);
  });
});
