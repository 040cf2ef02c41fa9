// @vitest-environment happy-dom
/** The cells of a sweep over a reload: written as they come, said when they cannot be; sheets that hold junk. */
import 'fake-indexeddb/auto';
import { IDBFactory, IDBObjectStore } from 'fake-indexeddb';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { keptOf } from '../../src/app/places/prove/kept.ts';
import { SweepKeeper, type KeepTrouble } from '../../src/app/places/prove/sweepKeeper.ts';
import { cellAt, curvesOf, plotAxis, pointOf } from '../../src/app/places/prove/sweepView.ts';
import { parseSweep } from '../../src/trials/sweep.ts';
import { mapOf, SweepCells, type CellResult } from '../../src/trials/sweepResult.ts';
import { demo } from '../trials/demo.ts';

const subject = demo('sandpiper');
const sweep = parseSweep(
  {
    format: 'gustbench.sweep/1',
    trial: 'gust-front',
    x: { path: 'gains.axes.roll.p_us_per_dps', from: 1, to: 4, count: 4 },
    y: { path: 'build.airframe.mass_kg', from: 0.5, to: 2, count: 3, logarithmic: true },
  },
  subject,
);
const cell = (column: number, row: number, pass = true): CellResult => ({
  column,
  row,
  values: [column, row, 0, 0, 0],
  pass,
  reason: null,
});

function keeper() {
  const troubles: (KeepTrouble | null)[] = [];
  return { keeper: new SweepKeeper((trouble) => troubles.push(trouble)), troubles };
}

beforeEach(() => {
  globalThis.indexedDB = new IDBFactory();
});

describe('kept cells', () => {
  it('are there for the next page, with the sweep and what it is of', async () => {
    const first = keeper();
    await first.keeper.begin('craft', new SweepCells(sweep, subject));
    first.keeper.add(cell(0, 0));
    first.keeper.add(cell(3, 2, false));
    await first.keeper.flush();
    const found = await keeper().keeper.load('craft');
    expect(found?.done).toBe(2);
    expect(found?.at(3, 2)).toEqual(cell(3, 2, false));
    expect(found?.sameAs(new SweepCells(sweep, subject))).toBe(true);
    expect(found?.remaining()).toHaveLength(10);
    expect(await keeper().keeper.load('another craft')).toBeNull();
  });

  it('go on being written after a reload, and give way to the next sweep of the craft', async () => {
    const first = keeper();
    await first.keeper.begin('craft', new SweepCells(sweep, subject));
    first.keeper.add(cell(0, 0));
    await first.keeper.flush();
    const second = keeper();
    await second.keeper.load('craft');
    second.keeper.add(cell(1, 1));
    await second.keeper.flush();
    expect((await keeper().keeper.load('craft'))?.done).toBe(2);
    await second.keeper.begin('craft', new SweepCells({ ...sweep, seed: 5 }, subject));
    const third = await keeper().keeper.load('craft');
    expect(third?.done).toBe(0);
    expect(third?.sweep.seed).toBe(5);
  });

  it('are not mixed when another window began a sweep of the craft: this one says so', async () => {
    const one = keeper();
    await one.keeper.begin('craft', new SweepCells(sweep, subject));
    await keeper().keeper.begin('craft', new SweepCells({ ...sweep, seed: 9 }, subject));
    one.keeper.add(cell(2, 1));
    await one.keeper.flush();
    expect(one.troubles).toEqual([{ kind: 'other-window' }]);
    expect((await keeper().keeper.load('craft'))?.done).toBe(0);
  });
});

describe('a storage that is full', () => {
  const { put } = IDBObjectStore.prototype;
  afterEach(() => {
    IDBObjectStore.prototype.put = put;
  });

  it('is said plainly; what waits is written once there is room again', async () => {
    const one = keeper();
    await one.keeper.begin('craft', new SweepCells(sweep, subject));
    IDBObjectStore.prototype.put = () => {
      throw new DOMException('no room', 'QuotaExceededError');
    };
    one.keeper.add(cell(0, 0));
    await one.keeper.flush();
    expect(one.troubles).toEqual([{ kind: 'full' }]);
    IDBObjectStore.prototype.put = put;
    one.keeper.add(cell(1, 0));
    await one.keeper.flush();
    expect(one.troubles.at(-1)).toBeNull();
    expect((await keeper().keeper.load('craft'))?.done).toBe(2);
  });
});

describe('a map', () => {
  const cells = new SweepCells(sweep, subject);

  it('shows each cell where its values are, linear and logarithmic', () => {
    for (let row = 0; row < 3; row++) {
      for (let column = 0; column < 4; column++) {
        expect(cellAt(cells, pointOf(cells, { column, row }))).toEqual({ column, row });
      }
    }
    expect(plotAxis(sweep.x)).toMatchObject({ low: 0.5, high: 4.5 });
    expect(plotAxis(sweep.x).unit).toBe('µs/(deg/s)');
    const { low, high } = plotAxis(sweep.y ?? sweep.x);
    expect(low).toBeCloseTo(0.5 / Math.SQRT2, 12);
    expect(high).toBeCloseTo(2 * Math.SQRT2, 12);
  });

  it('outlines what passes with a closed line, and draws the front from left to right', () => {
    const full = new SweepCells(sweep, subject);
    for (let row = 0; row < 3; row++) {
      for (let column = 0; column < 4; column++) {
        const values = [4 - column, column, 0, 0, 0];
        const scores = values.map((value, i) => ({ name: String(i), value }) as never);
        full.take(
          { column, row },
          { id: 0, kind: 'done', result: { scores, pass: column < 2, stopped: null } as never },
        );
      }
    }
    const [outline, front] = curvesOf(full, mapOf(full));
    const last = outline.x.length - 1;
    expect([outline.x[0], outline.y[0]]).toEqual([outline.x[last], outline.y[last]]);
    // Columns 0 and 1 pass: the line runs from the left edge to half way between columns 1 and 2.
    expect(Math.min(...Array.from(outline.x))).toBeCloseTo(0.5, 9);
    expect(Math.max(...Array.from(outline.x))).toBeCloseTo(2.5, 9);
    expect(Array.from(front.x)).toEqual([1, 2, 3, 4]);
  });
});

describe('a sheet of Prove', () => {
  it.each([undefined, null, 5, 'text', [], { a: 5, b: null, bands: 'x', spread: 1, sessions: {} }])(
    '%j becomes an empty one',
    (raw) => {
      const kept = keptOf(raw);
      expect(kept.of).toBeNull();
      expect(kept.a).toEqual({});
      expect(kept.bands).toEqual({});
      expect(kept.sessions).toEqual([]);
      expect(kept.spread.samples).toBe(60);
    },
  );

  it('keeps its good parts beside a bad one, and drops results that say not what they were of', () => {
    const kept = keptOf({
      notes: 'calm day',
      seed: -3,
      bands: { 'gust-front': { 'peak tilt': { most: 4 } } },
      a: { 'gust-front': { trial: 'gust-front', scores: [] } },
    });
    expect(kept).toMatchObject({ notes: 'calm day', seed: 1, a: {} });
    expect(kept.bands).toEqual({ 'gust-front': { 'peak tilt': { most: 4 } } });
  });
});
