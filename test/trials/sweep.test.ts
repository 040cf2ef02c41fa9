/** Sweeps: paths, order, going on after a stop, the map and its trade-off front. */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { InputError } from '../../src/craft/problem.ts';
import { numberPaths, resolve, valueAt } from '../../src/trials/overrides.ts';
import { inPlaceWorker } from '../../src/trials/pool.ts';
import { answerTask } from '../../src/trials/protocol.ts';
import { trialByName } from '../../src/trials/registry.ts';
import { runTrial } from '../../src/trials/runTrial.ts';
import {
  axisValue,
  cellsInOrder,
  cellTask,
  derivativeMap,
  parseSweep,
  tradeOffFront,
} from '../../src/trials/sweep.ts';
import { mapOf, runSweep, SweepCells } from '../../src/trials/sweepResult.ts';
import { demo } from './demo.ts';

const subject = demo('sandpiper');
const gustTrial = trialByName('gust-front');
const small = {
  format: 'gustbench.sweep/1',
  trial: 'rate-step-roll-large',
  x: { path: 'gains.axes.roll.p_us_per_dps', from: 0.4, to: 2.4, count: 3 },
  y: { path: 'build.airframe.inertia_kgm2.xx', from: 0.012, to: 0.02, count: 2 },
};

function problemOf(run: () => unknown) {
  try {
    run();
  } catch (error) {
    if (error instanceof InputError) return error.problems[0];
    throw error;
  }
  throw new Error('nothing was refused');
}

describe('fields by path', () => {
  it('every suggested path leads to a number', () => {
    const paths = numberPaths(gustTrial, subject);
    expect(paths).toContain('gains.axes.roll.d_us_per_dps2');
    expect(paths).toContain('build.airframe.inertia_kgm2.xx');
    expect(paths).toContain('wind.gusts[0].peak_mps');
    expect(paths).toContain('trial.rise_s');
    for (const path of paths) expect(Number.isFinite(valueAt(gustTrial, subject, path)), path).toBe(true);
  });

  it.each([
    ['gains.axes.roll.d_us_per_dps2', subject.gains.axes.roll.d_us_per_dps2],
    ['build.rotors[1].position_m[0]', subject.build.rotors[1].position_m[0]],
    ['build.airframe.mass_kg', subject.build.airframe.mass_kg],
    ['wind.mean_mps', 0],
    ['wind.gusts[0].peak_mps', 6],
    ['trial.peak_mps', 6],
    // Left out in the file, known to the schema.
    ['gains.integratorReset_throttle', NaN],
  ])('%s is found', (path, value) => expect(valueAt(gustTrial, subject, path)).toEqual(value));

  it.each([
    ['gains.axes.roll.d_us', /p_us_per_dps/],
    ['gains.axis.roll.d_us_per_dps2', /loop_Hz/],
    ['build.rotors[4].position_m[0]', /0, 1, 2, 3/],
    ['build.airframe', /mass_kg/],
    ['build.name', /not of a text/],
    ['build.__proto__.x', /known at this place/],
    ['wind.gusts[1].peak_mps', /known at this place: 0/],
    ['trial.no', /peak_mps, rise_s/],
    ['mass_kg', /begins with build\., gains\., wind\. or trial\./],
    ['', /begins with/],
  ])('%s is refused and says what there is', (path, allowed) => {
    const { path: field, allowed: text } = problemOf(() => resolve(gustTrial, subject, { [path]: 1 }));
    expect(field).toBe('path');
    expect(text).toMatch(allowed);
  });

  it('a value that is not allowed is refused by its path', () => {
    const problem = problemOf(() => resolve(gustTrial, subject, { 'build.airframe.mass_kg': -1 }));
    expect(problem).toMatchObject({ path: 'build.airframe.mass_kg', value: '-1' });
    expect(problemOf(() => resolve(gustTrial, subject, { 'trial.peak_mps': 99 })).path).toBe(
      'trial.peak_mps',
    );
  });

  it('numbers that only fit together are checked together, and the files given stay as they were', () => {
    const before = JSON.stringify(subject);
    const { build, wind } = resolve(gustTrial, subject, {
      'build.esc.min_us': 100,
      'build.esc.idle_us': 110,
      'build.esc.max_us': 190,
      'build.esc.resolution_us': 0.1,
      'wind.mean_mps': 3,
    });
    expect(build.esc).toMatchObject({ min_us: 100, idle_us: 110, max_us: 190 });
    // The trial's own wind is the base: its gust stays.
    expect(wind.gusts).toHaveLength(1);
    expect(wind.mean_mps).toBe(3);
    expect(JSON.stringify(subject)).toBe(before);
  });

  it('a changed field changes the flight', () => {
    const value = (overrides: Record<string, number>) =>
      runTrial({ ...subject, trial: 'gust-front', seed: 1, overrides }).scores[0].value;
    expect(value({ 'trial.peak_mps': 9 })).toBeGreaterThan(value({}) ?? Infinity);
    expect(value({ 'gains.axes.pitch.p_us_per_dps': 0.3 })).not.toBe(value({}));
  });
});

