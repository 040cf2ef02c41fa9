/**
 * Reads a log of any length from a stream of bytes into typed arrays: a CSV by the number scanner, JSON lines
 * (one object a line; RFC 8259 objects, newline between them: every language writes them without a library
 * and they carry their own heads, which no binary layout does) object by object. Only wanted columns are kept.
 */
import { CORNERS } from '../craft/build.ts';
import { AXES } from '../craft/gains.ts';
import { refuse } from '../craft/problem.ts';
import { conversion, SIGNALS, type Columns, type CommandRange } from './columns.ts';
import { HEAD_BYTES, inspectLog, type LogForm, type LogProposal } from './inspectLog.ts';
import type { Column, FlightLog } from './log.ts';
import { NumberScanner, type RowSink } from './numberScanner.ts';
import { risingTimes } from './timeStamps.ts';

/** Largest log that is read. */
export const LARGEST_LOG_BYTES = 2_000_000_000;
/** Most memory the columns may take. */
const LARGEST_COLUMNS_BYTES = 700_000_000;
const LEAST_ROWS = 200;
const LONGEST_LINE_BYTES = 4_000_000;
/** Rows without a number in a wanted column, as a share, above which this is no such log. */
const MOST_BAD_SHARE = 0.2;

/** Where the bytes come from: a file of the page or of the shell. */
export interface LogSource {
  readonly name: string;
  /** Null when it is not known beforehand. */
  readonly size_bytes: number | null;
  /** A new run over the bytes from the start. */
  open(): AsyncIterable<Uint8Array>;
}

/** A file that was dropped or chosen in the browser. */
export function blobSource(blob: Blob, name: string): LogSource {
  return { name, size_bytes: blob.size, open: () => streamBytes(blob.stream()) };
}

async function* streamBytes(stream: ReadableStream<Uint8Array>): AsyncGenerator<Uint8Array> {
  const reader = stream.getReader();
  try {
    for (;;) {
      const { done, value } = await reader.read();
      if (done) return;
      yield value;
    }
  } finally {
    reader.releaseLock();
  }
}

/**
 * The first bytes of a source.
 * @throws InputError when the source is larger than LARGEST_LOG_BYTES.
 */
export async function readHead(source: LogSource): Promise<Uint8Array> {
  refuseHuge(source.name, source.size_bytes ?? 0);
  const parts: Uint8Array[] = [];
  let length = 0;
  for await (const chunk of source.open()) {
    parts.push(chunk);
    length += chunk.length;
    if (length >= HEAD_BYTES) break;
  }
  const head = new Uint8Array(length);
  let at = 0;
  for (const part of parts) {
    head.set(part, at);
    at += part.length;
  }
  return head.subarray(0, HEAD_BYTES);
}

function refuseHuge(name: string, bytes: number): void {
  if (bytes >= LARGEST_LOG_BYTES) {
    throw refuse(
      name,
      '',
      `${(bytes / 1e9).toFixed(1)} GB`,
      `a log below ${LARGEST_LOG_BYTES / 1e9} GB; cut out the minutes with the manoeuvres, a few are enough`,
    );
  }
}

export interface ReadOptions {
  /** ESC limits, for commands and throttle given as shares. */
  readonly range: CommandRange;
  /** Share done, 0 … 1 (bytes when the size is not known). */
  readonly onProgress?: (share: number) => void;
  readonly signal?: AbortSignal;
}

/**
 * Reads the signals named in `columns`.
 * @throws InputError when it is no log, a column is missing, time falls, or nearly every row is bad.
 */
