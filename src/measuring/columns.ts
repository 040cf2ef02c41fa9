/**
 * Reads a table of numbers as instruments and spreadsheets write it: any usual delimiter, decimal comma,
 * "#" comment lines, lines of talk before the head, a line of units below it, byte-order mark, CRLF. Also
 * proposes which column holds which quantity, a mapping that the user sees and corrects.
 */
import Papa from 'papaparse';
import { refuse } from '../craft/problem.ts';
import type { AxisName } from '../craft/gains.ts';
import { DIMENSIONS, recogniseHead, type Quantity, type RecognisedHead } from './heads.ts';
import { unitFor, unitsOf, unitMeanings } from './units.ts';

export interface OddCell {
  /** Row of numbers, counted from 1. */
  readonly row: number;
  readonly head: string;
  readonly text: string;
}

export interface Table {
  readonly file: string;
  /** As written, trimmed; a unit from a line below is added in brackets. */
  readonly heads: readonly string[];
  /** One a head; NaN where a cell is empty or no number. */
  readonly columns: readonly Float64Array[];
  /** Texts of the columns that hold no number at all, null for the others. */
  readonly texts: readonly (readonly string[] | null)[];
  readonly rows: number;
  /** Comment lines and lines before the head, without "#". */
  readonly comments: readonly string[];
  readonly delimiter: string;
  readonly decimalComma: boolean;
  /** Cells with something else than a number in columns of numbers, the first hundred. */
  readonly oddCells: readonly OddCell[];
  /** What was read differently from what stands there, for the user. */
  readonly notes: readonly string[];
}

