/**
 * The cells of a sweep as they come: kept, written down and read back, so that a sweep goes on after a pause, a
 * crash or a closed tab; and read as a map with the region that passes and the trade-off front.
 */
import { z } from 'zod';
import { parseBuild } from '../craft/build.ts';
import { formatTag, parseWith, quantity } from '../craft/fields.ts';
import { parseGains } from '../craft/gains.ts';
import { parseWind } from '../craft/wind.ts';
import { VERSION } from '../flight/record.ts';
import { runTasks, type MakeWorker, type PoolRun, type Progress } from './pool.ts';
import type { Subject } from './overrides.ts';
import type { TaskAnswer } from './protocol.ts';
import { trialByName } from './registry.ts';
import {
  axisValue,
  cellsInOrder,
  cellTask,
  MOST_CELLS,
  parseSweep,
  tradeOffFront,
  type Cell,
  type Sweep,
} from './sweep.ts';
import type { Band } from './trial.ts';

export const SWEEP_RESULT_FORMAT = 'gustbench.sweep-result/1';

const cellSchema = z.strictObject({
  column: z.int().min(0),
  row: z.int().min(0),
  /** In the order of the trial's scores; null: not reached. Empty when the cell was refused. */
  values: z.array(quantity(-1e300, 1e300, '').nullable()).max(100),
  pass: z.boolean(),
  /** Why it was refused or its flight stopped; null when neither. */
  reason: z.string().max(2000).nullable(),
});
export type CellResult = z.output<typeof cellSchema>;

const resultSchema = z.strictObject(
  {
    format: formatTag(SWEEP_RESULT_FORMAT),
    version: z.string(),
    sweep: z.unknown(),
    build: z.unknown(),
    gains: z.unknown(),
    wind: z.unknown().optional(),
    cells: z.array(cellSchema, { error: 'a list of cells' }).max(MOST_CELLS),
  },
  { error: 'a sweep result' },
);

/** A sweep with the cells finished so far. */
export class SweepCells {
  private readonly finished = new Map<number, CellResult>();

  constructor(
    readonly sweep: Sweep,
    readonly subject: Subject,
  ) {}

  /** @throws InputError as for each of its files */
  static parse(raw: unknown, file = 'sweep result'): SweepCells {
    const { sweep, build, gains, wind, cells } = parseWith(resultSchema, raw, file);
    const subject: Subject = {
      build: parseBuild(build, file),
      gains: parseGains(gains, file),
      ...(wind === undefined || wind === null ? {} : { wind: parseWind(wind, file) }),
    };
    const kept = new SweepCells(parseSweep(sweep, subject, file), subject);
    for (const cell of cells) {
      if (cell.column < kept.columns && cell.row < kept.rows) kept.finished.set(kept.place(cell), cell);
    }
    return kept;
  }

  get columns(): number {
    return this.sweep.x.count;
  }

  get rows(): number {
    return this.sweep.y?.count ?? 1;
  }

  get done(): number {
    return this.finished.size;
  }

  get count(): number {
    return this.columns * this.rows;
  }

  /** Cells still to be flown, coarse to fine. */
  remaining(): Cell[] {
    return cellsInOrder(this.columns, this.rows).filter((cell) => !this.finished.has(this.place(cell)));
  }

  at(column: number, row: number): CellResult | null {
    return this.finished.get(row * this.columns + column) ?? null;
  }

  /**
   * Keeps an answer and returns the cell. A cell that the program failed at is returned but not kept: it is
   * flown again when the sweep goes on.
   */
  take({ column, row }: Pick<Cell, 'column' | 'row'>, answer: TaskAnswer): CellResult {
    const cell = cellOf(column, row, answer);
    if (answer.kind !== 'failed') this.finished.set(this.place(cell), cell);
    return cell;
  }

  /** Finished cells row by row, whatever order they came in. */
  cells(): CellResult[] {
    return [...this.finished.entries()].sort(([a], [b]) => a - b).map(([, cell]) => cell);
  }

