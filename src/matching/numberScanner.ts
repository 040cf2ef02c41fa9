/**
 * Fast reader of delimited numbers from bytes: only the wanted columns of each line become numbers, nothing
 * becomes a string. A general CSV reader would make hundreds of millions of strings of a 300 MB log.
 */

const NEWLINE = 10;
const RETURN = 13;
const SPACE = 32;
const TAB = 9;
const QUOTE = 34;
const HASH = 35;
const PLUS = 43;
const MINUS = 45;
const ZERO = 48;
const NINE = 57;
const UPPER_E = 69;
const LOWER_E = 101;
/** A mantissa below this takes one more digit without loss. */
const FULL_MANTISSA = 9e14;
const POWERS = Float64Array.from({ length: 309 }, (_, i) => Number(`1e${i}`));

export interface RowSink {
  /** Takes the wanted numbers of one line, in the order wanted; NaN where there was no number. */
  take(values: Float64Array): void;
}

export class NumberScanner {
  private rest = new Uint8Array(0);
  private readonly slotOf: Int32Array;
  private readonly values: Float64Array;
  private readonly last: number;

  /**
   * @param wanted places of the columns, from 0
   * @param delimiter byte between columns
   * @param decimal byte of the decimal sign
   */
  constructor(
    wanted: readonly number[],
    private readonly delimiter: number,
    private readonly decimal: number,
    private readonly sink: RowSink,
  ) {
    this.last = Math.max(...wanted);
    this.slotOf = new Int32Array(this.last + 1).fill(-1);
    wanted.forEach((place, slot) => {
      this.slotOf[place] = slot;
    });
    this.values = new Float64Array(wanted.length);
  }

  /** Takes the next bytes; a line that is not complete waits for more. */
  push(chunk: Uint8Array): void {
    let bytes = chunk;
    if (this.rest.length > 0) {
      bytes = new Uint8Array(this.rest.length + chunk.length);
      bytes.set(this.rest);
      bytes.set(chunk, this.rest.length);
    }
    const end = bytes.lastIndexOf(NEWLINE) + 1;
    this.scan(bytes, end);
    this.rest = bytes.slice(end);
  }

  /** The last line may lack its newline. */
  finish(): void {
    if (this.rest.length === 0) return;
    const line = new Uint8Array(this.rest.length + 1);
    line.set(this.rest);
    line[this.rest.length] = NEWLINE;
    this.rest = new Uint8Array(0);
    this.scan(line, line.length);
  }

  /** Bytes of the line that waits: a log of lines stays far below what a binary file reaches. */
  get waiting(): number {
    return this.rest.length;
  }

  private scan(bytes: Uint8Array, end: number): void {
    const { delimiter, values, slotOf, last, sink } = this;
    let at = 0;
    while (at < end) {
      const first = bytes[at];
      if (first === NEWLINE || first === RETURN) {
        at++;
        continue;
      }
      if (first === HASH) {
        at = bytes.indexOf(NEWLINE, at) + 1;
        continue;
      }
      values.fill(NaN);
      let column = 0;
      while (column <= last) {
        const slot = slotOf[column];
        if (slot >= 0) at = this.number(bytes, at, slot);
        let byte = bytes[at];
        while (byte !== delimiter && byte !== NEWLINE) byte = bytes[++at];
        if (byte === NEWLINE) break;
        at++;
        column++;
      }
      if (bytes[at] !== NEWLINE) at = bytes.indexOf(NEWLINE, at);
      at++;
      sink.take(values);
    }
  }

  /** Number at `at` into its slot; NaN stays when the cell is anything else. @returns place after it */
  private number(bytes: Uint8Array, start: number, slot: number): number {
    const { decimal, delimiter } = this;
    let at = start;
    let byte = bytes[at];
    while ((byte === SPACE || byte === QUOTE || byte === TAB) && byte !== delimiter) byte = bytes[++at];
    let sign = 1;
    if (byte === MINUS) {
      sign = -1;
      byte = bytes[++at];
    } else if (byte === PLUS) byte = bytes[++at];
    let mantissa = 0;
    let exponent = 0;
    let digits = 0;
    while (byte >= ZERO && byte <= NINE) {
      if (mantissa < FULL_MANTISSA) mantissa = 10 * mantissa + (byte - ZERO);
      else exponent++;
      digits++;
      byte = bytes[++at];
    }
    if (byte === decimal) {
      byte = bytes[++at];
      while (byte >= ZERO && byte <= NINE) {
        if (mantissa < FULL_MANTISSA) {
          mantissa = 10 * mantissa + (byte - ZERO);
          exponent--;
        }
        digits++;
        byte = bytes[++at];
      }
    }
    if (digits === 0) return at;
    if (byte === LOWER_E || byte === UPPER_E) {
      byte = bytes[++at];
      let down = false;
      if (byte === MINUS || byte === PLUS) {
        down = byte === MINUS;
        byte = bytes[++at];
      }
      let power = 0;
      let powerDigits = 0;
      while (byte >= ZERO && byte <= NINE) {
        if (power < 1000) power = 10 * power + (byte - ZERO);
        powerDigits++;
        byte = bytes[++at];
      }
      if (powerDigits === 0) return at;
      exponent += down ? -power : power;
    }
    while ((byte === SPACE || byte === QUOTE || byte === RETURN || byte === TAB) && byte !== delimiter) {
      byte = bytes[++at];
    }
    // Anything left in the cell makes it no number.
    if (byte === delimiter || byte === NEWLINE) this.values[slot] = sign * scaled(mantissa, exponent);
    return at;
  }
}

function scaled(mantissa: number, exponent: number): number {
  if (exponent === 0) return mantissa;
  if (exponent > 0) return exponent > 308 ? (mantissa === 0 ? 0 : NaN) : mantissa * POWERS[exponent];
  return exponent < -308 ? 0 : mantissa / POWERS[-exponent];
}
