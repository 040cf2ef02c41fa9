/**
 * The run description, `gustbench.run/1`: which trials, with what in place of what, and everything needed to
 * repeat it. What a person writes to ask for a run, what a report holds, and what flies it again.
 */
import { z } from 'zod';
import { parseBuild, type Build } from '../craft/build.ts';
import { formatTag, parseWith, title } from '../craft/fields.ts';
import { parseGains, type Gains } from '../craft/gains.ts';
import { parseWind, type Wind } from '../craft/wind.ts';
import { bandsSchema, checkBands, overridesSchema, type Bands } from './bands.ts';
import { resolve, type Overrides, type Subject } from './overrides.ts';
import { TRIALS, trialByName } from './registry.ts';
import type { TrialTask } from './runTrial.ts';
import { parseSweep, type Sweep } from './sweep.ts';
import { spreadSchema, type SpreadShares } from './uncertainty.ts';

export const RUN_FORMAT = 'gustbench.run/1';

const SAMPLES = 'a whole number from 3 to 10000';

const spreadRequest = z.strictObject(
  {
    /** The run's own trials when absent. */
    trials: z.array(z.string(), { error: 'a list of names of trials' }).max(200).optional(),
    samples: z
      .int({ error: SAMPLES })
      .min(3, { error: SAMPLES })
      .max(10_000, { error: SAMPLES })
      .default(100),
    shares: spreadSchema.prefault({}),
  },
  { error: 'an object with any of trials, samples, shares' },
);

export const runSchema = z.strictObject(
  {
    format: formatTag(RUN_FORMAT),
    name: title().optional(),
    /** Version of the program that wrote it, for a person. */
    version: z.string({ error: 'a text' }).max(40).optional(),
    /** All trials when absent. */
    trials: z.array(z.string(), { error: 'a list of names of trials' }).max(200).optional(),
    seed: z.int({ error: 'a whole number from 0' }).min(0, { error: 'a whole number from 0' }).optional(),
    /** Numbers in place of those in the files and trials, by path. */
    overrides: overridesSchema.default({}),
    /** Bands in place of the trials' own: trial → score → band. */
    bands: z.record(z.string(), bandsSchema, { error: 'bands by trial and score' }).default({}),
    notes: z.string({ error: 'a text of up to 10000 characters' }).max(10_000).default(''),
    sweep: z.unknown().optional(),
    spread: spreadRequest.optional(),
    build: z.unknown().optional(),
    gains: z.unknown().optional(),
    /** Another gain set, to compare with. */
    baseline: z.unknown().optional(),
    /** In place of the trials' own wind. */
    wind: z.unknown().optional(),
  },
  { error: 'a run description' },
);

/** Each of the trials over samples of an uncertain build. */
export interface SpreadRequest {
  readonly trials: readonly string[];
  readonly samples: number;
  readonly shares: SpreadShares;
}

export interface RunDescription {
  readonly name?: string;
  readonly trials: readonly string[];
  readonly seed: number | null;
  readonly overrides: Overrides;
  readonly bands: Readonly<Record<string, Bands>>;
  readonly notes: string;
  /** Null when there is none; checked when build and gains are known, see `sweepOf`. */
  readonly sweep: unknown;
  readonly spread: SpreadRequest | null;
  readonly build: Build | null;
  readonly gains: Gains | null;
  readonly baseline: Gains | null;
  readonly wind: Wind | null;
}

/** All trials on the files given, nothing changed. */
export const PLAIN_RUN: RunDescription = parseRun({ format: RUN_FORMAT });

/** @throws InputError naming path, value and what is allowed */
export function parseRun(raw: unknown, file = 'run'): RunDescription {
  const run = parseWith(runSchema, raw, file);
  const optional = <T>(value: unknown, parse: (raw: unknown, file: string) => T, part: string): T | null =>
    value === undefined || value === null ? null : parse(value, `${file}: ${part}`);
  const trials = run.trials ?? TRIALS.map((trial) => trial.name);
  for (const name of trials) trialByName(name, file);
  for (const [name, bands] of Object.entries(run.bands)) checkBands(trialByName(name, file), bands, file);
  for (const name of run.spread?.trials ?? []) trialByName(name, file);
  return {
    ...(run.name === undefined ? {} : { name: run.name }),
    trials,
    seed: run.seed ?? null,
    overrides: run.overrides,
    bands: run.bands,
    notes: run.notes,
    sweep: run.sweep ?? null,
    spread: run.spread === undefined ? null : { ...run.spread, trials: run.spread.trials ?? trials },
    build: optional(run.build, parseBuild, 'build'),
    gains: optional(run.gains, parseGains, 'gains'),
    baseline: optional(run.baseline, parseGains, 'baseline'),
    wind: optional(run.wind, parseWind, 'wind'),
  };
}

/** What is flown, once files and description are put together. */
export interface RunSubject {
  readonly build: Build;
  readonly gains: Gains;
  readonly wind: Wind | null;
  readonly seed: number;
}

/**
 * The tasks of a run's trials on one gain set.
 * @throws InputError when an override leads nowhere in any of them
 */
export function runTasksOf(run: RunDescription, subject: RunSubject, file = 'run'): TrialTask[] {
  const { build, gains, wind, seed } = subject;
  return run.trials.map((trial) => {
    resolve(trialByName(trial, file), subject, run.overrides, file);
    const bands = run.bands[trial];
    return {
      trial,
      build,
      gains,
      wind,
      seed,
      overrides: run.overrides,
      ...(bands === undefined ? {} : { bands }),
    };
  });
}

/**
 * The run's sweep on this subject, with the run's own overrides and bands put in.
 * @throws InputError as parseSweep
 */
export function sweepOf(run: RunDescription, raw: unknown, subject: Subject, file: string): Sweep {
  const sweep = parseSweep(raw, subject, file);
  const overrides = { ...run.overrides, ...sweep.overrides };
  return parseSweep(
    { ...sweep, overrides, bands: { ...run.bands[sweep.trial], ...sweep.bands } },
    subject,
    file,
  );
}
