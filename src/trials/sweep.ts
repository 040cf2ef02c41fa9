/**
 * Sweeps: one trial over one or two numbers of build, gains, wind or the trial itself, coarse to fine. A cell is
 * fixed by its place alone, so any order on any number of workers gives the same results.
 */
import { z } from 'zod';
import { formatTag, parseWith, quantity, title } from '../craft/fields.ts';
import { refuse } from '../craft/problem.ts';
import { bandsSchema, checkBands, overridesSchema } from './bands.ts';
import { resolve, valueAt, type Overrides, type Subject } from './overrides.ts';
import { trialByName } from './registry.ts';
import type { TrialTask } from './runTrial.ts';

export type { Subject } from './overrides.ts';

export const SWEEP_FORMAT = 'gustbench.sweep/1';
/** More would take days and fill the memory of a page. */
export const MOST_CELLS = 40_000;
const COUNT = 'a whole number from 1 to 400';
const PATH = 'a path of 1 to 200 characters, such as gains.axes.roll.d_us_per_dps2';

const path = z.string({ error: PATH }).min(1, { error: PATH }).max(200, { error: PATH });
const axisSchema = z.strictObject(
  {
    path,
    /** Further fields that take the same value (roll and pitch together). */
    also: z.array(path, { error: 'a list of paths' }).max(8, { error: 'at most 8 paths' }).default([]),
    from: quantity(-1e9, 1e9, ''),
    to: quantity(-1e9, 1e9, ''),
    count: z.int({ error: COUNT }).min(1, { error: COUNT }).max(400, { error: COUNT }),
    logarithmic: z.boolean({ error: 'true or false' }).default(false),
  },
  { error: 'an object with path, from, to, count' },
);

export const sweepSchema = z.strictObject(
  {
    format: formatTag(SWEEP_FORMAT),
    name: title().optional(),
    trial: z.string({ error: 'the name of a trial' }),
    x: axisSchema,
    y: axisSchema.optional(),
    /** Numbers that hold in every cell. */
    overrides: overridesSchema.default({}),
    /** Bands in place of the trial's own. */
    bands: bandsSchema.default({}),
    seed: z.int({ error: 'a whole number from 0' }).min(0, { error: 'a whole number from 0' }).default(1),
  },
  { error: 'a sweep object' },
);
export type Sweep = z.output<typeof sweepSchema>;
export type SweepAxis = Sweep['x'];

/** @throws InputError naming path, value and what is allowed; also for a path that does not exist and too many cells */
export function parseSweep(raw: unknown, subject: Subject, file = 'sweep'): Sweep {
  // Counted first: a sweep of a million cells is told as such, not as a count of 1000.
  const cells = asCount(raw, 'x') * asCount(raw, 'y');
  if (cells > MOST_CELLS)
    throw refuse(file, 'x.count', `${cells} cells`, `at most ${MOST_CELLS} cells in all`);
  const sweep = parseWith(sweepSchema, raw, file);
  checkSweep(sweep, subject, file);
  return sweep;
}

function asCount(raw: unknown, axis: 'x' | 'y'): number {
  const one: unknown = (Object(raw) as Record<string, unknown>)[axis];
  const count: unknown = (Object(one) as Record<string, unknown>).count;
  return typeof count === 'number' && count > 1 ? count : 1;
}

/** Told before the first flight, not in every cell. */
function checkSweep(sweep: Sweep, subject: Subject, file: string): void {
  const trial = trialByName(sweep.trial, file);
  checkBands(trial, sweep.bands, file);
  for (const one of Object.keys(sweep.overrides)) valueAt(trial, subject, one, file);
  const paths: string[] = [];
  for (const [name, axis] of [
    ['x', sweep.x],
    ['y', sweep.y],
  ] as const) {
    if (axis === undefined) continue;
    if (axis.logarithmic && !(axis.from > 0 && axis.to > 0)) {
      throw refuse(file, `${name}.from`, axis.from, 'above 0 at both ends of a logarithmic axis');
    }
    if (axis.count > 1 && axis.from === axis.to) {
      throw refuse(file, `${name}.to`, axis.to, `another value than ${name}.from, or a count of 1`);
    }
    for (const one of [axis.path, ...axis.also]) {
      valueAt(trial, subject, one, file);
      if (paths.includes(one)) throw refuse(file, `${name}.path`, one, 'each path once');
      paths.push(one);
    }
  }
  // An optional field that the schema does not know is found here; a corner out of range belongs to its cell.
  if (paths.some((one) => Number.isNaN(valueAt(trial, subject, one, file)))) {
    resolve(trial, subject, cellOverrides(sweep, { column: 0, row: 0 }), file);
  }
}

