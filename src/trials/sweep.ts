/**
 * Sweeps: one trial over one or two fields, coarse to fine. Cells are independent and each is fixed by its
 * place, so any order on any number of workers gives the same results; finished cells can be kept and the rest
 * done later.
 */
import { z } from 'zod';
import { formatTag, parseWith, quantity, title } from '../craft/fields.ts';
import { refuse } from '../craft/problem.ts';
import { withField, type Subject } from './fieldPath.ts';
import { trialByName } from './registry.ts';
import type { TrialTask } from './runTrial.ts';

export const SWEEP_FORMAT = 'gustbench.sweep/1';
/** More would take days and fill the memory of a page. */
export const MOST_CELLS = 40_000;

const axisSchema = z.strictObject(
  {
    path: z.string({ error: 'a path' }).min(1).max(200),
    /** Further fields that take the same value (roll and pitch together). */
    also: z.array(z.string().min(1).max(200)).max(8).default([]),
    from: quantity(-1e9, 1e9, ''),
    to: quantity(-1e9, 1e9, ''),
    count: z
      .number({ error: 'a whole number from 1 to 400' })
      .int({ error: 'a whole number from 1 to 400' })
      .min(1, { error: 'a whole number from 1 to 400' })
      .max(400, { error: 'a whole number from 1 to 400' }),
    logarithmic: z.boolean().default(false),
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
    seed: z.number({ error: 'a whole number' }).int().min(0).default(1),
  },
  { error: 'a sweep object' },
);
export type Sweep = z.output<typeof sweepSchema>;
export type SweepAxis = Sweep['x'];

/** @throws InputError naming path, value and what is allowed; also for too many cells. */
export function parseSweep(raw: unknown, subject: Subject, file = 'sweep'): Sweep {
  const sweep = parseWith(sweepSchema, raw, file);
  trialByName(sweep.trial);
  const cells = sweep.x.count * (sweep.y?.count ?? 1);
  if (cells > MOST_CELLS)
    throw refuse(file, 'x.count', `${cells} cells`, `at most ${MOST_CELLS} cells in all`);
  for (const axis of [sweep.x, sweep.y]) {
    if (axis === undefined) continue;
    if (axis.logarithmic && !(axis.from > 0 && axis.to > 0)) {
      throw refuse(file, 'from', axis.from, 'above 0 at both ends of a logarithmic axis');
    }
    // A path that does not exist is told before the first flight, not in every cell.
    for (const path of [axis.path, ...axis.also]) withField(subject, path, axis.from, file);
  }
  return sweep;
}

export function axisValue(axis: SweepAxis, index: number): number {
  const share = axis.count === 1 ? 0 : index / (axis.count - 1);
  const value = axis.logarithmic
    ? axis.from * (axis.to / axis.from) ** share
    : axis.from + share * (axis.to - axis.from);
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

/** The task of one cell. @throws InputError when the cell's values are not allowed together. */
export function cellTask(sweep: Sweep, subject: Subject, cell: Cell): TrialTask {
  let at = subject;
  for (const path of [sweep.x.path, ...sweep.x.also])
    at = withField(at, path, axisValue(sweep.x, cell.column));
  if (sweep.y !== undefined) {
    for (const path of [sweep.y.path, ...sweep.y.also])
      at = withField(at, path, axisValue(sweep.y, cell.row));
  }
  return {
    trial: sweep.trial,
    build: at.build,
    gains: at.gains,
    seed: sweep.seed,
    ...(at.wind === null ? {} : { wind: at.wind }),
  };
}

/** The map of derivative gain against D cutoff, roll and pitch together, around the gains given. */
export function derivativeMap(subject: Subject, cells = 24): Sweep {
  const { roll } = subject.gains.axes;
  const d = Math.max(roll.d_us_per_dps2, roll.p_us_per_dps * 0.004, 1e-6);
  const nyquist = subject.gains.loop_Hz / 2;
  return {
    format: SWEEP_FORMAT,
    name: 'D against its cutoff',
    trial: 'gust-and-noise',
    x: {
      path: 'gains.axes.roll.d_us_per_dps2',
      also: ['gains.axes.pitch.d_us_per_dps2'],
      from: 0,
      to: Number((4 * d).toPrecision(3)),
      count: cells,
      logarithmic: false,
    },
    y: {
      path: 'gains.derivativeLowPass_Hz',
      also: [],
      from: 10,
      to: Math.round(Math.min(0.9 * nyquist, 250)),
      count: cells,
      logarithmic: true,
    },
    seed: 1,
  };
}

/** Indices of the points that no other beats in both (smaller is better): the trade-off front, by first value. */
export function tradeOffFront(first: readonly number[], second: readonly number[]): number[] {
  const order = first.map((_, i) => i).filter((i) => Number.isFinite(first[i]) && Number.isFinite(second[i]));
  order.sort((a, b) => first[a] - first[b] || second[a] - second[b]);
  const front: number[] = [];
  let best = Infinity;
  for (const i of order) {
    if (second[i] < best) {
      front.push(i);
      best = second[i];
    }
  }
  return front;
}
