/**
 * Flight record: one row a tick, as columns of typed arrays, and its CSV file: a `#` header that holds build,
 * gains, wind, scene, seed and version, then the columns of RECORD_SIGNALS.
 */
import type { Build } from '../craft/build.ts';
import type { Gains } from '../craft/gains.ts';
import type { Scene } from '../craft/scene.ts';
import type { Wind } from '../craft/wind.ts';
import type { Fault } from '../disturbance/faults.ts';
import { RECORD_SIGNALS, signalIndex } from './signals.ts';

export const RECORD_FORMAT = 'gustbench.record/1';
/** Version of the program, written into every record, sheet and result. */
export const VERSION = '0.1.0';

export interface RecordHeader {
  readonly build: Build;
  readonly gains: Gains;
  readonly wind: Wind;
  readonly scene: Scene;
  readonly seed: number;
  readonly faults: readonly Fault[];
  /** What stood before gains or wind were changed in flight, oldest first; the header's own are the last. */
  readonly earlier?: readonly EarlierSettings[];
}

/** Gains and wind of a part of the flight, up to a time. */
export interface EarlierSettings {
  readonly until_s: number;
  readonly gains: Gains;
  readonly wind: Wind;
}

/** Grows by doubling; rows are copied in, so a recorder may be shared with no one. */
export class Recorder {
  private columns: Float64Array[];
  private used = 0;
  private readonly places: number[];

  /** @param names signals to keep, by name */
  constructor(
    readonly names: readonly string[] = RECORD_SIGNALS,
    capacity = 4096,
  ) {
    this.places = names.map(signalIndex);
    this.columns = names.map(() => new Float64Array(capacity));
  }

  get length(): number {
    return this.used;
  }

  /** Takes one tick's row. */
  take(signals: Float64Array): void {
    if (this.used === this.columns[0].length) {
      this.columns = this.columns.map((old) => {
        const larger = new Float64Array(2 * old.length);
        larger.set(old);
        return larger;
      });
    }
    for (let i = 0; i < this.columns.length; i++) this.columns[i][this.used] = signals[this.places[i]];
    this.used++;
  }

  /** Forgets every row from `length` on. */
  truncate(length: number): void {
    this.used = Math.min(this.used, Math.max(0, length));
  }

  /** Forgets the oldest `count` rows. */
  dropOldest(count: number): void {
    const gone = Math.min(count, this.used);
    for (const column of this.columns) column.copyWithin(0, gone, this.used);
    this.used -= gone;
  }

  /** A column by signal name, as long as the record. @throws RangeError when it was not kept. */
  column(name: string): Float64Array {
    const index = this.names.indexOf(name);
    if (index === -1) throw new RangeError(`the record does not keep "${name}"`);
    return this.columns[index].subarray(0, this.used);
  }
}

/** Decimals per column, enough for what each is used for. */
function decimals(name: string): number {
  if (name === 't_s') return 6;
  if (name.startsWith('cmd_') || name.startsWith('speed_')) return 2;
  if (name.startsWith('q')) return 8;
  return 5;
}

function headerLines(header: RecordHeader): string[] {
  return [
    `# ${RECORD_FORMAT}`,
    `# version: ${VERSION}`,
    `# seed: ${header.seed}`,
    `# build: ${JSON.stringify(header.build)}`,
    `# gains: ${JSON.stringify(header.gains)}`,
    `# wind: ${JSON.stringify(header.wind)}`,
    `# scene: ${JSON.stringify(header.scene)}`,
    `# faults: ${JSON.stringify(header.faults)}`,
    ...(header.earlier ?? []).map(
      ({ until_s, gains, wind }) => `# until ${until_s.toFixed(6)} s: ${JSON.stringify({ gains, wind })}`,
    ),
  ];
}

/** The record as CSV text, in pieces of a few thousand rows so that a long one needs no single huge string. */
export function* recordCsv(record: Recorder, header: RecordHeader): Generator<string> {
  yield `${headerLines(header).join('\n')}\n${RECORD_SIGNALS.join(',')}\n`;
  const columns = RECORD_SIGNALS.map((name) => record.column(name));
  const places = RECORD_SIGNALS.map(decimals);
  let lines: string[] = [];
  for (let row = 0; row < record.length; row++) {
    lines.push(columns.map((column, i) => trimZeros(column[row].toFixed(places[i]))).join(','));
    if (lines.length === 2000) {
      yield `${lines.join('\n')}\n`;
      lines = [];
    }
  }
  if (lines.length > 0) yield `${lines.join('\n')}\n`;
}

function trimZeros(text: string): string {
  if (!text.includes('.')) return text;
  const short = text.replace(/\.?0+$/, '');
  return short === '-0' ? '0' : short;
}
