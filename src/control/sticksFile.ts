/**
 * Sticks file: CSV with the columns t_s, roll, pitch, yaw (−1…1) and throttle (0…1). Between rows the sticks
 * move linearly, before the first and after the last they hold.
 */
import Papa from 'papaparse';
import { refuse } from '../craft/problem.ts';

const COLUMNS = [
  ['t_s', 0, 86_400],
  ['roll', -1, 1],
  ['pitch', -1, 1],
  ['yaw', -1, 1],
  ['throttle', 0, 1],
] as const;

export interface StickTrack {
  readonly t_s: Float64Array;
  readonly roll: Float64Array;
  readonly pitch: Float64Array;
  readonly yaw: Float64Array;
  readonly throttle: Float64Array;
}

export interface StickPosition {
  roll: number;
  pitch: number;
  yaw: number;
  throttle: number;
}

/**
 * Reads a sticks file.
 * @throws InputError naming row and column, the value and what is allowed.
 */
export function parseSticks(text: string, file = 'sticks'): StickTrack {
  const { data, meta } = Papa.parse<string[]>(text.replace(/^\uFEFF/, ''), {
    comments: '#',
    skipEmptyLines: 'greedy',
  });
  if (data.length === 0)
    throw refuse(file, '', 'nothing', `a head line ${COLUMNS.map(([name]) => name).join(', ')} and rows`);
  const heads = data[0].map((head) => head.trim());
  const places = COLUMNS.map(([name]) => {
    const place = heads.indexOf(name);
    if (place === -1) {
      throw refuse(file, name, heads.join(meta.delimiter), `a column of this name among the heads`);
    }
    return place;
  });
  const rows = data.slice(1);
  if (rows.length === 0) throw refuse(file, '', 'a head line alone', 'at least one row');
  const tracks = COLUMNS.map(() => new Float64Array(rows.length));
  rows.forEach((row, index) => {
    COLUMNS.forEach(([name, min, max], c) => {
      const cell = (row[places[c]] ?? '').trim();
      const value = cell === '' ? NaN : Number(cell);
      if (!Number.isFinite(value) || value < min || value > max) {
        throw refuse(
          file,
          `row ${index + 1}, ${name}`,
          cell === '' ? undefined : cell,
          `a number from ${min} to ${max}`,
        );
      }
      tracks[c][index] = value;
    });
    if (index > 0 && tracks[0][index] <= tracks[0][index - 1]) {
      throw refuse(
        file,
        `row ${index + 1}, t_s`,
        tracks[0][index],
        `a time after the row before, ${tracks[0][index - 1]} s`,
      );
    }
  });
  const [t_s, roll, pitch, yaw, throttle] = tracks;
  return { t_s, roll, pitch, yaw, throttle };
}

/** Walks along a track in rising time, filling one object; allocates nothing. */
export class StickPlayer {
  private row = 0;

  constructor(private readonly track: StickTrack) {}

  /** Sticks at `time_s`, which must not fall from call to call. */
  at(time_s: number, into: StickPosition): void {
    const { t_s, roll, pitch, yaw, throttle } = this.track;
    const last = t_s.length - 1;
    while (this.row < last && t_s[this.row + 1] <= time_s) this.row++;
    const a = this.row;
    const b = Math.min(a + 1, last);
    const span = t_s[b] - t_s[a];
    const share = span > 0 ? Math.max(0, Math.min(1, (time_s - t_s[a]) / span)) : 0;
    into.roll = roll[a] + share * (roll[b] - roll[a]);
    into.pitch = pitch[a] + share * (pitch[b] - pitch[a]);
    into.yaw = yaw[a] + share * (yaw[b] - yaw[a]);
    into.throttle = throttle[a] + share * (throttle[b] - throttle[a]);
  }
}