  /** The same sweep of the same build, gains and wind, whatever is finished. */
  sameAs(other: SweepCells): boolean {
    const key = ({ sweep, subject: { build, gains, wind } }: SweepCells) =>
      JSON.stringify([sweep, build, gains, wind ?? null]);
    return key(this) === key(other);
  }

  /** Everything needed to go on, and to repeat it. */
  toJSON(): unknown {
    const { sweep, subject } = this;
    return { format: SWEEP_RESULT_FORMAT, version: VERSION, sweep, ...subject, cells: this.cells() };
  }

  private place({ column, row }: Pick<Cell, 'column' | 'row'>): number {
    return row * this.columns + column;
  }
}

function cellOf(column: number, row: number, answer: TaskAnswer): CellResult {
  if (answer.kind === 'done') {
    const { scores, pass, stopped } = answer.result;
    return { column, row, values: scores.map((score) => score.value), pass, reason: stopped };
  }
  const problem = answer.kind === 'refused' ? answer.problems[0] : undefined;
  const reason =
    answer.kind === 'failed'
      ? answer.reason
      : `${problem?.path ?? ''}: ${problem?.value ?? ''}; allowed: ${problem?.allowed ?? ''}`;
  return { column, row, values: [], pass: false, reason: reason.slice(0, 2000) };
}

export interface SweepHearing {
  cell?(cell: CellResult, block: number): void;
  progress?(progress: Progress): void;
}

/** Flies the cells that are missing. */
export function runSweep(
  kept: SweepCells,
  makeWorker: MakeWorker,
  workers: number,
  hearing: SweepHearing = {},
): PoolRun {
  const todo = kept.remaining();
  return runTasks(makeWorker, workers, {
    count: todo.length,
    taskAt: (index) => cellTask(kept.sweep, kept.subject, todo[index]),
    hear: (index, answer) => {
      const cell = kept.take(todo[index], answer);
      hearing.cell?.(cell, todo[index].block);
    },
    progress: (progress) => hearing.progress?.(progress),
  });
}

export interface MapLayer {
  readonly name: string;
  readonly unit: string;
  readonly band: Band;
  /** Row by row; NaN where not flown, refused or not reached. */
  readonly values: Float64Array;
}

export interface SweepMap {
  readonly x: Float64Array;
  readonly y: Float64Array;
  /** One for each score, in the trial's order. */
  readonly layers: readonly MapLayer[];
  /** 1 where the cell was flown and every score was in its band. */
  readonly acceptable: Uint8Array;
  /** 1 where the flight stopped or the values were refused. */
  readonly unstable: Uint8Array;
  /** Cells (row · columns + column) that no other beats in both of the first two layers, by the first. */
  readonly front: readonly number[];
}

/** The sweep as a map. The derivative map's first two layers are gust excursion and motor activity. */
export function mapOf(kept: SweepCells): SweepMap {
  const { sweep, columns, rows } = kept;
  const layers = trialByName(sweep.trial).scores.map(({ name, unit, band }) => ({
    name,
    unit,
    band: sweep.bands[name] ?? band,
    values: new Float64Array(columns * rows).fill(NaN),
  }));
  const acceptable = new Uint8Array(columns * rows);
  const unstable = new Uint8Array(columns * rows);
  for (const cell of kept.cells()) {
    const place = cell.row * columns + cell.column;
    acceptable[place] = cell.pass ? 1 : 0;
    unstable[place] = cell.reason === null ? 0 : 1;
    cell.values.forEach((value, i) => {
      if (i < layers.length && cell.reason === null) layers[i].values[place] = value ?? NaN;
    });
  }
  return {
    x: Float64Array.from({ length: columns }, (_, i) => axisValue(sweep.x, i)),
    y: Float64Array.from({ length: rows }, (_, i) => (sweep.y === undefined ? 0 : axisValue(sweep.y, i))),
    layers,
    acceptable,
    unstable,
    front: layers.length < 2 ? [] : tradeOffFront(layers[0].values, layers[1].values),
  };
}
