/** What a trial is: a named, repeatable flight with scores and the bands they must keep. */
import type { Build } from '../craft/build.ts';
import type { Gains } from '../craft/gains.ts';
import type { Scene } from '../craft/scene.ts';
import type { Wind } from '../craft/wind.ts';
import type { Fault } from '../disturbance/faults.ts';
import type { Flight, Start } from '../flight/flight.ts';
import type { Sticks } from '../flight/pilot.ts';
import type { Recorder } from '../flight/record.ts';

/** Least and greatest value that pass; absent: open. */
export interface Band {
  readonly least?: number;
  readonly most?: number;
}

export interface ScoreDefinition {
  readonly name: string;
  readonly unit: string;
  readonly band: Band;
  /** Where the band comes from: a standard, a paper, or "common practice, no source". */
  readonly source: string;
}

export interface Trial {
  readonly name: string;
  readonly title: string;
  /** What it is for, a sentence. */
  readonly purpose: string;
  readonly duration_s: number;
  readonly start: Start;
  readonly scores: readonly ScoreDefinition[];
  readonly setup: (context: TrialContext) => TrialSetup;
  /** Values of the scores, in their order, from the record. */
  readonly score: (run: TrialRun) => readonly number[];
}

export interface TrialContext {
  readonly build: Build;
  readonly gains: Gains;
  /** Wind asked for from outside (a sweep), in place of the trial's own. */
  readonly wind: Wind | null;
}

export interface TrialSetup {
  readonly build: Build;
  readonly wind: Wind;
  readonly scene?: Scene;
  readonly faults?: readonly Fault[];
  /** Fills the sticks for this instant. */
  readonly sticks: (time_s: number, flight: Flight, sticks: Sticks) => void;
  /** Called before each tick: payload drops and the like. */
  readonly act?: (time_s: number, flight: Flight) => void;
}

export interface TrialRun {
  readonly record: Recorder;
  readonly flight: Flight;
  readonly gains: Gains;
  readonly build: Build;
}

export interface Score {
  readonly name: string;
  readonly unit: string;
  readonly value: number | null;
  readonly band: Band;
  readonly source: string;
  readonly pass: boolean;
}

export interface TrialResult {
  readonly trial: string;
  readonly title: string;
  readonly seed: number;
  readonly scores: readonly Score[];
  readonly pass: boolean;
  /** Why the flight ended early; null when it did not. */
  readonly stopped: string | null;
}

export const COMMON = 'common practice, no source';
