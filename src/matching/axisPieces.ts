/** Rows of a stretch to the pieces of one axis: lost rows get a command between their neighbours and its error. */
import type { Stretch } from './align.ts';
import type { AxisPiece } from './axisData.ts';

/** Rows looked at to learn how wrong a put-in command is. */
const SAMPLE_ROWS = 20_000;

/**
 * Axis pieces of rows `begin` to before `end` of a stretch.
 * @param times the stretch's logged or regular times
 * @param command how the command went on between rows: held, or changing in ticks that were not logged
 */
export function axisPiece(
  stretch: Stretch,
  times: Float64Array,
  begin: number,
  end: number,
  u_us: ArrayLike<number>,
  y_dps: ArrayLike<number>,
  command: 'held' | 'between' = 'held',
): AxisPiece {
  const n = end - begin;
  const piece = {
    t_s: times.slice(begin, end),
    u_us: new Float64Array(n),
    y_dps: new Float64Array(n).fill(NaN),
    uError_us: new Float64Array(n),
  };
  for (let i = 0; i < n; i++) {
    const row = stretch.row[begin + i];
    if (row < 0) continue;
    piece.u_us[i] = u_us[row];
    piece.y_dps[i] = y_dps[row];
  }
  putInCommands(piece);
  if (command === 'between') meanToNext(piece.u_us);
  return piece;
}

/** What acts from row to row where the controller ran on between the rows: the mean of the two commands. */
function meanToNext(u_us: Float64Array): void {
  for (let k = 0; k + 1 < u_us.length; k++) u_us[k] = (u_us[k] + u_us[k + 1]) / 2;
}

function putInCommands(piece: { u_us: Float64Array; y_dps: Float64Array; uError_us: Float64Array }): void {
  const { u_us, y_dps, uError_us } = piece;
  const n = u_us.length;
  const usual_us = usualError_us(u_us, y_dps);
  for (let i = 0; i < n; i++) {
    if (!Number.isNaN(y_dps[i])) continue;
    let next = i;
    while (next < n && Number.isNaN(y_dps[next])) next++;
    const before = i > 0 ? u_us[i - 1] : u_us[next];
    const after = next < n ? u_us[next] : before;
    const jump = Math.abs(after - before);
    for (let k = i; k < next; k++) {
      u_us[k] = before + ((after - before) * (k - i + 1)) / (next - i + 1);
      // A step in the command may have come in any of the lost rows: half of it is the error then.
      uError_us[k] = Math.max(usual_us, jump / 2, 1e-3);
    }
    i = next;
  }
}

/** Median error of the mean of two neighbours against the row between them, as a standard deviation. */
function usualError_us(u_us: Float64Array, y_dps: Float64Array): number {
  const errors: number[] = [];
  const stride = Math.max(1, Math.floor(u_us.length / SAMPLE_ROWS));
  for (let k = 1; k + 1 < u_us.length; k += stride) {
    if (Number.isNaN(y_dps[k - 1] + y_dps[k] + y_dps[k + 1])) continue;
    errors.push(Math.abs(u_us[k] - (u_us[k - 1] + u_us[k + 1]) / 2));
  }
  if (errors.length === 0) return 0;
  errors.sort((a, b) => a - b);
  return errors[errors.length >> 1] / 0.6745;
}