export async function readLog(
  source: LogSource,
  proposal: LogProposal,
  columns: Columns,
  options: ReadOptions,
): Promise<FlightLog> {
  const { form } = proposal;
  const wanted = wantedColumns(form, columns, source.name);
  const table = new Table(wanted.length, form.rowBytes, source);
  const places = wanted.map((one) => one.place);
  const reader =
    form.kind === 'json-lines'
      ? new JsonLineReader(
          places.map((place) => form.heads[place]),
          table,
        )
      : new NumberScanner(places, form.delimiter.charCodeAt(0), form.decimal.charCodeAt(0), table);
  let bytes = 0;
  for await (const chunk of source.open()) {
    options.signal?.throwIfAborted();
    reader.push(chunk);
    bytes += chunk.length;
    if (source.size_bytes === null) refuseHuge(source.name, bytes);
    if (reader.waiting > LONGEST_LINE_BYTES) {
      throw refuse(
        source.name,
        `byte ${bytes}`,
        'no line end',
        `lines of at most ${LONGEST_LINE_BYTES} bytes`,
      );
    }
    if (table.problem !== null) throw refuse(source.name, '', table.problem, TOO_MANY_ROWS);
    options.onProgress?.(source.size_bytes === null ? bytes : bytes / source.size_bytes);
  }
  reader.finish();
  if (!form.headless && form.kind === 'lines') table.forgetHead();
  return assemble(source.name, form, columns, wanted, table, options.range);
}

const TOO_MANY_ROWS = `a log whose wanted columns fit into ${LARGEST_COLUMNS_BYTES / 1e6} MB; cut out the minutes with the manoeuvres`;

interface Wanted {
  readonly signal: string;
  readonly place: number;
}

/** Places of the wanted columns; time first. */
function wantedColumns(form: LogForm, columns: Columns, file: string): Wanted[] {
  const wanted: Wanted[] = [];
  for (const signal of SIGNALS.keys()) {
    const chosen = columns[signal];
    if (chosen === undefined) continue;
    const { column } = chosen;
    const place = typeof column === 'number' ? column - 1 : form.heads.indexOf(column);
    if (place < 0 || place >= form.heads.length) {
      const known = form.heads.slice(0, 30).join(', ');
      throw refuse(file, `${signal}.column`, column, `one of the log's heads: ${known}`);
    }
    const twin = wanted.find((one) => one.place === place);
    if (twin !== undefined) {
      throw refuse(
        file,
        `${signal}.column`,
        column,
        `a column of its own; ${twin.signal} is read from it already`,
      );
    }
    wanted.push({ signal, place });
  }
  return wanted;
}

/** Grows with the rows: time in double, the rest in single precision. */
class Table implements RowSink {
  time: Float64Array;
  columns: Float32Array[];
  rows = 0;
  bad = 0;
  firstBad = -1;
  problem: string | null = null;
  private seen = 0;
  private headBad = false;

  constructor(
    private readonly width: number,
    rowBytes: number,
    source: LogSource,
  ) {
    const guess = source.size_bytes === null ? 100_000 : (1.03 * source.size_bytes) / rowBytes + 1000;
    const capacity = Math.min(Math.ceil(guess), this.mostRows());
    this.time = new Float64Array(capacity);
    this.columns = Array.from({ length: width - 1 }, () => new Float32Array(capacity));
  }

  private mostRows(): number {
    return Math.floor(LARGEST_COLUMNS_BYTES / (8 + 4 * (this.width - 1)));
  }

  take(values: Float64Array): void {
    this.seen++;
    for (let i = 0; i < values.length; i++) {
      if (!(Math.abs(values[i]) < 1e300)) {
        this.bad++;
        // The first line is the heads' as a rule.
        if (this.seen === 1) this.headBad = true;
        else if (this.firstBad === -1) this.firstBad = this.seen;
        return;
      }
    }
    if (this.rows === this.time.length && !this.grow()) return;
    this.time[this.rows] = values[0];
    for (let i = 1; i < values.length; i++) this.columns[i - 1][this.rows] = values[i];
    this.rows++;
  }

  private grow(): boolean {
    const most = this.mostRows();
    if (this.rows >= most) {
      this.problem = `more than ${most} rows`;
      return false;
    }
    const capacity = Math.min(most, Math.ceil(this.rows * 1.3) + 1000);
    const time = new Float64Array(capacity);
    time.set(this.time);
    this.time = time;
    this.columns = this.columns.map((old) => {
      const larger = new Float32Array(capacity);
      larger.set(old);
      return larger;
    });
    return true;
  }

  /** The head line came through as a bad row. */
  forgetHead(): void {
    if (this.headBad) this.bad--;
  }
}

