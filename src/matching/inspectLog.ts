/**
 * A first look at a log: its form (delimiter, decimal sign, heads) and a proposal of which column is what, with
 * the reason for each, for the user to confirm. Nothing here is certain unless it says so.
 */
import Papa from 'papaparse';
import { refuse, showValue } from '../craft/problem.ts';
import { recogniseHead, type RecognisedHead } from '../measuring/heads.ts';
import { missingSignals, ownColumns, UNITS, SIGNALS, type ColumnChoice, type Columns } from './columns.ts';

/** Bytes that are looked at. */
export const HEAD_BYTES = 262_144;
const SAMPLE_ROWS = 400;
const LONGEST_LINE = 100_000;
const LEAST_ROWS = 3;

export interface LogForm {
  readonly kind: 'lines' | 'json-lines';
  /** Between columns; JSON lines have none. */
  readonly delimiter: string;
  readonly decimal: '.' | ',';
  /** Column heads; "1", "2", … where the log has none. */
  readonly heads: readonly string[];
  readonly headless: boolean;
  /** Text of the # lines before the heads, as far as it fits into the head. */
  readonly comments: readonly string[];
  /** Length of a typical row with its line end, bytes. */
  readonly rowBytes: number;
}

export interface Reason {
  readonly signal: string;
  readonly column: string;
  readonly unit: string;
  /** A sentence for the user. */
  readonly because: string;
  /** False: a guess from the numbers, to be looked at. */
  readonly sure: boolean;
}

export interface LogProposal {
  readonly form: LogForm;
  /** The bench's own record: nothing to confirm. */
  readonly ownRecord: boolean;
  readonly columns: Columns;
  readonly reasons: readonly Reason[];
  /** What the fit needs and was not found, with what would do. */
  readonly missing: readonly { signal: string; allowed: string }[];
  /** Heads that stand for nothing in the proposal. */
  readonly unused: readonly string[];
}

/**
 * Looks at the first bytes of a log.
 * @param head up to HEAD_BYTES of it
 * @throws InputError when this is no log of lines with numbers.
 */
export function inspectLog(head: Uint8Array, file = 'log'): LogProposal {
  const { form, sample } = readForm(head, file);
  const own = ownColumns(form.heads);
  if (own !== null) {
    return { form, ownRecord: true, columns: own, reasons: [], missing: [], unused: [] };
  }
  const { columns, reasons } = propose(form.heads, sample);
  const used = new Set(Object.values(columns).map((one) => one?.column));
  return {
    form,
    ownRecord: false,
    columns,
    reasons,
    missing: missingSignals(columns),
    unused: form.heads.filter((name) => !used.has(name)),
  };
}

function readForm(head: Uint8Array, file: string): { form: LogForm; sample: number[][] } {
  if (head.length === 0) throw refuse(file, '', 'nothing', 'a log with rows');
  refuseBinary(head, file);
  const text = new TextDecoder('utf-8').decode(head).replace(/^\uFEFF/, '');
  const lines = text.split(/\r?\n|\r/);
  // The last line may be cut off by the head's end.
  if (head.length >= HEAD_BYTES) lines.pop();
  const comments = lines.filter((line) => line.startsWith('#')).map((line) => line.slice(1).trim());
  const rows = lines.filter((line) => line.trim() !== '' && !line.startsWith('#'));
  if (rows.length === 0) throw refuse(file, '', 'no rows', 'column heads and rows of numbers');
  if (rows[0].length > LONGEST_LINE) {
    throw refuse(
      file,
      'line 1',
      `${rows[0].length} characters`,
      `lines of at most ${LONGEST_LINE} characters`,
    );
  }
  return rows[0].trimStart().startsWith('{')
    ? readJsonForm(rows, comments, file)
    : readDelimitedForm(rows, comments, file);
}

function refuseBinary(head: Uint8Array, file: string): void {
  let odd = 0;
  for (const byte of head) {
    if (byte === 0) throw refuse(file, '', 'binary data', 'a text log: CSV or one JSON object a line');
    if (byte < 32 && byte !== 9 && byte !== 10 && byte !== 13 && byte !== 12) odd++;
  }
  if (odd > 0.02 * head.length) {
    throw refuse(file, '', 'binary data', 'a text log: CSV or one JSON object a line');
  }
}