const LARGEST_HEADS = 1000;
const LARGEST_ROWS = 50_000_000;
const MOST_ODD_CELLS = 100;
/** Lines looked at to find delimiter, decimal mark and head. */
const LINES_INSPECTED = 60;
const PIECE_CHARACTERS = 4_000_000;
/** Spellings of "no value here". */
const EMPTY_CELL = /^(|-|--|nan|n\/a|na|null|none|#n\/a|\?)$/i;

interface Layout {
  delimiter: string;
  decimalComma: boolean;
  heads: string[];
  /** Characters of the text before the first row of numbers. */
  bodyStart: number;
  comments: string[];
  notes: string[];
}

/**
 * @param text whole file, @param file name for messages
 * @throws InputError for binary data, no head line, no rows, rows longer than the head.
 */
export function readTable(text: string, file: string): Table {
  const clean = text.replace(/^\uFEFF/, '');
  refuseBinary(clean, file);
  const layout = inspect(clean, file);
  const body = new TableBody(layout, file);
  const spaced = layout.delimiter === ' ';
  for (const piece of pieces(clean, layout.bodyStart)) {
    const lines = spaced ? piece.replace(/^[ \t]+/gm, '').replace(/[ \t]+/g, ' ') : piece;
    body.take(
      Papa.parse<string[]>(lines, { delimiter: layout.delimiter, comments: '#', skipEmptyLines: 'greedy' })
        .data,
    );
  }
  return body.finish();
}

/** Pieces of whole lines, so that the cells of a large file are never all in memory as texts. */
function* pieces(text: string, start: number): Generator<string> {
  let from = start;
  while (from < text.length) {
    let to = from + PIECE_CHARACTERS;
    if (to < text.length) {
      const next = text.indexOf('\n', to);
      to = next === -1 ? text.length : next + 1;
    }
    yield text.slice(from, to);
    from = to;
  }
}

function refuseBinary(text: string, file: string): void {
  const sample = text.slice(0, 20_000);
  if (sample.trim() === '') throw refuse(file, '', 'nothing', 'a head line naming the columns, then rows');
  let strange = 0;
  for (let i = 0; i < sample.length; i++) {
    const code = sample.charCodeAt(i);
    if (code === 0xfffd || (code < 32 && code !== 9 && code !== 10 && code !== 13)) strange++;
    if (code === 0) strange = sample.length;
  }
  if (strange > 0.01 * sample.length) throw refuse(file, '', 'binary data', 'a text file with columns');
}

interface Line {
  readonly text: string;
  readonly start: number;
  readonly end: number;
}

/** The first lines that are neither empty nor comments, with the place where each ends. */
function firstLines(text: string, comments: string[]): Line[] {
  const lines: Line[] = [];
  const pattern = /[^\r\n]*(\r\n|\n|\r|$)/g;
  while (lines.length < LINES_INSPECTED && pattern.lastIndex < text.length) {
    const start = pattern.lastIndex;
    const match = pattern.exec(text);
    if (match === null) break;
    const line = match[0].trim();
    if (line.startsWith('#')) {
      if (lines.length === 0) comments.push(line.replace(/^#+\s*/, ''));
    } else if (line !== '') {
      lines.push({ text: match[0].replace(/[\r\n]+$/, ''), start, end: pattern.lastIndex });
    }
  }
  return lines;
}

function inspect(text: string, file: string): Layout {
  const comments: string[] = [];
  const notes: string[] = [];
  const lines = firstLines(text, comments);
  if (lines.length === 0) throw refuse(file, '', 'comment lines alone', 'a head line and rows of numbers');
  const delimiter = guessDelimiter(lines);
  const cells = lines.map((line) => splitLine(line.text, delimiter));
  const decimalComma = usesDecimalComma(cells, delimiter);
  const numbers = cells.map((row) => countNumbers(row, decimalComma));
  const isBody = (i: number) => i < cells.length && numbers[i] > 0 && numbers[i] * 2 >= filled(cells[i]);
  const firstBody = cells.findIndex((_, i) => isBody(i));
  if (firstBody === -1) {
    if (lines.length > 1 || cells[0].length > 1) {
      throw refuse(file, '', firstCells(lines[0].text), 'a head line, then at least one row of numbers');
    }
    throw refuse(file, '', firstCells(lines[0].text), 'a table: a head line naming the columns, then rows');
  }
  if (firstBody === 0) {
    const heads = headFromComment(comments, delimiter, cells[0].length);
    if (heads === null) {
      throw refuse(file, 'head line', firstCells(lines[0].text), 'names of the columns above the numbers');
    }
    notes.push('The head was taken from the comment line above the numbers.');
    return { delimiter, decimalComma, heads, bodyStart: lines[0].start, comments, notes };
  }
  // A line of units may stand between head and numbers.
  const units = cells[firstBody - 1];
  const unitLine =
    firstBody >= 2 && units.some(isUnitCell) && units.every((cell) => cell === '' || isUnitCell(cell));
  const headAt = unitLine ? firstBody - 2 : firstBody - 1;
  const heads = cells[headAt].map((head, i) => withUnit(head, unitLine ? units[i] : undefined));
  if (unitLine) notes.push('Units were taken from the line below the head.');
  comments.push(...lines.slice(0, headAt).map((line) => line.text));
  return { delimiter, decimalComma, heads, bodyStart: lines[firstBody - 1].end, comments, notes };
}

const firstCells = (line: string): string => (line.length > 50 ? `${line.slice(0, 50)}…` : line);
const filled = (row: readonly string[]): number => row.filter((cell) => cell !== '').length;
const isUnitCell = (cell: string): boolean =>
  unitMeanings(cell.replace(/^[([{]\s*|\s*[)\]}]$/g, '')).length > 0;

function withUnit(head: string, unit: string | undefined): string {
  const bare = (unit ?? '').replace(/^[([{]\s*|\s*[)\]}]$/g, '');
  return bare === '' || recogniseHead(head)?.unit != null ? head : `${head} [${bare}]`;
}

function headFromComment(comments: readonly string[], delimiter: string, count: number): string[] | null {
  const last = comments[comments.length - 1];
  if (last === undefined) return null;
  const heads = splitLine(last, delimiter);
  return heads.length === count && heads.every((head) => /\p{L}/u.test(head)) ? heads : null;
}

function splitLine(line: string, delimiter: string): string[] {
  const text = delimiter === ' ' ? line.trim().replace(/[ \t]+/g, ' ') : line;
  const row = Papa.parse<string[]>(text, { delimiter }).data[0] ?? [''];
  return row.map((cell) => cell.trim());
}

/** The delimiter for which most lines have as many cells as the one before, and more than one. */
function guessDelimiter(lines: readonly Line[]): string {
  let best = ',';
  let bestScore = 0;
  // Spaces come last: heads and comments hold them too.
  for (const delimiter of ['\t', ';', '|', ',', ' ']) {
    const counts = lines.map((line) => splitLine(line.text, delimiter).length);
    let score = 0;
    for (let i = 1; i < counts.length; i++) if (counts[i] > 1 && counts[i] === counts[i - 1]) score++;
    if (counts.length === 1 && counts[0] > 1) score = 1;
    if (score > bestScore * 1.2) {
      best = delimiter;
      bestScore = score;
    }
  }
  return best;
}

/** "1,5" somewhere and "1.5" nowhere among the cells, or "1.234,5". */
function usesDecimalComma(cells: readonly (readonly string[])[], delimiter: string): boolean {
  let comma = 0;
  let point = 0;
  let thousands = 0;
  for (const row of cells) {
    for (const cell of row) {
      if (/^[+-]?\d{1,3}(\.\d{3})*,\d+(e[+-]?\d+)?$/i.test(cell) || /^[+-]?\d*,\d+(e[+-]?\d+)?$/i.test(cell))
        comma++;
      if (/^[+-]?\d{1,3}(,\d{3})+(\.\d+)?$/.test(cell)) thousands++;
      if (/^[+-]?\d*\.\d+(e[+-]?\d+)?$/i.test(cell)) point++;
    }
  }
  if (comma === 0) return false;
  // "12,345" beside "0.5", or between commas as delimiters, is a thousands mark.
  return !(thousands === comma && (point > 0 || delimiter === ','));
}

function countNumbers(row: readonly string[], decimalComma: boolean): number {
  return row.filter((cell) => cell !== '' && !Number.isNaN(toNumber(cell, decimalComma))).length;
}

/** NaN when the cell is no number. */
function toNumber(cell: string, decimalComma: boolean): number {
  const direct = decimalComma ? NaN : Number(cell);
  if (Number.isFinite(direct)) return direct;
  const text = decimalComma
    ? (/,/.test(cell) ? cell.replace(/\.(?=\d{3}(\D|$))/g, '') : cell).replace(',', '.')
    : cell.replace(/(\d),(?=\d{3}(\D|$))/g, '$1');
  return /\d/.test(text)
    ? Number(text.replace(/^\u2212/, '-').replace(/['\u00A0\u202F](?=\d{3})/g, ''))
    : NaN;
}

/** One column while it grows. */
class Column {
  values = new Float64Array(1024);
  used = 0;
  numbers = 0;
  odd = 0;
  texts: string[] = [];

  put(value: number): void {
    if (this.used === this.values.length) {
      const larger = new Float64Array(2 * this.used);
      larger.set(this.values);
      this.values = larger;
    }
    this.values[this.used++] = value;
  }
}

/** Rows of cells on their way into columns. */
class TableBody {
  private readonly columns: Column[];
  private readonly oddCells: OddCell[] = [];
  private readonly notes: string[];
  private rows = 0;
  private shortRows = 0;
  private lastWasShort = false;

  constructor(
    private readonly layout: Layout,
    private readonly file: string,
  ) {
    if (layout.heads.length > LARGEST_HEADS) {
      throw refuse(file, 'head line', `${layout.heads.length} columns`, `at most ${LARGEST_HEADS} columns`);
    }
    this.notes = [...layout.notes];
    this.columns = layout.heads.map(() => new Column());
  }

  take(data: readonly (readonly string[])[]): void {
    for (const row of data) this.takeRow(row);
  }

  private takeRow(row: readonly string[]): void {
    const { heads, decimalComma } = this.layout;
    this.rows++;
    if (this.rows > LARGEST_ROWS) {
      throw refuse(this.file, '', `more than ${LARGEST_ROWS} rows`, `at most ${LARGEST_ROWS} rows`);
    }
    for (let i = heads.length; i < row.length; i++) {
      if (row[i].trim() !== '') {
        const hint =
          this.layout.delimiter === ',' ? ' (a decimal comma needs ";" or tab between columns)' : '';
        throw refuse(
          this.file,
          `row ${this.rows}`,
          `${row.length} cells`,
          `${heads.length} cells, as many as the head has${hint}`,
        );
      }
    }
    this.lastWasShort = row.length < heads.length;
    if (this.lastWasShort) this.shortRows++;
    for (let i = 0; i < heads.length; i++) this.takeCell(i, (row[i] ?? '').trim(), decimalComma);
  }

  private takeCell(i: number, cell: string, decimalComma: boolean): void {
    const column = this.columns[i];
    const value = cell === '' ? NaN : toNumber(cell, decimalComma);
    column.put(value);
    if (!Number.isNaN(value)) {
      column.numbers++;
      if (column.numbers === 1) column.texts = [];
    } else if (column.numbers === 0) {
      column.texts.push(cell);
    } else if (!EMPTY_CELL.test(cell)) {
      column.odd++;
      if (this.oddCells.length < MOST_ODD_CELLS) {
        this.oddCells.push({ row: this.rows, head: this.layout.heads[i], text: cell.slice(0, 60) });
      }
    }
  }

  finish(): Table {
    const { heads, delimiter, decimalComma, comments } = this.layout;
    // A log that was cut off ends in the middle of a row.
    if (this.lastWasShort && this.rows > 1) {
      this.rows--;
      this.shortRows--;
      this.notes.push('The last row is cut off and was left out.');
    }
    if (this.rows === 0) throw refuse(this.file, '', 'a head line alone', 'at least one row of numbers');
    if (this.shortRows > 0) this.notes.push(`${this.shortRows} rows have fewer cells than the head.`);
    const odd = this.columns.reduce((sum, column) => sum + column.odd, 0);
    if (odd > 0) {
      const { row, head, text } = this.oddCells[0];
      this.notes.push(`${odd} cells are no numbers, the first in row ${row}, ${head}: "${text}".`);
    }
    return {
      file: this.file,
      heads: [...heads],
      columns: this.columns.map((column) => column.values.subarray(0, this.rows)),
      texts: this.columns.map((column) => (column.numbers === 0 ? column.texts.slice(0, this.rows) : null)),
      rows: this.rows,
      comments: [...comments],
      delimiter,
      decimalComma,
      oddCells: this.oddCells,
      notes: this.notes,
    };
  }
}

/** Which column holds a quantity, and in which unit; a null unit: the head states none and none is needed. */
export interface ColumnChoice {
  readonly column: string;
  readonly unit: string | null;
  readonly sign?: 1 | -1;
}

/** Key of a quantity in a mapping: "thrust", or with an axis "gyro_roll". */
export type ColumnKey = Quantity | `${'gyro' | 'acceleration' | 'setpoint' | 'angle'}_${AxisName}`;
export type ColumnMapping = Partial<Record<ColumnKey, ColumnChoice>>;

/** The mapping the heads suggest: for each quantity the surest column that holds numbers. */
export function proposeMapping(table: Table): ColumnMapping {
  const mapping: Partial<Record<ColumnKey, ColumnChoice>> = {};
  const ranks = new Map<ColumnKey, number>();
  table.heads.forEach((head, i) => {
    const found = table.texts[i] === null ? recogniseHead(head) : null;
    if (found === null || found.corner !== null) return;
    const key = keyOf(found);
    const rank =
      found.rank + (table.columns[i].some((value) => value !== 0 && !Number.isNaN(value)) ? 0 : 10);
    if (rank >= (ranks.get(key) ?? Infinity)) return;
    ranks.set(key, rank);
    mapping[key] = { column: head, unit: found.unit };
  });
  return mapping;
}

function keyOf(found: RecognisedHead): ColumnKey {
  const { quantity, axis } = found;
  const perAxis =
    quantity === 'gyro' || quantity === 'acceleration' || quantity === 'setpoint' || quantity === 'angle';
  return perAxis && axis !== null ? `${quantity}_${axis}` : quantity;
}

/**
 * A column in SI (commands in µs or as a share).
 * @throws InputError when the column is not there, its unit does not fit, or it holds no number.
 */
export function columnInSI(table: Table, key: ColumnKey, choice: ColumnChoice): Float64Array {
  const index = table.heads.indexOf(choice.column);
  if (index === -1) {
    throw refuse(table.file, key, choice.column, `one of the columns ${table.heads.join(', ')}`);
  }
  if (table.texts[index] !== null) {
    throw refuse(table.file, `column ${choice.column}`, table.texts[index][0] ?? '', 'numbers');
  }
  const dimensions = DIMENSIONS[key.split('_')[0] as Quantity];
  let toSI = choice.sign ?? 1;
  let offset = 0;
  if (dimensions.length > 0) {
    const unit = choice.unit === null ? null : unitFor(choice.unit, dimensions);
    if (unit === null) {
      const where = choice.unit === null ? `column ${choice.column}` : `${key}, unit`;
      const value = choice.unit ?? 'a head without a unit';
      throw refuse(table.file, where, value, `a unit for ${key}: ${unitsOf(dimensions)}`);
    }
    toSI *= unit.toSI;
    offset = unit.offset * (choice.sign ?? 1);
  }
  return table.columns[index].map((value) => toSI * value + offset);
}
