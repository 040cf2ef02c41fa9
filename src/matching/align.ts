/**
 * Time base of a log: row period, jitter, lost rows, pauses. Lost rows are put back at their estimated time
 * (without a rate), so that what follows sees every tick of the controller.
 */

/** Longest run of lost rows that is bridged; a longer one ends a stretch. */
const LONGEST_BRIDGE = 5;
/** Above this share of the period the rows are no regular sampling and nothing is put in. */
const IRREGULAR_SHARE = 0.45;
/** Weight of a new row in the tracked phase of the tick. */
const PHASE_BLEND = 0.02;
const PERIOD_SPAN = 8;
const PERIOD_QUANTILE = 0.25;

/** A run of rows without a pause. Index −1 in `row` marks a lost row that was put in. */
export interface Stretch {
  /** Row of the log, or −1. */
  readonly row: Int32Array;
  /** Times as logged (lost rows: on the regular grid), s. */
  readonly logged_s: Float64Array;
  /** Times on the regular grid fitted to the stretch, s. */
  readonly regular_s: Float64Array;
}

export interface TimeBase {
  /** Typical time from row to row, s. */
  readonly period_s: number;
  /** Standard deviation of the time stamps about the regular grid, s. */
  readonly jitter_s: number;
  readonly lostRows: number;
  /** Rows do not follow a regular tick; only the logged times can be used. */
  readonly irregular: boolean;
  readonly stretches: readonly Stretch[];
}

/**
 * Finds the time base of rising times.
 * @param t_s rising, at least 32 values
 */
export function findTimeBase(t_s: Float64Array): TimeBase {
  const period_s = typicalPeriod_s(t_s);
  const index = tickIndices(t_s, period_s, PHASE_BLEND);
  const stretches: Stretch[] = [];
  let lostRows = 0;
  let square = 0;
  let count = 0;
  let begin = 0;
  for (let k = 1; k <= t_s.length; k++) {
    const ends = k === t_s.length || index[k] - index[k - 1] > LONGEST_BRIDGE + 1;
    if (!ends) continue;
    if (k - begin >= 32) {
      const stretch = bridge(t_s, index, begin, k);
      stretches.push(stretch);
      for (let j = 0; j < stretch.row.length; j++) {
        if (stretch.row[j] === -1) lostRows++;
        else {
          square += (stretch.logged_s[j] - stretch.regular_s[j]) ** 2;
          count++;
        }
      }
    }
    begin = k;
  }
  const jitter_s = count > 0 ? Math.sqrt(square / count) : 0;
  const irregular = jitter_s > IRREGULAR_SHARE * period_s;
  return {
    period_s,
    jitter_s,
    lostRows: irregular ? 0 : lostRows,
    irregular,
    stretches: irregular ? stretches.map(withoutBridges) : stretches,
  };
}

/**
 * First by a low quantile over spans of several rows, which neither jitter nor lost rows move much; then by
 * the ticks counted along the log.
 */
function typicalPeriod_s(t_s: Float64Array): number {
  const span = Math.min(PERIOD_SPAN, Math.floor(t_s.length / 4));
  const count = Math.min(20_000, t_s.length - span);
  const stride = (t_s.length - span) / count;
  const periods = Float64Array.from({ length: count }, (_, i) => {
    const k = Math.floor(i * stride);
    return (t_s[k + span] - t_s[k]) / span;
  }).sort();
  let period_s = periods[Math.floor(count * PERIOD_QUANTILE)];
  for (const blend of [0.1, PHASE_BLEND]) period_s = refinedPeriod_s(t_s, tickIndices(t_s, period_s, blend));
  return period_s;
}

/** Time over ticks, pauses left out. */
function refinedPeriod_s(t_s: Float64Array, index: Float64Array): number {
  let time = 0;
  let ticks = 0;
  for (let k = 1; k < t_s.length; k++) {
    const step = index[k] - index[k - 1];
    if (step > LONGEST_BRIDGE + 1) continue;
    time += t_s[k] - t_s[k - 1];
    ticks += step;
  }
  return time / ticks;
}

/** Number of the controller's tick for each row, by a phase that is tracked along the log. */
function tickIndices(t_s: Float64Array, period_s: number, blend: number): Float64Array {
  const index = new Float64Array(t_s.length);
  let phase = t_s[0];
  for (let k = 1; k < t_s.length; k++) {
    const ticks = Math.max(1, Math.round((t_s[k] - phase) / period_s));
    index[k] = index[k - 1] + ticks;
    phase += ticks * period_s;
    // After a pause the clock starts anew.
    phase += (ticks > LONGEST_BRIDGE + 1 ? 1 : blend) * (t_s[k] - phase);
  }
  return index;
}

/** Rows `begin` to before `end` with the lost ones put in, and a line fitted through (tick, time). */
function bridge(t_s: Float64Array, index: Float64Array, begin: number, end: number): Stretch {
  const length = index[end - 1] - index[begin] + 1;
  const row = new Int32Array(length).fill(-1);
  const logged_s = new Float64Array(length);
  const regular_s = new Float64Array(length);
  const n = end - begin;
  let meanI = 0;
  let meanT = 0;
  for (let k = begin; k < end; k++) {
    meanI += (index[k] - index[begin]) / n;
    meanT += (t_s[k] - t_s[begin]) / n;
  }
  let sii = 0;
  let sit = 0;
  for (let k = begin; k < end; k++) {
    const i = index[k] - index[begin] - meanI;
    sii += i * i;
    sit += i * (t_s[k] - t_s[begin] - meanT);
  }
  const slope = sit / sii;
  for (let i = 0; i < length; i++) regular_s[i] = t_s[begin] + meanT + slope * (i - meanI);
  logged_s.set(regular_s);
  for (let k = begin; k < end; k++) {
    const i = index[k] - index[begin];
    row[i] = k;
    logged_s[i] = t_s[k];
  }
  keepRising(logged_s, row);
  return { row, logged_s, regular_s };
}

/** A put-in row must lie between its neighbours even when those jitter. */
function keepRising(logged_s: Float64Array, row: Int32Array): void {
  for (let i = 1; i < row.length - 1; i++) {
    if (row[i] !== -1) continue;
    let next = i;
    while (row[next] === -1) next++;
    const share = 1 / (next - i + 1);
    if (logged_s[i] <= logged_s[i - 1] || logged_s[i] >= logged_s[next]) {
      logged_s[i] = logged_s[i - 1] + share * (logged_s[next] - logged_s[i - 1]);
    }
  }
}

function withoutBridges(stretch: Stretch): Stretch {
  const kept = Array.from(stretch.row.keys()).filter((i) => stretch.row[i] !== -1);
  const logged_s = Float64Array.from(kept, (i) => stretch.logged_s[i]);
  return { row: Int32Array.from(kept, (i) => stretch.row[i]), logged_s, regular_s: logged_s };
}