function readJsonForm(rows: string[], comments: string[], file: string) {
  const objects = rows.slice(0, SAMPLE_ROWS).flatMap((line): Record<string, unknown>[] => {
    try {
      const value: unknown = JSON.parse(line);
      return typeof value === 'object' && value !== null ? [value as Record<string, unknown>] : [];
    } catch {
      return [];
    }
  });
  if (objects.length < LEAST_ROWS) {
    throw refuse(file, '', showValue(rows[0]), 'one complete JSON object a line, at least three');
  }
  const heads = [...new Set(objects.flatMap((one) => Object.keys(one)))];
  const sample = objects.map((one) => heads.map((key) => (typeof one[key] === 'number' ? one[key] : NaN)));
  const form: LogForm = {
    kind: 'json-lines',
    delimiter: '',
    decimal: '.',
    heads,
    headless: false,
    comments,
    rowBytes: meanLength(rows),
  };
  return { form, sample };
}

function readDelimitedForm(rows: string[], comments: string[], file: string) {
  const delimiter = sniffDelimiter(rows);
  const first = cells(rows[0], delimiter);
  const decimalComma = delimiter !== ',' && rows.slice(1, 20).some((row) => /\d,\d/.test(row));
  const decimal = decimalComma ? ',' : '.';
  const toNumber = (cell: string) => {
    const plain = cell.trim().replace(/^"|"$/g, '').replace(decimal, '.');
    return plain === '' ? NaN : Number(plain);
  };
  const headless = first.length > 1 && first.every((cell) => Number.isFinite(toNumber(cell)));
  const body = rows.slice(headless ? 0 : 1);
  if (body.length === 0) throw refuse(file, '', 'a head line alone', 'rows of numbers below the heads');
  const sample = body.slice(0, SAMPLE_ROWS).map((row) => cells(row, delimiter).map(toNumber));
  const finite = sample.flat().filter((value) => Number.isFinite(value)).length;
  if (first.length < 2 || finite < 0.3 * sample.flat().length) {
    throw refuse(
      file,
      'line 1',
      showValue(rows[0].slice(0, 60)),
      'a log: column heads (time, rates, commands) and rows of numbers, separated by comma, semicolon, tab or space',
    );
  }
  const heads = headless ? first.map((_, i) => String(i + 1)) : first.map((cell) => cell.trim());
  const form: LogForm = {
    kind: 'lines',
    delimiter,
    decimal,
    heads,
    headless,
    comments,
    rowBytes: meanLength(body),
  };
  return { form, sample };
}

function meanLength(rows: readonly string[]): number {
  const some = rows.slice(0, 2000);
  return some.reduce((sum, row) => sum + row.length + 1, 0) / some.length;
}

function cells(row: string, delimiter: string): string[] {
  return Papa.parse<string[]>(row, { delimiter }).data[0] ?? [];
}

/** The candidate that parts every one of the first rows into the same, largest number of cells. */
function sniffDelimiter(rows: readonly string[]): string {
  const some = rows.slice(0, 30);
  let best = ',';
  let most = 1;
  for (const candidate of ['\t', ';', ',', '|', ' ']) {
    const counts = some.map((row) => cells(row.trim(), candidate).length);
    const usual = counts[Math.min(1, counts.length - 1)];
    const agree = counts.filter((count) => count === usual).length;
    if (usual > most && agree >= 0.8 * counts.length) {
      most = usual;
      best = candidate;
    }
  }
  return best;
}

// --- Proposal -----------------------------------------------------------------------------------------------

const SIGNAL_OF: Readonly<Partial<Record<RecognisedHead['quantity'], string>>> = {
  gyro: 'gyro',
  setpoint: 'sp',
  speed: 'speed',
  angle: 'angle',
  command: 'cmd',
};

