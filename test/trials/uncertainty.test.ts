/** Spread over an uncertain build: intervals, ranks, the hypercube, the worst case. */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { resolve } from '../../src/trials/overrides.ts';
import { answerTask } from '../../src/trials/protocol.ts';
import { trialByName } from '../../src/trials/registry.ts';
import { runTrial } from '../../src/trials/runTrial.ts';
import {
  bandUse,
  hardestUse,
  latinHypercube,
  SPREADS,
  spreadTasks,
  summariseSpread,
  whatMatters,
  wilsonInterval,
} from '../../src/trials/uncertainty.ts';
import { demo } from './demo.ts';

describe('Wilson’s interval', () => {
  // Newcombe 1998, Two-sided confidence intervals for the single proportion (Statistics in Medicine 17),
  // score method without continuity correction; value from memory.
  it.each([
    [81, 263, 0.2553, 0.3662],
    [15, 148, 0.0624, 0.1605],
    [0, 20, 0, 0.1611],
    [1, 29, 0.0061, 0.1718],
  ])('%i of %i: %f to %f', (hits, count, low, high) => {
    const interval = wilsonInterval(hits, count);
    expect(interval.low).toBeCloseTo(low, 4);
    expect(interval.high).toBeCloseTo(high, 4);
  });

  it('its ends solve (p̂ − p)² = z² p (1 − p)/n, and hold the share', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: 1, max: 5000 }),
        fc.double({ min: 0, max: 1, noNaN: true }),
        (count, part) => {
          const hits = Math.round(part * count);
          const { share, low, high } = wilsonInterval(hits, count, 1.96);
          expect(low).toBeLessThanOrEqual(share);
          expect(high).toBeGreaterThanOrEqual(share);
          for (const p of [low, high]) {
            expect((share - p) ** 2 - (1.96 ** 2 * p * (1 - p)) / count).toBeCloseTo(0, 9);
          }
        },
      ),
    );
  });

  it('of no samples says nothing', () => expect(wilsonInterval(0, 0)).toEqual({ share: 0, low: 0, high: 1 }));
});

describe('the hypercube', () => {
  it('draws each of the equal slices of each distribution once', () => {
    const count = 64;
    for (const [i, factors] of latinHypercube(SPREADS, count, 5).entries()) {
      const { share, shape, name } = SPREADS[i];
      if (shape !== 'uniform') continue;
      const low = name === 'voltage' ? 1 - share : 1 - share;
      const width = name === 'voltage' ? share : 2 * share;
      const slices = Array.from(factors, (f) => Math.floor(((f - low) / width) * count - 1e-9));
      expect([...slices].sort((a, b) => a - b)).toEqual(Array.from({ length: count }, (_, k) => k));
    }
  });

  it('normal factors have mean 1 and the stated spread', () => {
    const factors = latinHypercube(SPREADS, 2000, 3);
    SPREADS.forEach(({ shape, share }, i) => {
      if (shape !== 'normal') return;
      const mean = factors[i].reduce((sum, f) => sum + f, 0) / 2000;
      const sd = Math.sqrt(factors[i].reduce((sum, f) => sum + (f - mean) ** 2, 0) / 2000);
      expect(mean).toBeCloseTo(1, 3);
      expect(sd / share).toBeCloseTo(1, 1);
    });
  });

  it('is fixed by its seed, and each parameter by its own stream', () => {
    expect(latinHypercube(SPREADS, 20, 1)).toEqual(latinHypercube(SPREADS, 20, 1));
    expect(latinHypercube(SPREADS, 20, 1)).not.toEqual(latinHypercube(SPREADS, 20, 2));
    expect(latinHypercube(SPREADS.slice(2), 20, 1)).toEqual(latinHypercube(SPREADS, 20, 1).slice(2));
  });

  it('every sample of the demo crafts is a build that can be flown', () => {
    for (const name of ['sandpiper', 'wren'] as const) {
      const subject = demo(name);
      const factors = latinHypercube(SPREADS, 50, 1);
      for (const task of spreadTasks('hover-noise', subject, SPREADS, factors, 1)) {
        expect(() => resolve(trialByName(task.trial), subject, task.overrides)).not.toThrow();
      }
    }
  });
});

describe('what matters', () => {
  it('is Spearman’s 1 − 6 Σd²/(n(n²−1)) without ties, the largest first', () => {
    const ranks = [3, 1, 4, 2, 5];
    const factors = [Float64Array.from([1, 2, 3, 4, 5]), Float64Array.from([0.2, 0.1, 0.8, 0.15, 0.9])];
    const values = ranks.map((rank) => Math.exp(rank));
    const [first, second] = whatMatters(SPREADS.slice(0, 2), factors, values);
    const d2 = ranks.reduce((sum, rank, i) => sum + (rank - (i + 1)) ** 2, 0);
    expect(first).toEqual({ name: SPREADS[1].name, correlation: expect.closeTo(1, 9) as number });
    expect(second.correlation).toBeCloseTo(1 - (6 * d2) / (5 * 24), 9);
  });

  it('is nothing where nothing varied', () => {
    expect(whatMatters(SPREADS.slice(0, 1), [Float64Array.from([1, 2, 3])], [7, 7, 7])[0].correlation).toBe(
      0,
    );
  });
});

describe('use of a band', () => {
  it.each([
    [5, { most: 10 }, 0.5],
    [12, { most: 10 }, 1.2],
    [3, { least: 6 }, 2],
    [3, { least: 1, most: 4 }, 0.75],
    [null, { most: 10 }, Infinity],
    [5, {}, null],
  ])('%s in %o is %s', (value, band, use) => expect(bandUse(value, band)).toBe(use));
});

describe('a spread that was flown', () => {
  const subject = demo('sandpiper');
  const factors = latinHypercube(SPREADS, 12, 4);
  const tasks = spreadTasks('rate-step-roll-small', subject, SPREADS, factors, 9);
  const answers = tasks.map((task, id) => answerTask({ id, task }));
  const summary = summariseSpread(tasks, SPREADS, factors, answers);

  it('counts what was flown', () => {
    expect(summary.flown).toBe(12);
    expect(summary.lost).toBe(0);
    expect(summary.failures.low).toBeLessThanOrEqual(summary.failures.share);
    expect(summary.matters).toHaveLength(SPREADS.length);
  });

  it('its worst sample, flown again from seed and overrides, gives the same bytes', () => {
    const worst = summary.worst;
    if (worst === null) throw new Error('no worst sample');
    const again = runTrial({
      ...subject,
      trial: summary.trial,
      seed: worst.seed,
      overrides: worst.overrides,
    });
    expect(JSON.stringify(again)).toBe(JSON.stringify(worst.result));
    for (const answer of answers) {
      if (answer.kind === 'done') expect(hardestUse(answer.result)).toBeLessThanOrEqual(hardestUse(again));
    }
  });

  it('a heavier, weaker craft is flown as such: the samples differ', () => {
    const values = answers.map((answer) => (answer.kind === 'done' ? answer.result.scores[0].value : null));
    expect(new Set(values).size).toBe(12);
  });

  it('samples that could not be flown are told, not counted as failures', () => {
    const some = [...answers.slice(0, 10), { id: 10, kind: 'failed', reason: 'x' } as const, undefined];
    const partial = summariseSpread(tasks, SPREADS, factors, some);
    expect(partial.flown).toBe(10);
    expect(partial.lost).toBe(1);
  });
});