describe('sweep files', () => {
  it.each([
    [{ ...small, x: { ...small.x, path: 'gains.axes.roll.p' } }, 'path', /p_us_per_dps/],
    [
      { ...small, x: { ...small.x, count: 1000 }, y: { ...small.y, count: 1000 } },
      'x.count',
      /at most 40000 cells/,
    ],
    [{ ...small, x: { ...small.x, count: 2.5 } }, 'x.count', /whole number/],
    [{ ...small, trial: 'gust' }, 'trial', /gust-front/],
    [{ ...small, x: { ...small.x, from: 0, logarithmic: true } }, 'x.from', /above 0/],
    [{ ...small, x: { ...small.x, to: 0.4 } }, 'x.to', /another value/],
    [{ ...small, y: small.x }, 'y.path', /each path once/],
    [{ ...small, z: 1 }, 'z', /no field of this name/],
    [{ ...small, bands: { tilt: { most: 1 } } }, 'bands.rate-step-roll-large.tilt', /one of rise/],
    [[], '', /a sweep object/],
  ])('%# is refused by field', (raw, path, allowed) => {
    const problem = problemOf(() => parseSweep(raw, subject));
    expect(problem.path).toBe(path);
    expect(problem.allowed).toMatch(allowed);
  });

  it('cells come coarse to fine, each once', () => {
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 40 }), fc.integer({ min: 1, max: 40 }), (columns, rows) => {
        const cells = cellsInOrder(columns, rows);
        expect(new Set(cells.map(({ column, row }) => row * columns + column)).size).toBe(columns * rows);
        for (let k = 1; k < cells.length; k++) expect(cells[k].block).toBeLessThanOrEqual(cells[k - 1].block);
      }),
    );
    expect(cellsInOrder(24, 24).filter(({ block }) => block === 8)).toHaveLength(9);
  });

  it('a logarithmic axis has equal ratios and keeps its ends', () => {
    const axis = { path: 'x', also: [], from: 10, to: 160, count: 5, logarithmic: true };
    expect([0, 1, 2, 3, 4].map((k) => axisValue(axis, k))).toEqual([10, 20, 40, 80, 160]);
  });
});

