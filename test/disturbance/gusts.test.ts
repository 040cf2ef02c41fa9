import { describe, expect, test } from 'vitest';
import { parseWind } from '../../src/craft/wind.ts';
import {
  GUST_AIRSPEED,
  GUST_NORTH,
  GUST_TIME,
  GustTrain,
  gustShape,
  gustSpans,
} from '../../src/disturbance/gusts.ts';

const gustsOf = (...gusts: object[]): ReturnType<typeof parseWind> =>
  parseWind({ format: 'gustbench.wind/1', gusts });

/** Southward air of a gust from the north, at each step. */
function course(gust: object, airspeed_mps: number, duration_s: number, step_s: number): number[] {
  const train = new GustTrain(step_s);
  train.setGusts(gustsOf({ from_deg: 0, ...gust }).gusts);
  train.air[GUST_AIRSPEED] = airspeed_mps;
  return Array.from({ length: Math.round(duration_s / step_s) + 1 }, (_, i) => {
    train.air[GUST_TIME] = i * step_s;
    train.advance();
    return -train.air[GUST_NORTH];
  });
}

describe('1 − cosine gusts', () => {
  // MIL-F-8785C discrete gust: V_m/2 (1 − cos πx/d_m); CS 25.341: U_ds/2 (1 − cos πs/H) for 0 ≤ s ≤ 2H.
  test('quarter points of the shape', () => {
    [0, 0.25, 0.5, 0.75, 1, 1.25, 1.5, 1.75, 2].forEach((phase) => {
      expect(gustShape(phase)).toBeCloseTo((1 - Math.cos(Math.PI * phase)) / 2, 15);
    });
    expect(gustShape(0.5)).toBeCloseTo(0.5, 15);
    expect(gustShape(1)).toBe(1);
    expect(gustShape(-0.1)).toBe(0);
    expect(gustShape(2.1)).toBe(0);
  });

  test('by length: quarter values, peak and integral U H at constant airspeed', () => {
    const [peak, length, airspeed, step] = [9, 20, 8, 0.0005];
    const air = course({ start_s: 1, length_m: length, peak_mps: peak }, airspeed, 8, step);
    const at = (distance_m: number): number => air[Math.round((1 + distance_m / airspeed) / step)];
    expect(at(-1)).toBeCloseTo(0, 12);
    expect(at(length / 4)).toBeCloseTo((peak / 2) * (1 - Math.SQRT1_2), 9);
    expect(at(length / 2)).toBeCloseTo(peak / 2, 9);
    expect(at((3 * length) / 4)).toBeCloseTo((peak / 2) * (1 + Math.SQRT1_2), 9);
    expect(at(length)).toBeCloseTo(peak, 9);
    expect(at(1.5 * length)).toBeCloseTo(peak / 2, 9);
    expect(at(2 * length + 0.1)).toBeCloseTo(0, 12);
    const integral_m = air.reduce((sum, value) => sum + value * airspeed * step, 0);
    expect(integral_m).toBeCloseTo(peak * length, 6);
  });

  test('by time, held: rise, hold and fall, whatever the airspeed', () => {
    for (const airspeed of [1, 30]) {
      const air = course({ start_s: 0.5, rise_s: 0.4, hold_s: 1, peak_mps: -3 }, airspeed, 3, 0.001);
      expect(air[500]).toBeCloseTo(0, 12);
      expect(air[700]).toBeCloseTo(-1.5, 9);
      for (const i of [900, 1000, 1500, 1899]) expect(air[i]).toBeCloseTo(-3, 9);
      expect(air[2100]).toBeCloseTo(-1.5, 9);
      expect(air[2301]).toBeCloseTo(0, 9);
      const integral = air.reduce((sum, value) => sum + value * 0.001, 0);
      expect(integral).toBeCloseTo(-3 * 1.4, 6);
    }
  });

  test('a coarse step lands on the same course', () => {
    const gust = { start_s: 0.03, length_m: 5, hold_s: 0.333, peak_mps: 7 };
    const fine = course(gust, 6, 4, 0.0005);
    const coarse = course(gust, 6, 4, 0.05);
    coarse.forEach((value, i) => expect(value).toBeCloseTo(fine[i * 100], 9));
  });

  test('gusts add', () => {
    const train = new GustTrain(0.01);
    const one = { start_s: 0, rise_s: 0.1, hold_s: 9, peak_mps: 2, from_deg: 0 };
    train.setGusts(gustsOf(one, { ...one, peak_mps: 5 }).gusts);
    for (let i = 0; i < 50; i++) {
      train.air[GUST_TIME] = i * 0.01;
      train.advance();
    }
    expect(train.air[GUST_NORTH]).toBeCloseTo(-7, 12);
  });

  test('spans for the tape: start to end of each', () => {
    const wind = gustsOf(
      { start_s: 2, length_m: 12, peak_mps: 4, from_deg: 0 },
      { start_s: 5, rise_s: 0.5, hold_s: 2, peak_mps: 4, from_deg: 0 },
    );
    expect(gustSpans(wind, 6)).toEqual([
      [2, 6],
      [5, 8],
    ]);
    // At rest the floor of 1 m/s holds.
    expect(gustSpans(wind, 0)[0]).toEqual([2, 26]);
  });
});
