/** What Prove keeps with a craft: results with what they were of, bands, spread, ratings, notes. */
import { z } from 'zod';
import type { Build } from '../../../craft/build.ts';
import type { Gains } from '../../../craft/gains.ts';
import type { Wind } from '../../../craft/wind.ts';
import { bandsSchema, type Bands } from '../../../trials/bands.ts';
import type { GainSide, RatedFlight } from '../../../trials/rating.ts';
import { TRIALS } from '../../../trials/registry.ts';
import type { TrialResult } from '../../../trials/trial.ts';
import { spreadSchema, type SpreadShares, type SpreadSummary } from '../../../trials/uncertainty.ts';

/** Everything that a result hangs on besides the trial itself. */
export interface RunOf {
  readonly build: Build;
  readonly gainsA: Gains;
  readonly gainsB: Gains | null;
  /** Null: each trial's own. */
  readonly wind: Wind | null;
  readonly seed: number;
  readonly version: string;
}

export type Results = Readonly<Record<string, TrialResult>>;

/** A round of flights by hand, rated without knowing which set flew. */
export interface RatingSession {
  readonly begunAt: string;
  readonly seed: number;
  readonly wind: Wind;
  readonly duration_s: number;
  readonly build: Build;
  readonly gainsA: Gains;
  readonly gainsB: Gains;
  readonly order: readonly GainSide[];
  /** As flown; the session is over when there are as many as in the order. */
  readonly flights: readonly RatedFlight[];
}

export interface SpreadKept {
  readonly trial: string;
  readonly samples: number;
  readonly shares: SpreadShares;
  readonly result: { readonly of: RunOf; readonly summary: SpreadSummary } | null;
}

export interface Kept {
  readonly of: RunOf | null;
  readonly a: Results;
  readonly b: Results;
  readonly notes: string;
  readonly seed: number;
  /** The wind on the desk in place of the trials' own. */
  readonly deskWind: boolean;
  /** Bands of the person's own: trial → score → band. */
  readonly bands: Readonly<Record<string, Bands>>;
  readonly spread: SpreadKept;
  readonly sessions: readonly RatingSession[];
}

const FIRST: Kept = {
  of: null,
  a: {},
  b: {},
  notes: '',
  seed: 1,
  deskWind: false,
  bands: {},
  spread: { trial: 'gust-front', samples: 60, shares: spreadSchema.parse({}), result: null },
  sessions: [],
};

const known = new Set(TRIALS.map((trial) => trial.name));

/** Results by trial, those of trials that are no more left out. */
const results = z
  .record(z.string(), z.looseObject({ trial: z.string(), scores: z.array(z.looseObject({})) }))
  .transform(
    (all) =>
      Object.fromEntries(Object.entries(all).filter(([name]) => known.has(name))) as unknown as Results,
  );
const whole = <T>() => z.custom<T>((value) => typeof value === 'object' && value !== null);

/** A sheet may come from an archive or another version: a part that cannot be read is as if never written. */
const sheetSchema = z.object({
  of: whole<RunOf>().nullable().catch(null),
  a: results.catch({}),
  b: results.catch({}),
  notes: z.string().max(10_000).catch(''),
  seed: z.int().min(0).catch(FIRST.seed),
  deskWind: z.boolean().catch(false),
  bands: z.record(z.string(), bandsSchema).catch({}),
  spread: z
    .object({
      trial: z.string().refine((name) => known.has(name)),
      samples: z.int().min(10).max(2000),
      shares: spreadSchema,
      result: whole<NonNullable<SpreadKept['result']>>().nullable(),
    })
    .catch(FIRST.spread),
  sessions: z.array(whole<RatingSession>()).catch([]),
});

export function keptOf(raw: unknown): Kept {
  const read = sheetSchema.safeParse(raw);
  if (!read.success) return FIRST;
  // Results without what they were of cannot be repeated.
  return read.data.of === null ? { ...read.data, a: {}, b: {} } : read.data;
}
