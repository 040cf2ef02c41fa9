/** What page and worker of Match say to each other, and a match as the page shows it: plain arrays and numbers. */
import type { Build } from '../../../craft/build.ts';
import type { AxisName, Gains } from '../../../craft/gains.ts';
import type { Problem } from '../../../craft/problem.ts';
import type { Columns } from '../../../matching/columns.ts';
import type { LogProposal } from '../../../matching/inspectLog.ts';
import type { Offer } from '../../../matching/suspicions.ts';
import type { PlotSpan } from '../../plots/LinePlot.tsx';

/** What a person confirms about a log. */
export interface LogChoice {
  readonly columns: Columns;
  /** Rate of the controller that flew; null: as the log says, or one tick a row. */
  readonly loop_Hz: number | null;
}

export interface ReplayRequest {
  readonly builds: readonly Build[];
  readonly gains: Gains;
  readonly from_s: number;
  readonly to_s: number;
}

export type ToMatchWorker =
  | { readonly kind: 'inspect'; readonly file: File }
  | { readonly kind: 'match'; readonly file: File; readonly choice: LogChoice; readonly build: Build }
  /** The file is read again only where the worker no longer has it. */
  | ({ readonly kind: 'replay'; readonly file: File; readonly choice: LogChoice } & ReplayRequest);

export type Doing = 'looking' | 'reading' | 'matching' | 'flying';

export type FromMatchWorker =
  | { readonly kind: 'proposal'; readonly proposal: LogProposal }
  | { readonly kind: 'progress'; readonly share: number; readonly doing: Doing }
  | { readonly kind: 'matched'; readonly result: ShownMatch }
  /** One for each build asked for. */
  | { readonly kind: 'replayed'; readonly replays: readonly ShownReplay[] }
  | { readonly kind: 'refused'; readonly file: string; readonly problems: readonly Problem[] }
  | { readonly kind: 'broken'; readonly text: string };

export interface ShownEstimate {
  readonly value: number;
  readonly sigma: number;
}

export interface Numbers3 {
  readonly gain_dps2_per_us: ShownEstimate;
  readonly lag_s: ShownEstimate;
  readonly delay_s: ShownEstimate;
}

interface Response {
  readonly f_Hz: Float64Array;
  readonly gain_dB: Float64Array;
  readonly phase_deg: Float64Array;
}

export interface ShownAxis {
  readonly estimates: Numbers3 | null;
  /** What the build says of the same three; its delay holds the controller's own. */
  readonly model: { readonly gain_dps2_per_us: number; readonly lag_s: number; readonly delay_s: number };
  readonly fit_pct: number | null;
  readonly usable_s: number;
  readonly note: string;
  /** The whole log, thinned so that no peak is lost. Null where the log lacks this axis. */
  readonly overview: {
    readonly t_s: Float64Array;
    readonly rate_dps: Float64Array;
    readonly setpoint_dps: Float64Array | null;
    /** Pieces used, and those left out with their reason. */
    readonly spans: readonly PlotSpan[];
  } | null;
  readonly check: {
    readonly t_s: Float64Array;
    readonly measured_dps: Float64Array;
    readonly simulated_dps: Float64Array;
    readonly residual_dps: Float64Array;
  } | null;
  readonly response: {
    readonly measured: Response;
    readonly coherence: Float64Array;
    readonly fitted: Response | null;
    readonly build: Response;
  } | null;
  readonly left: {
    readonly f_Hz: Float64Array;
    /** Root of the density of the prediction errors, deg/s/√Hz. */
    readonly density: Float64Array;
    readonly lines: readonly { readonly f_Hz: number; readonly label: string }[];
  } | null;
}

export interface ShownMatch {
  readonly rows: number;
  readonly seconds: number;
  readonly rate_Hz: number;
  readonly jitter_s: number;
  readonly lostRows: number;
  readonly axes: Readonly<Record<AxisName, ShownAxis>>;
  readonly offers: readonly Offer[];
  readonly remarks: readonly string[];
  readonly corrected: Build | null;
  readonly changes: readonly string[];
  readonly kept: readonly string[];
  /** Gains of a record's header, with which it was flown. */
  readonly flownGains: Gains | null;
  readonly hasSetpoints: boolean;
  /** The livelier part of the log, a good one to fly again. */
  readonly replayFrom_s: number;
}

export interface ShownReplayAxis {
  readonly measured_dps: Float64Array;
  readonly simulated_dps: Float64Array;
  readonly residual_dps: Float64Array;
  readonly fit_pct: number;
  readonly f_Hz: Float64Array;
  readonly residualDensity: Float64Array;
  readonly measuredDensity: Float64Array;
  readonly says: string;
}

export interface ShownReplay {
  readonly t_s: Float64Array;
  readonly axes: Readonly<Record<AxisName, ShownReplayAxis | null>>;
  readonly remarks: readonly string[];
}
