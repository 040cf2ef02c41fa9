/** What a trial is: a named, repeatable flight with parameters, scores and the bands they must keep. */
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

/** A number that a person may change about a trial; its unit is in its name. */
export interface Parameter {
  readonly value: number;
  readonly least: number;
  readonly most: number;
  readonly meaning: string;
}

export type ParameterValues<P extends string = string> = Readonly<Record<P, number>>;

/** Times within the flight that are scored, s. */
export type Window = readonly [from_s: number, to_s: number];

/** Where a band comes from when no standard or paper says it. */
export const COMMON = 'common practice, no source';

export interface ScoreDefinition {
  readonly name: string;
  readonly unit: string;
  readonly band: Band;
  /** Where the band comes from: a standard, a paper, or COMMON. */
  readonly source: string;
  /** The value; NaN when it was never reached, null when this build has no such quantity. */
  readonly of: (run: TrialRun) => number | null;
}

export interface Trial<P extends string = string> {
  readonly name: string;
  readonly title: string;
  /** What it is for, a sentence. */
  readonly purpose: string;
  readonly parameters: Readonly<Record<P, Parameter>>;
  readonly scores: readonly ScoreDefinition[];
  /** Signals that show what happened in it, for plots. */
  readonly traceSignals: readonly string[];
  readonly scene?: Scene;
  duration_s(p: ParameterValues<P>): number;
  start(p: ParameterValues<P>): Start;
  wind(p: ParameterValues<P>): Wind;
  /** What is scored; the whole flight when absent. */
  scored?(p: ParameterValues<P>): Window;
  /** Why it says nothing about this build; null when it does. */
  inapplicable?(build: Build): string | null;
  /** The build as flown, where the trial changes it. */
  build?(build: Build, p: ParameterValues<P>): Build;
  faults?(build: Build, gains: Gains, p: ParameterValues<P>): readonly Fault[];
  /** Fills the sticks for this tick; may act on the flight (a payload drop). */
  sticks(time_s: number, sticks: Sticks, flight: Flight, p: ParameterValues<P>): void;
}

/** A trial whose callbacks know its parameters by name. */
export function defineTrial<P extends string>(trial: Trial<P>): Trial {
  return trial;
}

/** One flight of a trial, as the scores see it. */
export interface TrialRun {
  readonly record: Recorder;
  readonly flight: Flight;
  readonly build: Build;
  readonly gains: Gains;
  readonly wind: Wind;
  readonly parameters: ParameterValues;
  /** Rows [from, to) that are scored. */
  readonly rows: readonly [from: number, to: number];
  /** The same flight without gyro noise and vibration, flown when first asked for. */
  readonly quiet: () => TrialRun;
}

export interface Score {
  readonly name: string;
  readonly unit: string;
  /** Null when it was not reached (fails) or does not apply (passes). */
  readonly value: number | null;
  readonly applies: boolean;
  readonly band: Band;
  readonly source: string;
  readonly pass: boolean;
}

/** Plain data: what a worker answers, what is kept. */
export interface TrialResult {
  readonly trial: string;
  readonly title: string;
  readonly seed: number;
  readonly parameters: ParameterValues;
  readonly scores: readonly Score[];
  readonly pass: boolean;
  /** Why the flight ended early; null when it did not. */
  readonly stopped: string | null;
  /** Why the trial was not flown; null when it was. */
  readonly note: string | null;
  readonly traceSignals: readonly string[];
  /** Only where the task asked for them. */
  readonly traces?: Traces;
}

/** Signals of a flight over its time, thinned for a plot. */
export interface Traces {
  readonly t_s: readonly number[];
  readonly signals: readonly { readonly name: string; readonly values: readonly number[] }[];
}
