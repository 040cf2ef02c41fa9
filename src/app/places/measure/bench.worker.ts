/** Bench files to fitted quantities, beside the page. */
import { InputError, type Problem } from '../../../craft/problem.ts';
import type { Measurement } from '../../../measuring/buildFromMeasurements.ts';
import {
  columnInSI,
  proposeMapping,
  readTable,
  type ColumnMapping,
  type Table,
} from '../../../measuring/columns.ts';
import { timeBase } from '../../../measuring/sampling.ts';
import { analyseSpinup, joinSpinup, type SpinupResult } from '../../../measuring/spinup.ts';
import { analyseStand } from '../../../measuring/stand.ts';
import { analyseStill, joinStill } from '../../../measuring/still.ts';
import { analyseSwing, joinSwings } from '../../../measuring/swing.ts';
import { readSwing } from '../../../measuring/swingFile.ts';
import { KEYS_OF, shapeOf, type RememberedShape } from './columnMemory.ts';
import type { BenchKind } from './kinds.ts';

/** What the four benches give. */
export type BenchResult = Extract<Measurement, { measurement: BenchKind }>;

export interface ToBenchWorker {
  readonly kind: BenchKind;
  readonly files: readonly File[];
  /** As corrected by the user; null: as remembered for this shape, or as the heads say. */
  readonly mapping: ColumnMapping | null;
  readonly remembered: readonly RememberedShape[];
  readonly diameter_m: number;
  readonly elevation_m: number;
  /** Magnet poles, for a column of electrical speed. */
  readonly poles: number;
}

/** The columns of the first file and what they were taken for. */
export interface Looked {
  readonly heads: readonly string[];
  readonly mapping: ColumnMapping;
  readonly from: 'heads' | 'memory' | 'user';
}

/** A recording with the fitted steps over it, thinned for a plot. */
export interface SpinTrace {
  readonly file: string;
  readonly time_s: Float64Array;
  readonly speed_rpm: Float64Array;
  readonly fitTime_s: Float64Array;
  readonly fit_rpm: Float64Array;
}

export type FromBenchWorker =
  | {
      readonly kind: 'done';
      readonly result: BenchResult;
      readonly looked: Looked | null;
      readonly traces: readonly SpinTrace[];
    }
  | {
      readonly kind: 'refused';
      readonly file: string;
      readonly problems: readonly Problem[];
      readonly looked: Looked | null;
    };

const RPM = 60 / (2 * Math.PI);
const MOST_POINTS = 4000;
/** Of a fitted step: points drawn, and how long after the onset in lags. */
const FIT_POINTS = 60;
const FIT_LAGS = 8;

self.onmessage = ({ data }: MessageEvent<ToBenchWorker>) => {
  void new Bench(data).answer().then((answer) => self.postMessage(answer));
};

class Bench {
  private looked: Looked | null = null;
  private traces: SpinTrace[] = [];

  constructor(private readonly task: ToBenchWorker) {}

  async answer(): Promise<FromBenchWorker> {
    try {
      const result = await this.analyse();
      return { kind: 'done', result, looked: this.looked, traces: this.traces };
    } catch (error) {
      const { looked } = this;
      if (error instanceof InputError)
        return { kind: 'refused', file: error.file, problems: error.problems, looked };
      const problem = {
        path: '',
        value: error instanceof Error ? error.message : '',
        allowed: 'a readable file',
      };
      return { kind: 'refused', file: this.task.files[0]?.name ?? '', problems: [problem], looked };
    }
  }

  private async analyse(): Promise<BenchResult> {
    const { kind, files } = this.task;
    if (kind === 'swing') {
      const texts = await Promise.all(files.map((file) => file.text()));
      return joinSwings(files.flatMap(({ name }, i) => analyseSwing(readSwing(texts[i], name), name).tests));
    }
    const tables: Table[] = [];
    // One after the other: the text of one file at a time is in memory.
    for (const file of files) tables.push(readTable(await file.text(), file.name));
    const mapping = this.mappingOf(kind, tables[0]);
    const { diameter_m, elevation_m, poles } = this.task;
    if (kind === 'stand') return analyseStand(tables, { diameter_m, elevation_m, poles, mapping });
    if (kind === 'still') return joinStill(tables.map((table) => analyseStill(table, { mapping })));
    const results = tables.map((table) => analyseSpinup(table, { mapping, poles }));
    this.traces = tables.map((table, i) =>
      traceOf(table, { ...proposeMapping(table), ...mapping }, poles, results[i]),
    );
    return joinSpinup(results);
  }

  /** Every quantity of the bench, those without a column as undefined, so that no proposal comes back. */
  private mappingOf(kind: Exclude<BenchKind, 'swing'>, table: Table): ColumnMapping | undefined {
    const { task } = this;
    const shape = shapeOf(kind, table.heads);
    const kept = task.remembered.find((one) => one.shape === shape)?.mapping;
    const chosen = task.mapping ?? kept;
    const keys = KEYS_OF[kind];
    const all = chosen ?? proposeMapping(table);
    this.looked = {
      heads: table.heads,
      mapping: Object.fromEntries(keys.flatMap((key) => (all[key] === undefined ? [] : [[key, all[key]]]))),
      from: task.mapping !== null ? 'user' : kept === undefined ? 'heads' : 'memory',
    };
    return chosen && Object.fromEntries(keys.map((key) => [key, chosen[key]]));
  }
}

function traceOf(table: Table, mapping: ColumnMapping, poles: number, result: SpinupResult): SpinTrace {
  const { time_s } = timeBase(table, mapping.time);
  const key = mapping.speed === undefined ? 'electricalSpeed' : 'speed';
  const choice = mapping[key];
  const speed = choice === undefined ? new Float64Array(time_s.length) : columnInSI(table, key, choice);
  const scale = key === 'speed' ? RPM : RPM / (poles / 2);
  const every = Math.max(1, Math.ceil(time_s.length / MOST_POINTS));
  const thin = (values: Float64Array) => values.filter((_, i) => i % every === 0);
  return {
    file: table.file,
    time_s: thin(time_s),
    speed_rpm: thin(speed).map((value) => scale * value),
    ...fitOf(result, time_s[time_s.length - 1]),
  };
}

/** The exponentials of the steps, one after the other. */
function fitOf({ steps }: SpinupResult, end_s: number): Pick<SpinTrace, 'fitTime_s' | 'fit_rpm'> {
  const times: number[] = [];
  const speeds: number[] = [];
  steps.forEach(({ fit, lag }, k) => {
    const next_s = steps[k + 1]?.fit.onset_s ?? end_s;
    const span = Math.min(FIT_LAGS * lag.value, next_s - fit.onset_s);
    if (!(span > 0)) return;
    for (let i = 0; i < FIT_POINTS; i++) {
      const after = (span * i) / FIT_POINTS;
      times.push(fit.onset_s + after);
      speeds.push(RPM * (fit.start_radps + fit.change_radps * (1 - Math.exp(-after / lag.value))));
    }
  });
  return { fitTime_s: Float64Array.from(times), fit_rpm: Float64Array.from(speeds) };
}