function propose(heads: readonly string[], sample: readonly number[][]) {
  const columns: Record<string, ColumnChoice> = {};
  const reasons: Reason[] = [];
  const ranks = new Map<string, number>();
  heads.forEach((head, place) => {
    const found = recogniseHead(head);
    if (found === null) return;
    const signal = signalFor(found, head);
    if (signal === null || (ranks.get(signal) ?? Infinity) <= found.rank) return;
    const values = sample.map((row) => row[place]).filter((value) => Number.isFinite(value));
    const unit = unitOf(signal, found, values);
    ranks.set(signal, found.rank);
    columns[signal] = { column: head, unit: unit.unit, sign: 1 };
    const before = reasons.findIndex((one) => one.signal === signal);
    if (before !== -1) reasons.splice(before, 1);
    reasons.push({ signal, column: head, unit: unit.unit, because: unit.because, sure: unit.sure });
  });
  return { columns: columns as Columns, reasons };
}

function signalFor(found: RecognisedHead, head: string): string | null {
  if (found.quantity === 'time') return 't';
  const prefix = SIGNAL_OF[found.quantity];
  if (prefix === undefined) return null;
  if (prefix === 'cmd') {
    if (found.corner !== null) return `cmd_${found.corner}`;
    if (found.axis !== null) return `u_${found.axis}`;
    // A throttle is the pilot's; numbered motors cannot be placed without being told.
    return /throttle|collective|gas/i.test(head) ? 'throttle' : null;
  }
  if (prefix === 'speed') return found.corner === null ? null : `speed_${found.corner}`;
  return found.axis === null ? null : `${prefix}_${found.axis}`;
}

interface UnitGuess {
  readonly unit: string;
  readonly because: string;
  readonly sure: boolean;
}

function unitOf(signal: string, found: RecognisedHead, values: readonly number[]): UnitGuess {
  const kind = SIGNALS.get(signal) ?? 'share';
  const stated = found.unit?.replace('µ', 'u');
  if (stated !== undefined && stated in UNITS[kind]) {
    return { unit: stated, because: `the head says ${found.unit}`, sure: true };
  }
  if (kind === 'time') return timeUnit(values);
  const largest = values.reduce((most, value) => Math.max(most, Math.abs(value)), 0);
  const most = Number(largest.toPrecision(3));
  if (kind === 'rate') {
    // 12 rad/s is 690 deg/s: beyond what the first rows of a log hold; 12 deg/s is a craft held still.
    return largest > 12
      ? {
          unit: 'deg/s',
          because: `values up to ${most} are too large for rad/s in ordinary flight`,
          sure: false,
        }
      : { unit: 'rad/s', because: `values up to ${most}; small for deg/s`, sure: false };
  }
  if (kind === 'angle') {
    return largest > 6.4
      ? { unit: 'deg', because: `values up to ${most}`, sure: false }
      : { unit: 'rad', because: `values up to ${most}`, sure: false };
  }
  if (kind === 'share' || kind === 'command') {
    const unit = largest <= 1.001 ? '1' : largest <= 100.1 ? '%' : 'us';
    return { unit, because: `values up to ${most}`, sure: largest > 800 || largest <= 1.001 };
  }
  if (kind === 'speed') return { unit: 'rpm', because: 'common for rotors', sure: false };
  return { unit: 'us', because: 'taken as µs, like the motor commands', sure: false };
}

/** By the step from row to row: controllers run at 20 Hz to 10 kHz. */
function timeUnit(values: readonly number[]): UnitGuess {
  const steps = values
    .slice(1)
    .map((value, i) => value - values[i])
    .filter((step) => step > 0)
    .sort((a, b) => a - b);
  const step = steps[steps.length >> 1] ?? 0;
  for (const [unit, factor] of Object.entries(UNITS.time)) {
    if (typeof factor !== 'number') continue;
    const rate_Hz = 1 / (step * factor);
    if (rate_Hz >= 18 && rate_Hz <= 18_000) {
      return {
        unit,
        because: `rows step by ${Number(step.toPrecision(4))}, ${Number(rate_Hz.toPrecision(3))} rows a second in ${unit}`,
        sure: true,
      };
    }
  }
  return { unit: 's', because: 'the step from row to row fits no usual rate', sure: false };
}
