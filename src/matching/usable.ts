/**
 * Which rows of a log can be used: airborne, motors not at their limits, no pause. And for one axis, which of
 * those carry its manoeuvres. Everything left out has its reason.
 */
import type { Build } from '../craft/build.ts';
import type { Stretch, TimeBase } from './align.ts';
import { motorCommands_us } from './axisCommand.ts';
import type { Column, FlightLog } from './log.ts';

export type LeftOutReason =
  'on the ground' | 'motors at their limits' | 'pause in the log' | 'too short' | 'quiet';

export interface LeftOut {
  readonly from_s: number;
  readonly to_s: number;
  readonly reason: LeftOutReason;
}

/** Rows `begin` to before `end` of a stretch. */
export interface Span {
  readonly stretch: Stretch;
  readonly begin: number;
  readonly end: number;
}

export interface UsableRows {
  readonly spans: readonly Span[];
  readonly leftOut: readonly LeftOut[];
  readonly usable_s: number;
  /** Share of airborne rows with a motor at its limit. */
  readonly saturatedShare: number;
  /** The log says nothing of motors or throttle, so all of it was taken as flown. */
  readonly airborneUnknown: boolean;
}

const SHORTEST_SPAN_S = 2;
/** Lift-off and landing are kept off. */
const GROUND_MARGIN_S = 0.5;
/** Shorter than this at a limit is let pass: a spike of the derivative. */
const SHORT_LIMIT_S = 0.015;
const LIMIT_MARGIN_S = 0.05;
/** Above idle by this share of the way to hover the craft is taken as flying; common practice, no source. */
const FLYING_SHARE = 0.25;

/**
 * Finds the usable rows.
 * @param hoverCommand_us mean motor command of the build's hover
 */
export function usableRows(
  log: FlightLog,
  base: TimeBase,
  build: Build,
  hoverCommand_us: number,
): UsableRows {
  const motors = motorCommands_us(log);
  const flying = flyingRows(log, motors, build, hoverCommand_us);
  const limited = motors === null ? axisLimits(log) : motorLimits(motors, build);
  const spans: Span[] = [];
  const leftOut: LeftOut[] = [];
  let airborne = 0;
  let saturated = 0;
  const per_s = 1 / base.period_s;
  base.stretches.forEach((stretch, index) => {
    const length = stretch.row.length;
    const grounded = marks(stretch, (row) => flying !== null && flying[row] === 0);
    widen(grounded, Math.round(GROUND_MARGIN_S * per_s), 1);
    const atLimit = marks(stretch, (row) => limited !== null && limited[row] !== 0);
    for (let i = 0; i < length; i++) {
      if (grounded[i] !== 0) continue;
      airborne++;
      saturated += atLimit[i];
    }
    widen(atLimit, Math.round(LIMIT_MARGIN_S * per_s), Math.max(2, Math.round(SHORT_LIMIT_S * per_s)));
    const before = base.stretches[index - 1];
    if (before !== undefined) {
      leftOut.push({
        from_s: before.logged_s[before.row.length - 1],
        to_s: stretch.logged_s[0],
        reason: 'pause in the log',
      });
    }
    cut(stretch, grounded, atLimit, spans, leftOut);
  });
  return {
    spans,
    leftOut,
    usable_s: spans.reduce((sum, span) => sum + spanSeconds(span), 0),
    saturatedShare: airborne > 0 ? saturated / airborne : 0,
    airborneUnknown: flying === null,
  };
}

export function spanSeconds(span: Span): number {
  return span.stretch.logged_s[span.end - 1] - span.stretch.logged_s[span.begin];
}

function flyingRows(
  log: FlightLog,
  motors: Column[] | null,
  build: Build,
  hover_us: number,
): Uint8Array | null {
  const { min_us, max_us, idle_us } = build.esc;
  const least_us = idle_us + FLYING_SHARE * (hover_us - idle_us);
  const n = log.t_s.length;
  const out = new Uint8Array(n);
  if (motors !== null) {
    const [a, b, c, d] = motors;
    for (let k = 0; k < n; k++) out[k] = (a[k] + b[k] + c[k] + d[k]) / 4 > least_us ? 1 : 0;
    return out;
  }
  const { throttle } = log;
  if (throttle === undefined) return null;
  const least = (least_us - min_us) / (max_us - min_us);
  for (let k = 0; k < n; k++) out[k] = throttle[k] > least ? 1 : 0;
  return out;
}

/** A motor at idle or full, within the ESC's resolution. */
function motorLimits(motors: readonly Column[], build: Build): Uint8Array {
  const margin_us = build.esc.resolution_us / 2 + 0.25;
  const low = build.esc.idle_us + margin_us;
  const high = build.esc.max_us - margin_us;
  const out = new Uint8Array(motors[0].length);
  for (const motor of motors) {
    for (let k = 0; k < out.length; k++) if (motor[k] <= low || motor[k] >= high) out[k] = 1;
  }
  return out;
}

/** Without motor commands a limit shows as the axis command's largest value, held again and again. */
function axisLimits(log: FlightLog): Uint8Array | null {
  const commands = Object.values(log.axisCommand_us);
  const out = new Uint8Array(log.t_s.length);
  let found = false;
  for (const u of commands) {
    let most = 0;
    for (const value of u) most = Math.max(most, Math.abs(value));
    let held = 0;
    for (const value of u) if (Math.abs(value) === most) held++;
    if (held < 20 || held > 0.3 * u.length) continue;
    found = true;
    for (let k = 0; k < u.length; k++) if (Math.abs(u[k]) === most) out[k] = 1;
  }
  return found ? out : null;
}

