/** Time base of a recording: order, rate, jitter, gaps. */
import { median } from 'simple-statistics';
import { refuse } from '../craft/problem.ts';
import { columnInSI, type ColumnChoice, type Table } from './columns.ts';
import { robustScale } from './regression.ts';

export interface TimeBase {
  readonly time_s: Float64Array;
  /** Median interval. */
  readonly interval_s: number;
  readonly rate_Hz: number;
  /** Spread of the intervals about their median, gaps apart. */
  readonly jitter_s: number;
  readonly longest_s: number;
  /** Samples that are missing, by the length of the gaps. */
  readonly lost: number;
  /** First row and row after the last of the longest stretch without a gap. */
  readonly stretch: readonly [number, number];
  readonly notes: readonly string[];
}

/** An interval longer than this many usual ones is a gap. */
const GAP_INTERVALS = 1.7;
const LEAST_ROWS = 8;

/**
 * Time in seconds from its column; a head without a unit is read by the size of its steps, and that is said.
 * @throws InputError for too few rows, a cell that is no number, time that falls or stands still.
 */
export function timeBase(table: Table, choice: ColumnChoice | undefined): TimeBase {
  const { file } = table;
  if (choice === undefined) {
    throw refuse(
      file,
      'time',
      undefined,
      `a column of time such as "t_s" or "time (ms)" (found ${table.heads.join(', ')})`,
    );
  }
  if (table.rows < LEAST_ROWS) throw refuse(file, '', `${table.rows} rows`, `at least ${LEAST_ROWS} rows`);
  const notes: string[] = [];
  const unit = choice.unit ?? guessUnit(table, choice, notes);
  const time_s = columnInSI(table, 'time', { ...choice, unit });
  const head = choice.column;
  for (let i = 0; i < time_s.length; i++) {
    if (Number.isNaN(time_s[i])) throw refuse(file, `row ${i + 1}, ${head}`, undefined, 'a number');
    if (Math.abs(time_s[i]) > 1e12) throw refuse(file, `row ${i + 1}, ${head}`, time_s[i], 'at most 1e12 s');
    if (i > 0 && time_s[i] < time_s[i - 1]) {
      throw refuse(
        file,
        `row ${i + 1}, ${head}`,
        time_s[i],
        `a time not before the row above, ${time_s[i - 1]} s`,
      );
    }
  }
  const steps = new Float64Array(time_s.length - 1);
  for (let i = 0; i < steps.length; i++) steps[i] = time_s[i + 1] - time_s[i];
  const interval_s = medianOf(steps);
  if (!(interval_s > 0)) {
    throw refuse(
      file,
      `column ${head}`,
      'a time that mostly stands still',
      'a time that rises from row to row',
    );
  }
  return { time_s, notes, ...describeSteps(steps, interval_s, notes) };
}

/** Median of a sample of at most 100,000 values, spread evenly. */
function medianOf(values: Float64Array): number {
  const stride = Math.max(1, Math.floor(values.length / 100_000));
  const sample: number[] = [];
  for (let i = 0; i < values.length; i += stride) sample.push(values[i]);
  return median(sample);
}

function describeSteps(steps: Float64Array, interval_s: number, notes: string[]) {
  let lost = 0;
  let longest_s = 0;
  let sum = 0;
  let count = 0;
  let start = 0;
  let stretch: [number, number] = [0, 0];
  const regular: number[] = [];
  const stride = Math.max(1, Math.floor(steps.length / 100_000));
  for (let i = 0; i <= steps.length; i++) {
    const gap = i === steps.length || steps[i] > GAP_INTERVALS * interval_s;
    if (gap) {
      if (i + 1 - start > stretch[1] - stretch[0]) stretch = [start, i + 1];
      start = i + 1;
      if (i < steps.length) lost += Math.round(steps[i] / interval_s) - 1;
    } else {
      sum += steps[i];
      count++;
      if (i % stride === 0) regular.push(steps[i]);
    }
    if (i < steps.length && steps[i] > longest_s) longest_s = steps[i];
  }
  const mean = count > 0 ? sum / count : interval_s;
  const jitter_s = robustScale(regular);
  if (lost > 0) {
    notes.push(`${lost} samples are missing; the longest gap is ${(1000 * longest_s).toFixed(1)} ms.`);
  }
  if (jitter_s > 0.1 * mean) {
    notes.push(
      `The sampling jitters by ${((100 * jitter_s) / mean).toFixed(0)} % of its interval: the derivative term sees that as noise.`,
    );
  }
  return { interval_s, rate_Hz: 1 / mean, jitter_s, longest_s, lost, stretch };
}

/** Seconds, milliseconds or microseconds: whichever makes the rate lie between 5 Hz and 50 kHz, slowest unit first. */
function guessUnit(table: Table, choice: ColumnChoice, notes: string[]): string {
  const index = table.heads.indexOf(choice.column);
  const values = index === -1 ? new Float64Array(0) : table.columns[index];
  const steps = values.slice(1).map((value, i) => value - values[i]);
  const step = steps.length === 0 ? NaN : medianOf(steps);
  const unit = step <= 0.2 || Number.isNaN(step) ? 's' : step < 25 ? 'ms' : 'µs';
  notes.push(
    `"${choice.column}" states no unit; by its steps of ${Number(step.toPrecision(3))} it is read as ${unit}.`,
  );
  return unit;
}
