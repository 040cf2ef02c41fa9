/** What page and flight worker say to each other: two typed unions, nothing else. */
import type { Build } from '../../craft/build.ts';
import type { Gains } from '../../craft/gains.ts';
import type { Problem } from '../../craft/problem.ts';
import type { Scene } from '../../craft/scene.ts';
import type { Wind } from '../../craft/wind.ts';
import type { Fault } from '../../disturbance/faults.ts';
import type { Start, Stopped } from '../../flight/flight.ts';
import type { Sticks } from '../../flight/pilot.ts';

export interface FlightSettings {
  readonly build: Build;
  readonly gains: Gains;
  readonly wind: Wind;
  readonly scene: Scene;
  readonly seed: number;
  readonly faults: readonly Fault[];
  readonly noiseScale: number;
  readonly vibrationScale: number;
}

/** Share of real time; 0 = paused. */
export type Speed = 0 | 0.25 | 0.5 | 1;

export type ToWorker =
  | { readonly kind: 'begin'; readonly settings: FlightSettings; readonly start: Start }
  | { readonly kind: 'settings'; readonly settings: FlightSettings }
  | { readonly kind: 'sticks'; readonly sticks: Sticks }
  | { readonly kind: 'speed'; readonly speed: Speed }
  | { readonly kind: 'single-tick' }
  | { readonly kind: 'set-upright' }
  | { readonly kind: 'drop-payload' }
  /** Shows the flight as it was and pauses; the flight goes on from there when speed is set again. */
  | { readonly kind: 'rewind'; readonly time_s: number }
  | { readonly kind: 'record' }
  /** Hands an emptied buffer back for the next batch. */
  | { readonly kind: 'buffer'; readonly buffer: ArrayBuffer };

export interface TickStats {
  readonly ticks: number;
  /** Ticks that began later than one screen frame after they were due. */
  readonly late: number;
  /** Share of the last minute's ticks that were not late. */
  readonly onTime: number;
  /** Root mean square of the motor commands above 20 Hz over the last second, µs. */
  readonly motorActivity_us: number;
  /** Mean winding heat of the four motors over the last second, W. */
  readonly windingHeat_W: number;
}

export type FromWorker =
  /** Rows of signals since the last batch, every `stride`-th tick, newest last. */
  | {
      readonly kind: 'rows';
      readonly buffer: ArrayBuffer;
      readonly count: number;
      readonly speed: Speed;
      readonly stats: TickStats;
      readonly stopped: Stopped | null;
      /** The payload is still on. */
      readonly loaded: boolean;
    }
  /** A flight has begun anew; earlier rows are no longer of it. */
  | { readonly kind: 'began'; readonly time_s: number; readonly loop_Hz: number }
  /** Everything after this moment is taken back. */
  | {
      readonly kind: 'rewound';
      readonly time_s: number;
      readonly oldest_s: number;
      /** The sticks as they stood then. */
      readonly sticks: Sticks;
    }
  | { readonly kind: 'record'; readonly csv: Blob; readonly rows: number }
  | { readonly kind: 'refused'; readonly file: string; readonly problems: readonly Problem[] }
  /** The page was away for long; the flight was paused rather than hurried after. */
  | { readonly kind: 'stalled'; readonly away_s: number };
