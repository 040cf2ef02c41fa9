/** Log to identified plant and corrected build, beside the page. */
import type { Build } from '../../../craft/build.ts';
import { AXES, type AxisName } from '../../../craft/gains.ts';
import { InputError, type Problem } from '../../../craft/problem.ts';
import type { Columns } from '../../../matching/columns.ts';
import { correctedBuild } from '../../../matching/correctedBuild.ts';
import { type LogProposal } from '../../../matching/inspectLog.ts';
import { matchLog } from '../../../matching/matchLog.ts';
import { blobSource, openLog, readLog } from '../../../matching/readLog.ts';

export type ToMatchWorker =
  | { readonly kind: 'inspect'; readonly file: File }
  | { readonly kind: 'match'; readonly file: File; readonly columns: Columns; readonly build: Build };

export interface ShownEstimate {
  readonly value: number;
  readonly sigma: number;
}

/** One axis as the page shows it: plain arrays and numbers. */
export interface ShownAxis {
  readonly gain_dps2_per_us: ShownEstimate | null;
  readonly lag_s: ShownEstimate | null;
  readonly delay_s: ShownEstimate | null;
  readonly fit_pct: number | null;
  readonly usable_s: number;
  readonly note: string;
  readonly check: {
    readonly t_s: Float64Array;
    readonly measured_dps: Float64Array;
    readonly simulated_dps: Float64Array;
  } | null;
  readonly response: {
    readonly f_Hz: Float64Array;
    readonly gain_dB: Float64Array;
    readonly coherence: Float64Array;
  } | null;
}

export interface ShownMatch {
  readonly axes: Readonly<Record<AxisName, ShownAxis>>;
  readonly offers: readonly {
    readonly signals: readonly string[];
    readonly unit?: string;
    readonly sign?: number;
    readonly because: string;
  }[];
  readonly remarks: readonly string[];
  readonly corrected: Build | null;
  readonly changes: readonly string[];
  readonly kept: readonly string[];
}

export type FromMatchWorker =
  | { readonly kind: 'proposal'; readonly proposal: LogProposal }
  | { readonly kind: 'progress'; readonly share: number; readonly doing: 'reading' | 'matching' }
  | { readonly kind: 'matched'; readonly result: ShownMatch }
  | { readonly kind: 'refused'; readonly file: string; readonly problems: readonly Problem[] };

const say = (message: FromMatchWorker): void => self.postMessage(message);

self.onmessage = ({ data }: MessageEvent<ToMatchWorker>) => {
  void answer(data).catch((error: unknown) => {
    if (error instanceof InputError) say({ kind: 'refused', file: error.file, problems: error.problems });
    else if (error instanceof RangeError) {
      say({
        kind: 'refused',
        file: 'build',
        problems: [{ path: '', value: error.message, allowed: 'a craft that can hover' }],
      });
    } else throw error;
  });
};

async function answer(data: ToMatchWorker): Promise<void> {
  const source = blobSource(data.file, data.file.name);
  const proposal = await openLog(source);
  if (data.kind === 'inspect') {
    say({ kind: 'proposal', proposal });
    return;
  }
  const log = await readLog(source, proposal, data.columns, {
    range: data.build.esc,
    onProgress: (share) => say({ kind: 'progress', share: 0.5 * share, doing: 'reading' }),
  });
  const result = matchLog(log, data.build, {
    onProgress: (share) => say({ kind: 'progress', share: 0.5 + 0.5 * share, doing: 'matching' }),
  });
  const corrected = correctedBuild(data.build, result, data.file.name);
  const axes = Object.fromEntries(AXES.map((axis) => [axis, shown(result.axes[axis])])) as Record<
    AxisName,
    ShownAxis
  >;
  say({
    kind: 'matched',
    result: {
      axes,
      offers: result.offers,
      remarks: result.remarks,
      corrected: corrected.build,
      changes: corrected.changes,
      kept: corrected.kept,
    },
  });
}

function shown(axis: ReturnType<typeof matchLog>['axes'][AxisName]): ShownAxis {
  const { estimates, validation, response } = axis;
  return {
    gain_dps2_per_us: estimates?.gain_dps2_per_us ?? null,
    lag_s: estimates?.lag_s ?? null,
    delay_s: estimates?.delay_s ?? null,
    fit_pct: axis.fit_pct,
    usable_s: axis.usable_s,
    note: axis.note,
    check:
      validation === null
        ? null
        : {
            t_s: validation.t_s,
            measured_dps: validation.measured_dps,
            simulated_dps: validation.simulated_dps,
          },
    response:
      response === null
        ? null
        : {
            f_Hz: response.f_Hz,
            gain_dB: response.re.map(
              (re, i) => 20 * Math.log10(Math.max(1e-12, Math.hypot(re, response.im[i]))),
            ),
            coherence: response.coherence,
          },
  };
}