describe('a sweep that is stopped', () => {
  const sweep = parseSweep(small, subject);
  const whole = new SweepCells(sweep, subject);

  it('goes on from what was written down, to the same bytes', async () => {
    expect((await runSweep(whole, inPlaceWorker, 2).done).end).toBe('finished');
    const first = new SweepCells(sweep, subject);
    const stopped = runSweep(first, inPlaceWorker, 1, {
      cell: () => {
        if (first.done === 2) stopped.cancel();
      },
    });
    expect((await stopped.done).end).toBe('cancelled');
    const second = SweepCells.parse(JSON.parse(JSON.stringify(first)));
    expect(second.done).toBe(2);
    expect(second.sameAs(whole)).toBe(true);
    const flown: number[] = [];
    await runSweep(second, inPlaceWorker, 2, { cell: ({ column, row }) => flown.push(row * 3 + column) })
      .done;
    expect(flown).toHaveLength(4);
    expect(JSON.stringify(second)).toBe(JSON.stringify(whole));
  });

  it('a cell is what its task flies alone', () => {
    const result = runTrial(cellTask(sweep, subject, { column: 1, row: 1 }));
    expect(whole.at(1, 1)?.values).toEqual(result.scores.map((score) => score.value));
  });

  it('a cell that the program failed at is not kept, one that cannot be is', () => {
    const kept = new SweepCells(sweep, subject);
    kept.take({ column: 0, row: 0 }, { id: 0, kind: 'failed', reason: 'the worker died' });
    expect(kept.remaining()).toHaveLength(6);
    const bad = { ...sweep, y: { ...small.y, also: [], logarithmic: false, from: -1 } };
    const answer = answerTask({ id: 0, task: cellTask(bad, subject, { column: 0, row: 0 }) });
    const cell = kept.take({ column: 0, row: 0 }, answer);
    expect(cell.reason).toMatch(/inertia/);
    expect(kept.remaining()).toHaveLength(5);
    expect(mapOf(kept).unstable[0]).toBe(1);
  });

  it('cells of a damaged or foreign file are refused or left out', () => {
    const raw = JSON.parse(JSON.stringify(whole)) as {
      cells: { column: number }[];
      sweep: { x: { path: string } };
    };
    expect(problemOf(() => SweepCells.parse({ ...raw, cells: 'none' })).path).toBe('cells');
    raw.cells[0].column = 99;
    expect(SweepCells.parse(raw).done).toBe(5);
    raw.sweep.x.path = 'gains.nothing';
    expect(problemOf(() => SweepCells.parse(raw)).path).toBe('path');
  });
});

describe('maps', () => {
  it('no point of the trade-off front is beaten in both, every other point is', () => {
    const value = fc.oneof(fc.integer({ min: 0, max: 12 }), fc.constant(NaN));
    fc.assert(
      fc.property(fc.array(fc.tuple(value, value), { maxLength: 40 }), (points) => {
        const [a, b] = [points.map(([one]) => one), points.map(([, other]) => other)];
        const front = tradeOffFront(a, b);
        const usable = points.map((_, i) => i).filter((i) => Number.isFinite(a[i] + b[i]));
        const beaten = (i: number, j: number) => a[j] <= a[i] && b[j] <= b[i] && (a[j] < a[i] || b[j] < b[i]);
        for (const i of front) expect(usable.some((j) => beaten(i, j))).toBe(false);
        for (const i of usable) {
          const covered = front.some((j) => j === i || beaten(i, j) || (a[j] === a[i] && b[j] === b[i]));
          expect(covered).toBe(true);
        }
      }),
    );
  });

  it('more derivative gain: less gust excursion, more motor activity; a lower cutoff: less activity', async () => {
    const sweep = derivativeMap(subject, 3);
    const kept = new SweepCells(sweep, subject);
    await runSweep(kept, inPlaceWorker, 1).done;
    const map = mapOf(kept);
    const [excursion, activity] = map.layers;
    expect([excursion.name, activity.name]).toEqual(['gust excursion', 'motor activity']);
    for (let row = 0; row < 3; row++) {
      const at = (column: number) => row * 3 + column;
      expect(activity.values[at(2)]).toBeGreaterThan(activity.values[at(0)]);
      expect(excursion.values[at(2)]).toBeLessThan(excursion.values[at(0)]);
    }
    expect(activity.values[2]).toBeLessThan(activity.values[8]);
    expect(map.front.length).toBeGreaterThan(1);
    expect(Array.from(map.acceptable)).toContain(1);
  });
});
