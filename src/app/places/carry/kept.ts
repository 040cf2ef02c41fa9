/**
 * What other places and this one have kept about a craft, read for the sheet. Kept data may be of an older
 * program or come from somebody's archive: what does not fit is left out, never trusted and never fatal.
 */
import { z } from 'zod';
import { QUANTITY_NAMES } from '../../../carrying/assemble.ts';
import type { WindProof } from '../../../carrying/windLimit.ts';
import type { Build } from '../../../craft/build.ts';
import type { Gains } from '../../../craft/gains.ts';
import { VERSION } from '../../../flight/record.ts';
import type { TrialResult } from '../../../trials/trial.ts';
import { knownIn } from '../known.ts';
import type { RunOf } from '../prove/kept.ts';
import { sameJson } from '../../store/document.ts';

const name = z.string().max(200);
const band = z.object({ least: z.number().optional(), most: z.number().optional() });
const score = z.object({
  name,
  unit: name,
  value: z.number().nullable(),
  applies: z.boolean(),
  band,
  source: name,
  pass: z.boolean(),
});
const result = z.object({
  trial: name,
  title: name,
  seed: z.number(),
  parameters: z.record(z.string(), z.number()),
  scores: z.array(score).max(40),
  pass: z.boolean(),
  stopped: z.string().max(400).nullable(),
  note: z.string().max(400).nullable(),
  traceSignals: z.array(name).max(60),
});
const failure = z.object({ at: name, what: z.array(z.string().max(400)).max(8) });
const seeds = z.array(z.number()).min(1).max(50);
const windProof = z.object({
  gust: z.object({
    held_mps: z.number().nullable(),
    failure: failure.nullable(),
    seeds,
    steps_mps: z.array(z.number()).min(1).max(12),
    sides: z.array(z.object({ side: name, held: z.array(z.number()).max(12) })).max(8),
  }),
  turbulence: z.object({ held: name.nullable(), failure: failure.nullable(), seeds }),
  missing: z.number(),
});
const carrySheet = z.object({
  key: z.string(),
  results: z.array(result).max(100).catch([]),
  wind: windProof.nullable().catch(null),
});

/** What Carry itself keeps: results of one build and gain set. */
export interface CarrySheet {
  readonly key: string;
  readonly results: readonly TrialResult[];
  readonly wind: WindProof | null;
}

/** Says which build, gains and version of the program results are of. */
export function keyOf(build: Build, gains: Gains): string {
  return JSON.stringify([VERSION, build, gains]);
}

/** Carry's own sheet when it is of this build and gains; else an empty one. */
export function carriedFor(raw: unknown, build: Build, gains: Gains): CarrySheet {
  const key = keyOf(build, gains);
  const parsed = carrySheet.safeParse(raw);
  return parsed.success && parsed.data.key === key ? parsed.data : { key, results: [], wind: null };
}

/** Are there results, but of another build or other gains? */
export function isOutOfDate(raw: unknown, build: Build, gains: Gains): boolean {
  const parsed = carrySheet.safeParse(raw);
  return parsed.success && parsed.data.key !== keyOf(build, gains);
}

/** What Prove's results are of; a wind that is not null was flown in place of the trials' own. */
const provenOf = z.object({
  build: z.unknown(),
  gainsA: z.unknown(),
  gainsB: z.unknown(),
  wind: z.null(),
  version: z.literal(VERSION),
} satisfies Partial<Record<keyof RunOf, z.ZodType>>);
const proveSheet = z.object({ of: provenOf, a: z.unknown(), b: z.unknown() });

/** Prove's results that are of this build and these gains, each trial in its own wind. */
export function provenFor(raw: unknown, build: Build, gains: Gains): TrialResult[] {
  const sheet = proveSheet.safeParse(raw);
  if (!sheet.success || !sameJson(sheet.data.of.build, build)) return [];
  const { of, a, b } = sheet.data;
  const kept = sameJson(of.gainsA, gains) ? a : sameJson(of.gainsB, gains) ? b : null;
  if (typeof kept !== 'object' || kept === null) return [];
  return Object.values(kept).flatMap((one) => {
    const parsed = result.safeParse(one);
    return parsed.success ? [parsed.data] : [];
  });
}

/** The results for the sheet: this place's own, and of other trials Prove's. */
export function joined(own: readonly TrialResult[], proven: readonly TrialResult[]): TrialResult[] {
  const here = new Set(own.map(({ trial }) => trial));
  return [...own, ...proven.filter(({ trial }) => !here.has(trial))];
}

const LONGEST_KNOWN = 60;

/** How well quantities are known, as Measure keeps it: `{known: {quantity: text}}`. */
export function knownOnSheet(raw: unknown): Record<string, string> {
  const known = knownIn(raw);
  return Object.fromEntries(
    QUANTITY_NAMES.flatMap((quantity) => {
      const text = known[quantity] ?? '';
      return text === '' ? [] : [[quantity, text.slice(0, LONGEST_KNOWN)]];
    }),
  );
}