/** One JSON object a line; values that are no numbers are NaN. */
class JsonLineReader {
  private readonly decoder = new TextDecoder('utf-8');
  private readonly values: Float64Array;
  private rest = '';

  constructor(
    private readonly keys: readonly string[],
    private readonly sink: RowSink,
  ) {
    this.values = new Float64Array(keys.length);
  }

  get waiting(): number {
    return this.rest.length;
  }

  push(chunk: Uint8Array): void {
    const lines = (this.rest + this.decoder.decode(chunk, { stream: true })).split('\n');
    this.rest = lines.pop() ?? '';
    for (const line of lines) this.line(line);
  }

  finish(): void {
    this.line(this.rest);
    this.rest = '';
  }

  private line(text: string): void {
    if (text.trim() === '' || text.startsWith('#')) return;
    this.values.fill(NaN);
    try {
      const row = JSON.parse(text) as Record<string, unknown> | null;
      this.keys.forEach((key, i) => {
        const value = row?.[key];
        if (typeof value === 'number') this.values[i] = value;
      });
    } catch {
      // Not an object: a bad row, counted by the sink.
    }
    this.sink.take(this.values);
  }
}

function assemble(
  file: string,
  form: LogForm,
  columns: Columns,
  wanted: readonly Wanted[],
  table: Table,
  range: CommandRange,
): FlightLog {
  const remarks: string[] = [];
  const all = table.rows + table.bad;
  if (table.bad > MOST_BAD_SHARE * all || table.rows < LEAST_ROWS) {
    throw refuse(
      file,
      table.bad > 0 ? `line ${table.firstBad}` : 'rows',
      table.bad > 0
        ? `${table.bad} of ${all} rows without a number in ${wanted.map((one) => one.signal).join(', ')}`
        : `${table.rows} rows`,
      `at least ${LEAST_ROWS} rows with numbers, and numbers in at least 80 % of the rows`,
    );
  }
  if (table.bad > 0)
    remarks.push(`${table.bad} of ${all} rows had no number in a needed column and were left out.`);
  const t = columns.t;
  const unit_s = t === undefined ? 1 : conversion('t', t, range).scale;
  const times = risingTimes(table.time.subarray(0, table.rows), unit_s, file);
  remarks.push(...times.remarks);
  const byPrefix = (prefix: string, names: readonly string[]) =>
    Object.fromEntries(
      names.flatMap((name): [string, Column][] => {
        const column = columnOf(`${prefix}_${name}`);
        return column === null ? [] : [[name, column]];
      }),
    );
  const columnOf = (signal: string): Column | null => {
    const slot = wanted.findIndex((one) => one.signal === signal);
    const chosen = columns[signal];
    if (slot === -1 || chosen === undefined) return null;
    const { scale, offset } = conversion(signal, chosen, range);
    // In place, and only the kept rows: a long log is never held twice.
    const column = table.columns[slot - 1];
    const { kept } = times;
    const length = kept === null ? table.rows : kept.length;
    for (let i = 0; i < length; i++) column[i] = scale * column[kept === null ? i : kept[i]] + offset;
    return column.subarray(0, length);
  };
  const throttle = columnOf('throttle');
  const descent = columnOf('descent');
  const gains = form.comments.find((line) => line.startsWith('gains: '));
  return {
    name: file,
    t_s: times.t_s,
    gyro_dps: byPrefix('gyro', AXES),
    setpoint_dps: byPrefix('sp', AXES),
    axisCommand_us: byPrefix('u', AXES),
    motorCommand_us: byPrefix('cmd', CORNERS),
    rotorSpeed_rpm: byPrefix('speed', CORNERS),
    angle_deg: byPrefix('angle', AXES),
    ...(throttle === null ? {} : { throttle }),
    ...(descent === null ? {} : { descent_mps: descent }),
    ...(gains === undefined ? {} : { gainsJson: gains.slice('gains: '.length) }),
    remarks,
  };
}

/** Looks and reads in one go: the proposal as it stands, or the columns given. */
export async function openLog(source: LogSource): Promise<LogProposal> {
  return inspectLog(await readHead(source), source.name);
}
