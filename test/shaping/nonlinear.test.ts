import { describe, expect, it } from 'vitest';
import { analyse } from '../../src/shaping/analysis.ts';
import { axisModels } from '../../src/shaping/axisModel.ts';
import { rateLoop } from '../../src/shaping/rateLoop.ts';
import { regionGains, stableRegion } from '../../src/shaping/stableRegion.ts';
import { sweepMeasure } from '../../src/shaping/sweepCheck.ts';
import { walkAdvice, walkCandidates, walkResponse } from '../../src/shaping/walk.ts';
import { demoBuild, demoGains } from '../physics/builds.ts';

describe('linear model against the nonlinear flight', () => {
  it.each(['roll', 'pitch'] as const)(
    '%s: a multisine through the full flight agrees within 0.5 dB and 3° up to crossover where coherent',
    (axis) => {
      const check = sweepMeasure(demoBuild('sandpiper'), demoGains('sandpiper'), axis);
      expect(check.crossover_Hz).not.toBeNull();
      let compared = 0;
      check.f_Hz.forEach((f, i) => {
        if (f > (check.crossover_Hz ?? 0) || f < 0.8 || check.coherence[i] < 0.9) return;
        compared++;
        expect(Math.abs(check.difference_dB[i]), `${f.toFixed(2)} Hz, dB`).toBeLessThan(0.5);
        expect(Math.abs(check.difference_deg[i]), `${f.toFixed(2)} Hz, deg`).toBeLessThan(3);
      });
      expect(compared).toBeGreaterThan(3);
    },
  );
});

describe('the way by hand: P, then I, then D', () => {
  it('offers more of each, and says what the response shows', () => {
    const gains = demoGains('sandpiper');
    for (const stage of ['p', 'i', 'd'] as const) {
      const candidates = walkCandidates(stage, gains, 'roll');
      expect(candidates.length).toBeGreaterThan(1);
      const advice = walkAdvice(stage, walkResponse(demoBuild('sandpiper'), gains, 'roll'));
      expect(advice.length).toBeGreaterThan(10);
    }
  });
});

describe('map of two gains', () => {
  it('sets the two gains of its kind and nothing else', () => {
    const gains = demoGains('sandpiper');
    const changed = regionGains({ kind: 'p-d', axis: 'roll', gains }, 2, 0.01);
    expect(changed.axes.roll).toMatchObject({
      p_us_per_dps: 2,
      d_us_per_dps2: 0.01,
      i_us_per_deg: gains.axes.roll.i_us_per_deg,
    });
    expect(changed.axes.pitch).toEqual(gains.axes.pitch);
  });

  it('agrees cell by cell with the analysis of the loop at that place', () => {
    const gains = demoGains('sandpiper');
    const system = axisModels(demoBuild('sandpiper')).roll.measured;
    const xs = Float64Array.from([0.7, 1.4, 6, 20]);
    const ys = Float64Array.from([0, 0.015, 0.05, 0.4]);
    const task = {
      kind: 'p-d' as const,
      axis: 'roll' as const,
      system,
      gains,
      noise_dps_per_rtHz: 0.008,
      gyroBandwidth_Hz: 98,
      xs,
      ys,
    };
    const steps = stableRegion(task);
    let step = steps.next();
    while (step.done !== true) step = steps.next();
    const region = step.value;
    for (let row = 0; row < 4; row++) {
      for (let column = 0; column < 4; column++) {
        const alone = analyse(rateLoop(system, regionGains(task, xs[column], ys[row]), 'roll'), 0.1);
        const place = row * 4 + column;
        expect(region.stable[place]).toBe(alone.stable ? 1 : 0);
        if (alone.stable)
          expect(Math.abs(region.maxSensitivity[place] / alone.margins.maxSensitivity - 1)).toBeLessThan(
            0.02,
          );
      }
    }
    expect(region.stable).toContain(0);
    expect(region.stable).toContain(1);
  });
});