export function axisValue(axis: SweepAxis, index: number): number {
  const share = axis.count === 1 ? 0 : index / (axis.count - 1);
  const value = axis.logarithmic
    ? axis.from * (axis.to / axis.from) ** share
    : axis.from + share * (axis.to - axis.from);
  // The last digits of a sum of shares are noise; 12 digits read and write back the same.
  return Number(value.toPrecision(12));
}

export interface Cell {
  readonly column: number;
  readonly row: number;
  /** Cells of this many columns and rows that the cell stands for until finer ones come. */
  readonly block: number;
}

/** All cells, coarse to fine: every 8th, then every 4th, … each cell once. */
export function cellsInOrder(columns: number, rows: number): Cell[] {
  const cells: Cell[] = [];
  const seen = new Set<number>();
  for (let block = 8; block >= 1; block /= 2) {
    for (let row = 0; row < rows; row += block) {
      for (let column = 0; column < columns; column += block) {
        const key = row * columns + column;
        if (seen.has(key)) continue;
        seen.add(key);
        cells.push({ column, row, block });
      }
    }
  }
  return cells;
}

/** The numbers that one cell sets. */
export function cellOverrides(sweep: Sweep, { column, row }: Pick<Cell, 'column' | 'row'>): Overrides {
  const overrides: Record<string, number> = { ...sweep.overrides };
  for (const one of [sweep.x.path, ...sweep.x.also]) overrides[one] = axisValue(sweep.x, column);
  if (sweep.y === undefined) return overrides;
  for (const one of [sweep.y.path, ...sweep.y.also]) overrides[one] = axisValue(sweep.y, row);
  return overrides;
}

/** The task of one cell: also what a click on the cell flies. */
export function cellTask(sweep: Sweep, subject: Subject, cell: Pick<Cell, 'column' | 'row'>): TrialTask {
  return {
    ...subject,
    trial: sweep.trial,
    seed: sweep.seed,
    overrides: cellOverrides(sweep, cell),
    bands: sweep.bands,
  };
}

/** The map of derivative gain against its cutoff, roll and pitch together, around the gains given. */
export function derivativeMap({ gains }: Pick<Subject, 'gains'>, cells = 24): Sweep {
  const { roll, pitch } = gains.axes;
  const now = Math.max(roll.d_us_per_dps2, pitch.d_us_per_dps2);
  const d = now > 0 ? now : 0.01 * Math.max(roll.p_us_per_dps, pitch.p_us_per_dps, 0.01);
  const top_Hz = Math.floor(Math.min(0.45 * gains.loop_Hz, 250));
  return sweepSchema.parse({
    format: SWEEP_FORMAT,
    name: 'derivative gain against its cutoff',
    trial: 'gust-and-noise',
    x: {
      path: 'gains.axes.roll.d_us_per_dps2',
      also: ['gains.axes.pitch.d_us_per_dps2'],
      from: 0,
      to: Number((4 * d).toPrecision(3)),
      count: cells,
    },
    y: {
      path: 'gains.derivativeLowPass_Hz',
      from: Math.min(10, top_Hz / 2),
      to: top_Hz,
      count: cells,
      logarithmic: true,
    },
  });
}

/** Indices of the points that no other beats in both (smaller is better): the trade-off (Pareto) front, by `first`. */
export function tradeOffFront(first: ArrayLike<number>, second: ArrayLike<number>): number[] {
  const order = Array.from(first, (_, i) => i).filter(
    (i) => Number.isFinite(first[i]) && Number.isFinite(second[i]),
  );
  order.sort((a, b) => first[a] - first[b] || second[a] - second[b]);
  const front: number[] = [];
  let best = Infinity;
  for (const i of order) {
    if (second[i] >= best) continue;
    front.push(i);
    best = second[i];
  }
  return front;
}
