/**
 * Time stamps as logged to rising seconds: counters of 16 or 32 bits that wrapped are unrolled, repeated rows
 * dropped; a time that falls otherwise is the log's fault and said so.
 */
import { refuse } from '../craft/problem.ts';

/** A fall from above this share of a counter's range to below the rest of it is a wrap. */
const WRAP_SHARE = 0.5;
const MOST_REPEATED_SHARE = 0.2;
/** A step longer than this is not one flight. */
const LONGEST_PAUSE_S = 3600;

export interface RisingTimes {
  /** From 0. */
  readonly t_s: Float64Array;
  /** Rows kept, when some were dropped. */
  readonly kept: Int32Array | null;
  readonly remarks: readonly string[];
}

/**
 * @param raw as logged, overwritten
 * @param unit_s seconds per unit
 * @throws InputError when time falls, stands still or jumps by an hour.
 */
export function risingTimes(raw: Float64Array, unit_s: number, file: string): RisingTimes {
  const n = raw.length;
  const remarks: string[] = [];
  const wraps = unwrap(raw, file);
  if (wraps.count > 0) {
    remarks.push(`The ${wraps.bits}-bit time counter wrapped ${wraps.count} times and was unrolled.`);
  }
  let repeated = 0;
  for (let k = 1; k < n; k++) if (raw[k] === raw[k - 1]) repeated++;
  if (repeated > MOST_REPEATED_SHARE * n) {
    throw refuse(
      file,
      't',
      repeated === n - 1
        ? `${raw[0]} in every row`
        : `${repeated} of ${n} rows with the time of the row before`,
      'a time that rises from row to row',
    );
  }
  let kept: Int32Array | null = null;
  if (repeated > 0) {
    kept = new Int32Array(n - repeated);
    let at = 0;
    for (let k = 0; k < n; k++) if (k === 0 || raw[k] !== raw[k - 1]) kept[at++] = k;
    remarks.push(`${repeated} rows repeated the time of the row before and were left out.`);
  }
  const length = kept === null ? n : kept.length;
  const t_s = new Float64Array(length);
  for (let i = 0; i < length; i++) {
    t_s[i] = (raw[kept === null ? i : kept[i]] - raw[0]) * unit_s;
    if (i > 0 && t_s[i] - t_s[i - 1] > LONGEST_PAUSE_S) {
      throw refuse(
        file,
        `row ${(kept === null ? i : kept[i]) + 1}, t`,
        `${(t_s[i] - t_s[i - 1]).toPrecision(4)} s after the row before`,
        `pauses of at most ${LONGEST_PAUSE_S} s (is the unit of the time right?)`,
      );
    }
  }
  return { t_s, kept, remarks };
}

function unwrap(raw: Float64Array, file: string): { count: number; bits: number } {
  let most = 0;
  let whole = true;
  for (const value of raw) {
    if (value > most) most = value;
    if (value < 0 || !Number.isInteger(value)) whole = false;
  }
  const bits = most < 2 ** 16 ? 16 : 32;
  const range = 2 ** bits;
  const canWrap = whole && most < range && most > WRAP_SHARE * range;
  let add = 0;
  let count = 0;
  let before = raw[0];
  for (let k = 1; k < raw.length; k++) {
    const value = raw[k];
    if (value < before) {
      const isWrap = canWrap && before > WRAP_SHARE * range && value < (1 - WRAP_SHARE) * range;
      if (!isWrap) {
        throw refuse(file, `row ${k + 1}, t`, value, `a time not before that of the row before, ${before}`);
      }
      add += range;
      count++;
    }
    before = value;
    raw[k] = value + add;
  }
  return { count, bits };
}
