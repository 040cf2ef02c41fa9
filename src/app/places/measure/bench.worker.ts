/** Bench files to fitted quantities, beside the page. */
import { InputError, type Problem } from '../../../craft/problem.ts';
import type { Measurement } from '../../../measuring/buildFromMeasurements.ts';
import { readTable } from '../../../measuring/columns.ts';
import { analyseSpinup, joinSpinup } from '../../../measuring/spinup.ts';
import { analyseStand } from '../../../measuring/stand.ts';
import { analyseStill, joinStill } from '../../../measuring/still.ts';
import { analyseSwing, joinSwings } from '../../../measuring/swing.ts';
import { readSwing } from '../../../measuring/swingFile.ts';

export type BenchKind = 'swing' | 'stand' | 'spinup' | 'still';

/** What the four benches give. */
export type BenchResult = Extract<Measurement, { measurement: BenchKind }>;

export interface ToBenchWorker {
  readonly kind: BenchKind;
  readonly files: readonly { readonly name: string; readonly text: string }[];
  readonly diameter_m: number;
  readonly elevation_m: number;
}

export type FromBenchWorker =
  | { readonly kind: 'done'; readonly result: BenchResult }
  | { readonly kind: 'refused'; readonly file: string; readonly problems: readonly Problem[] };

self.onmessage = ({ data }: MessageEvent<ToBenchWorker>) => {
  try {
    const answer: FromBenchWorker = { kind: 'done', result: analyse(data) };
    self.postMessage(answer);
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    const answer: FromBenchWorker = { kind: 'refused', file: error.file, problems: error.problems };
    self.postMessage(answer);
  }
};

function analyse(task: ToBenchWorker): BenchResult {
  const { files } = task;
  if (task.kind === 'swing')
    return joinSwings(files.flatMap(({ name, text }) => analyseSwing(readSwing(text, name), name).tests));
  const tables = files.map(({ name, text }) => readTable(text, name));
  if (task.kind === 'stand')
    return analyseStand(tables, { diameter_m: task.diameter_m, elevation_m: task.elevation_m });
  if (task.kind === 'spinup') return joinSpinup(tables.map((table) => analyseSpinup(table)));
  return joinStill(tables.map((table) => analyseStill(table)));
}
