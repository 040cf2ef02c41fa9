/** Blind order, rating scale, stick activity. */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { flyTrial } from '../../src/trials/runTrial.ts';
import { trialByName } from '../../src/trials/registry.ts';
import {
  blindOrder,
  handActivity,
  handScores,
  RATING_QUESTIONS,
  RATING_WORDS,
  ratingsOpen,
  stickActivity,
} from '../../src/trials/rating.ts';
import { demo } from './demo.ts';

describe('blind order', () => {
  it('flies each set as often as asked, in an order that the seed alone fixes', () => {
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 12 }), fc.nat(), (rounds, seed) => {
        const order = blindOrder(rounds, seed);
        expect(order.filter((set) => set === 'A')).toHaveLength(rounds);
        expect(order).toHaveLength(2 * rounds);
        expect(blindOrder(rounds, seed)).toEqual(order);
      }),
    );
  });

  it('cannot be guessed: over many seeds each set begins about half of the time', () => {
    const first = Array.from({ length: 1000 }, (_, seed) => blindOrder(3, seed)[0]);
    const share = first.filter((set) => set === 'A').length / 1000;
    // Four standard errors of a fair coin.
    expect(Math.abs(share - 0.5)).toBeLessThan(0.064);
  });
});

describe('the Cooper–Harper scale', () => {
  it('each run of answers leads to ratings that together are 1 to 10, each once', () => {
    const ends = [[false], [true, false], [true, true, false], [true, true, true]].map(ratingsOpen);
    expect(ends).toEqual([[10], [7, 8, 9], [4, 5, 6], [1, 2, 3]]);
    expect(ratingsOpen([])).toEqual([1, 2, 3, 4, 5, 6, 7, 8, 9, 10]);
    expect(RATING_QUESTIONS).toHaveLength(3);
    for (let rating = 1; rating <= 10; rating++) expect(RATING_WORDS[rating]).toBeTruthy();
  });
});

describe('stick activity', () => {
  it('of a sine A sin 2πft: A/√2, A 2πf/√2 a second, 2f reversals a second', () => {
    const [amplitude, f_Hz, rate_Hz] = [0.4, 1.5, 1000];
    const stick = Float64Array.from(
      { length: 20 * rate_Hz },
      (_, k) => 0.1 + amplitude * Math.sin((2 * Math.PI * f_Hz * k) / rate_Hz),
    );
    const activity = stickActivity(stick, 1 / rate_Hz);
    expect(activity.rmsDeflection).toBeCloseTo(amplitude / Math.SQRT2, 3);
    expect(activity.rmsSpeed_per_s).toBeCloseTo((amplitude * 2 * Math.PI * f_Hz) / Math.SQRT2, 2);
    expect(activity.reversals_per_s).toBeCloseTo(2 * f_Hz, 1);
  });

  it('a hand that trembles less than a fiftieth of the throw does not count as reversing', () => {
    const stick = Float64Array.from({ length: 2000 }, (_, k) => 0.005 * Math.sin(k));
    expect(stickActivity(stick, 0.01).reversals_per_s).toBe(0);
  });

  it('of nothing is nothing', () => {
    expect(stickActivity([], 0.01)).toEqual({ rmsDeflection: 0, rmsSpeed_per_s: 0, reversals_per_s: 0 });
    expect(stickActivity([0.5], 0.01).rmsDeflection).toBe(0);
  });
});

it('a flight by hand gets scores that trials share', () => {
  const { record } = flyTrial(trialByName('gust-front'), { ...demo('sandpiper'), seed: 1 });
  const scores = handScores(record);
  expect(scores.map((score) => score.name)).toContain('peak tilt');
  for (const score of scores) expect(Number.isFinite(score.value)).toBe(true);
});

describe('a hand', () => {
  it('is as busy as its two sticks together: equal sines give √2 times one, and twice the reversals', () => {
    const sine = Array.from({ length: 2001 }, (_, k) => 0.5 * Math.sin((2 * Math.PI * k) / 100));
    const one = stickActivity(sine, 0.01);
    const both = handActivity(sine, sine, 0.01);
    expect(both.rmsDeflection).toBeCloseTo(Math.SQRT2 * one.rmsDeflection, 12);
    expect(both.rmsSpeed_per_s).toBeCloseTo(Math.SQRT2 * one.rmsSpeed_per_s, 12);
    expect(both.reversals_per_s).toBe(2 * one.reversals_per_s);
    expect(
      handActivity(
        sine,
        sine.map(() => 0),
        0.01,
      ),
    ).toEqual(one);
  });
});
