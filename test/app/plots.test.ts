import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import {
  cellCentre,
  contourLines,
  createMapGrid,
  filledIn,
  setMapCell,
} from '../../src/app/plots/mapGrid.ts';
import {
  createRing,
  firstRowAfter,
  newestTime_s,
  oldestTime_s,
  pushRow,
  truncateRing,
} from '../../src/app/plots/ring.ts';
import { shareOf, ticksOf, valueAt } from '../../src/app/plots/scale.ts';

describe('the ring', () => {
  test('finds rows by time as a plain search over what is still kept', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: 1, max: 40 }),
        fc.array(fc.integer({ min: 0, max: 3 }), { minLength: 1, maxLength: 100 }),
        fc.integer({ min: -1, max: 300 }),
        (capacity, steps, wanted) => {
          const ring = createRing(1, capacity);
          const times: number[] = [];
          let t = 0;
          for (const step of steps) {
            t += step;
            times.push(t);
            pushRow(ring, t, [t]);
          }
          const oldest = Math.max(0, times.length - capacity);
          const plain = times.findIndex((time, row) => row >= oldest && time > wanted);
          expect(firstRowAfter(ring, wanted)).toBe(plain === -1 ? times.length : plain);
          expect(newestTime_s(ring)).toBe(times.at(-1));
          expect(oldestTime_s(ring)).toBe(times[oldest]);
        },
      ),
    );
  });

  test('rewound, goes on from the row before', () => {
    const ring = createRing(2, 8);
    for (let n = 0; n < 12; n++) pushRow(ring, n, [n, -n]);
    truncateRing(ring, 7);
    expect([newestTime_s(ring), ring.written, ring.epoch]).toEqual([7, 8, 1]);
    pushRow(ring, 7.5, [99, 98]);
    expect(ring.channels[0][8 % 8]).toBe(99);
    truncateRing(ring, -Infinity);
    expect(newestTime_s(ring)).toBeNull();
  });
});

describe('scales', () => {
  test('value and share are inverse, linear and logarithmic', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 1e-3, max: 1e3, noNaN: true }),
        fc.double({ min: 1.1, max: 1e4, noNaN: true }),
        fc.double({ min: 0, max: 1, noNaN: true }),
        fc.boolean(),
        (low, ratio, share, log) => {
          const range = { low, high: low * ratio, log };
          expect(shareOf(range, valueAt(range, share))).toBeCloseTo(share, 9);
        },
      ),
    );
  });

  test.each([
    [{ low: 0, high: 1 }, 5, [0, 0.2, 0.4, 0.6, 0.8, 1]],
    [{ low: -35, high: 42 }, 4, [-20, 0, 20, 40]],
    [{ low: 0.1, high: 100, log: true }, 5, [0.1, 0.2, 0.5, 1, 2, 5, 10, 20, 50, 100]],
    [{ low: 0.1, high: 10_000, log: true }, 5, [0.1, 1, 10, 100, 1000, 10_000]],
  ])('ticks of %j are round', (range, wanted, ticks) => expect(ticksOf(range, wanted)).toEqual(ticks));
});

describe('the map', () => {
  test('fine cells take the place of coarse ones, in whatever order they come', () => {
    for (const order of [0, 1]) {
      const grid = createMapGrid(4, 4);
      const writes = [() => setMapCell(grid, 1, 1, 5, false, 1), () => setMapCell(grid, 0, 0, 2, false, 4)];
      if (order === 1) writes.reverse();
      for (const write of writes) write();
      const { values, known } = filledIn(grid);
      expect(values[1 * 4 + 1]).toBe(5);
      expect([...values].filter((value) => value === 2)).toHaveLength(15);
      expect([...known].every((k) => k === 1)).toBe(true);
    }
  });

  test('an unstable cell has no value and is known as such', () => {
    const grid = createMapGrid(2, 1);
    setMapCell(grid, 0, 0, 3, true, 1);
    const { values, known } = filledIn(grid);
    expect([values[0], known[0], known[1]]).toEqual([NaN, 2, 0]);
  });

  test('the contour of a distance is the circle', () => {
    const n = 40;
    const values = Float64Array.from({ length: n * n }, (_, i) =>
      Math.hypot((i % n) + 0.5 - n / 2, Math.floor(i / n) + 0.5 - n / 2),
    );
    const lines = contourLines(values, n, n, 12);
    expect(lines).toHaveLength(1);
    const [line] = lines;
    expect(line[0]).toEqual(line[line.length - 1]);
    for (const [x, y] of line) expect(Math.abs(Math.hypot(x - n / 2, y - n / 2) - 12)).toBeLessThan(0.05);
    let length = 0;
    for (let i = 1; i < line.length; i++) {
      length += Math.hypot(line[i][0] - line[i - 1][0], line[i][1] - line[i - 1][1]);
    }
    expect(length / (2 * Math.PI * 12)).toBeCloseTo(1, 2);
  });

  test('the contour of a plane is straight and ends at unknown cells', () => {
    const values = Float64Array.from({ length: 100 }, (_, i) => i % 10);
    values[5 * 10 + 4] = NaN;
    const lines = contourLines(values, 10, 10, 4.25);
    expect(lines).toHaveLength(2);
    for (const line of lines) for (const [x] of line) expect(x).toBeCloseTo(4.75, 12);
  });

  test('cells of a logarithmic axis are centred by logarithm', () => {
    expect(cellCentre({ low: 1, high: 100, log: true }, 0, 1)).toBeCloseTo(10, 9);
    expect(cellCentre({ low: 0, high: 10 }, 4, 5)).toBeCloseTo(9, 12);
  });
});