/** 1 where `is` holds; a lost row follows the one before it. */
function marks(stretch: Stretch, is: (row: number) => boolean): Uint8Array {
  const out = new Uint8Array(stretch.row.length);
  for (let i = 0; i < out.length; i++) {
    const row = stretch.row[i];
    out[i] = row >= 0 ? (is(row) ? 1 : 0) : i > 0 ? out[i - 1] : 0;
  }
  return out;
}

/** Drops marked runs shorter than `least` rows and widens the others by `margin` rows on both sides. */
function widen(flags: Uint8Array, margin: number, least: number): void {
  const n = flags.length;
  const runs: [begin: number, end: number][] = [];
  for (let i = 0; i < n; i++) {
    if (flags[i] === 0) continue;
    let end = i;
    while (end < n && flags[end] !== 0) end++;
    if (end - i >= least) runs.push([i, end]);
    i = end;
  }
  flags.fill(0);
  for (const [begin, end] of runs) flags.fill(1, Math.max(0, begin - margin), Math.min(n, end + margin));
}

function cut(
  stretch: Stretch,
  grounded: Uint8Array,
  atLimit: Uint8Array,
  spans: Span[],
  leftOut: LeftOut[],
): void {
  const { logged_s } = stretch;
  const n = logged_s.length;
  const stateAt = (i: number): LeftOutReason | null =>
    grounded[i] !== 0 ? 'on the ground' : atLimit[i] !== 0 ? 'motors at their limits' : null;
  let begin = 0;
  for (let i = 1; i <= n; i++) {
    if (i < n && stateAt(i) === stateAt(begin)) continue;
    const reason = stateAt(begin);
    const from_s = logged_s[begin];
    const to_s = logged_s[i - 1];
    if (reason !== null) leftOut.push({ from_s, to_s, reason });
    else if (to_s - from_s < SHORTEST_SPAN_S) leftOut.push({ from_s, to_s, reason: 'too short' });
    else spans.push({ stretch, begin, end: i });
    begin = i;
  }
}

const BLOCK_S = 0.5;
const CONTEXT_BLOCKS = 3;
const LONGEST_GAP_BLOCKS = 6;
/** A block counts as active above this share of the liveliest blocks' level. */
const ACTIVE_SHARE = 0.15;

/**
 * The parts of `spans` in which `signal` moves, with what comes just before and after, at most `mostRows`.
 * @returns the parts and what was left quiet
 */
export function activeSpans(
  spans: readonly Span[],
  signal: ArrayLike<number>,
  period_s: number,
  mostRows: number,
): { spans: Span[]; leftOut: LeftOut[] } {
  const block = Math.max(8, Math.round(BLOCK_S / period_s));
  const levels = spans.map((span) => blockLevels(span, signal, block));
  const sorted = levels.flat().sort((a, b) => b - a);
  const lively = sorted[Math.floor(sorted.length * 0.1)] ?? 0;
  const fits = Math.max(4, Math.floor(mostRows / block / 2));
  const threshold = Math.max(ACTIVE_SHARE * lively, sorted[Math.min(sorted.length - 1, fits)] ?? 0, 1e-9);
  const out: Span[] = [];
  const leftOut: LeftOut[] = [];
  let rows = 0;
  spans.forEach((span, s) => {
    const active = Uint8Array.from(levels[s], (level) => (level >= threshold ? 1 : 0));
    widen(active, CONTEXT_BLOCKS, 1);
    closeGaps(active, LONGEST_GAP_BLOCKS);
    let begin = 0;
    for (let i = 1; i <= active.length; i++) {
      if (i < active.length && active[i] === active[begin]) continue;
      const first = span.begin + begin * block;
      const end = i === active.length ? span.end : span.begin + i * block;
      const piece = { stretch: span.stretch, begin: first, end };
      if (active[begin] !== 0 && spanSeconds(piece) >= SHORTEST_SPAN_S && rows < mostRows) {
        rows += end - first;
        out.push(piece);
      } else {
        const { logged_s } = span.stretch;
        leftOut.push({ from_s: logged_s[first], to_s: logged_s[end - 1], reason: 'quiet' });
      }
      begin = i;
    }
  });
  return { spans: out, leftOut };
}

function blockLevels(span: Span, signal: ArrayLike<number>, block: number): number[] {
  const levels: number[] = [];
  for (let i = span.begin; i < span.end; i += block) {
    const end = Math.min(span.end, i + block);
    let sum = 0;
    let square = 0;
    let n = 0;
    for (let k = i; k < end; k++) {
      const row = span.stretch.row[k];
      if (row < 0) continue;
      sum += signal[row];
      square += signal[row] ** 2;
      n++;
    }
    levels.push(n > 1 ? Math.sqrt(Math.max(0, square / n - (sum / n) ** 2)) : 0);
  }
  return levels;
}

function closeGaps(flags: Uint8Array, longest: number): void {
  let last = -1;
  for (let i = 0; i < flags.length; i++) {
    if (flags[i] === 0) continue;
    if (last !== -1 && i - last - 1 <= longest) flags.fill(1, last, i);
    last = i;
  }
}

/** Splits spans in time: `share` of their seconds first, the rest behind. */
export function splitSpans(spans: readonly Span[], share: number): { first: Span[]; rest: Span[] } {
  let left = share * spans.reduce((sum, span) => sum + spanSeconds(span), 0);
  const first: Span[] = [];
  const rest: Span[] = [];
  for (const span of spans) {
    const seconds = spanSeconds(span);
    if (left >= seconds - SHORTEST_SPAN_S / 2) first.push(span);
    else if (left < SHORTEST_SPAN_S / 2) rest.push(span);
    else {
      const middle = span.begin + Math.round(((span.end - span.begin) * left) / seconds);
      first.push({ ...span, end: middle });
      rest.push({ ...span, begin: middle });
    }
    left -= seconds;
  }
  return { first, rest };
}
