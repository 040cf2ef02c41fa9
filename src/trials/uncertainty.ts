/**
 * Spread over what is not known well: a Latin hypercube of mass, inertia, thrust, voltage, delay and noise; the
 * share of failures with Wilson's interval; what matters most by rank correlation; the worst case, with the
 * numbers that fly it again.
 */
import { probit, sampleRankCorrelation } from 'simple-statistics';
import { z } from 'zod';
import { quantity } from '../craft/fields.ts';
import { RandomStream } from '../math/random.ts';
import { resolve, type Overrides, type Subject } from './overrides.ts';
import type { TaskAnswer } from './protocol.ts';
import { trialByName } from './registry.ts';
import type { TrialTask } from './runTrial.ts';
import type { Band, TrialResult } from './trial.ts';

/** One thing that is not known well. */
export interface Spread {
  readonly name: string;
  /** What the factor multiplies, for a person. */
  readonly meaning: string;
  /** Relative standard uncertainty of a normal factor; for a uniform one, the ends. */
  readonly share: number;
  readonly shape: 'normal' | 'uniform';
  /** The numbers that a factor sets. */
  readonly overrides: (subject: Subject, factor: number) => Overrides;
  readonly apply: (subject: Subject, factor: number) => Subject;
}

/** How uncertain each is: shares of the value, charge and delay in their own terms. */
export const spreadSchema = z.strictObject(
  {
    mass: quantity(0, 0.3, '').default(0.02),
    inertia: quantity(0, 0.3, '').default(0.1),
    thrust: quantity(0, 0.3, '').default(0.05),
    /** The state of charge is taken from 1 − this to 1 of the build's own. */
    voltage: quantity(0, 0.95, '').default(0.7),
    /** The compute delay is taken from 1 − this to 1 + this of its own plus a quarter of a tick. */
    delay: quantity(0, 1, '').default(0.6),
    noise: quantity(0, 0.32, '').default(0.3),
  },
  { error: 'an object with any of mass, inertia, thrust, voltage, delay, noise' },
);
export type SpreadShares = z.output<typeof spreadSchema>;

type Paths = (subject: Subject, factor: number) => Overrides;

/** Each number at `paths` of the subject's own value times the factor. */
function scaled(entries: readonly (readonly [path: string, value: number])[], factor: number): Overrides {
  return Object.fromEntries(entries.map(([path, value]) => [path, value * factor]));
}

const mass: Paths = ({ build }, f) => scaled([['build.airframe.mass_kg', build.airframe.mass_kg]], f);

const inertia: Paths = ({ build }, f) =>
  scaled(
    Object.entries(build.airframe.inertia_kgm2).map(([key, value]) => [
      `build.airframe.inertia_kgm2.${key}`,
      value,
    ]),
    f,
  );

/** Thrust at a speed, with power along f^1.5 so that the propeller's figure of merit stays what it was. */
const thrust: Paths = ({ build: { propeller } }, f) => {
  const rows = propeller.staticTable ?? [];
  return {
    ...scaled(
      [
        ['build.propeller.thrustCoefficient', propeller.thrustCoefficient],
        ...rows.map((row, i) => [`build.propeller.staticTable[${i}].ct`, row.ct] as const),
      ],
      f,
    ),
    ...scaled(
      [
        ['build.propeller.powerCoefficient', propeller.powerCoefficient],
        ...rows.map((row, i) => [`build.propeller.staticTable[${i}].cp`, row.cp] as const),
      ],
      f ** 1.5,
    ),
  };
};

const voltage: Paths = ({ build }, f) => ({ 'build.battery.charge': Math.min(1, build.battery.charge * f) });

const delay: Paths = ({ gains }, f) => ({
  'gains.computeDelay_s': Math.min(0.05, (gains.computeDelay_s + 0.25 / gains.loop_Hz) * f),
});

const noise: Paths = ({ build: { gyro } }, f) => ({
  ...scaled([['build.gyro.noise_dps_per_rtHz', gyro.noise_dps_per_rtHz]], f),
  ...scaled(
    (gyro.vibration_dps ?? []).map((value, i) => [`build.gyro.vibration_dps[${i}]`, value] as const),
    f,
  ),
});

function spread(
  name: string,
  meaning: string,
  share: number,
  shape: Spread['shape'],
  overrides: Paths,
): Spread {
  // Any trial does: a spread sets numbers of build and gains alone.
  const carrier = trialByName('hover-noise');
  const apply = (subject: Subject, factor: number): Subject => {
    const { build, gains } = resolve(carrier, subject, overrides(subject, factor), name);
    return { ...subject, build, gains };
  };
  return { name, meaning, share, shape, overrides, apply };
}

export function spreadsOf(shares: SpreadShares): readonly Spread[] {
  return [
    spread('mass', 'all-up mass', shares.mass, 'normal', mass),
    spread('inertia', 'all moments and products of inertia', shares.inertia, 'normal', inertia),
    spread('thrust', 'thrust at a rotor speed', shares.thrust, 'normal', thrust),
    spread('voltage', 'state of charge', shares.voltage, 'uniform', voltage),
    spread('delay', 'compute delay and a quarter of a tick', shares.delay, 'uniform', delay),
    spread('noise', 'gyro noise and vibration', shares.noise, 'normal', noise),
  ];
}

/** The spreads where nobody said otherwise; common practice, no source. */
export const SPREADS: readonly Spread[] = spreadsOf(spreadSchema.parse({}));

/** Normal factors are cut at this many standard deviations. */
const CUT = 3;

/** The factor at `p` of the spread's distribution, 0 < p < 1. */
function factorAt({ name, share, shape }: Spread, p: number): number {
  if (shape === 'normal') return 1 + share * Math.max(-CUT, Math.min(CUT, probit(p)));
  // A pack is never fuller than full.
  return name === 'voltage' ? 1 - share * p : 1 + share * (2 * p - 1);
}

/**
 * Latin hypercube (McKay, Beckman and Conover 1979): each of `count` equal slices of each distribution is drawn
 * once. Returns `count` factors for each spread.
 */
export function latinHypercube(spreads: readonly Spread[], count: number, seed: number): Float64Array[] {
  return spreads.map((one) => {
    const stream = new RandomStream(seed, `hypercube.${one.name}`);
    const slices = Array.from({ length: count }, (_, i) => i);
    for (let i = count - 1; i > 0; i--) {
      const j = Math.floor(stream.uniform() * (i + 1));
      [slices[i], slices[j]] = [slices[j], slices[i]];
    }
    return Float64Array.from(slices, (slice) => factorAt(one, (slice + stream.uniform()) / count));
  });
}

/** The tasks of all samples: each replayable by its overrides and the seed. */
export function spreadTasks(
  trial: string,
  subject: Subject,
  spreads: readonly Spread[],
  factors: readonly Float64Array[],
  seed: number,
  overrides: Overrides = {},
): TrialTask[] {
  // What is uncertain is the value after the overrides that hold in every sample.
  const base = resolve(trialByName(trial), subject, overrides);
  const count = factors[0]?.length ?? 0;
  return Array.from({ length: count }, (_, k) => ({
    ...subject,
    trial,
    seed,
    overrides: Object.assign(
      {},
      overrides,
      ...spreads.map((one, i) => one.overrides(base, factors[i][k])),
    ) as Overrides,
  }));
}

export interface Proportion {
  readonly share: number;
  readonly low: number;
  readonly high: number;
}

/** Wilson's score interval for `hits` of `count`, 95 % unless told (Wilson 1927). */
export function wilsonInterval(hits: number, count: number, z = probit95): Proportion {
  if (count === 0) return { share: 0, low: 0, high: 1 };
  const p = hits / count;
  const denominator = 1 + (z * z) / count;
  const centre = (p + (z * z) / (2 * count)) / denominator;
  const half = (z * Math.sqrt((p * (1 - p)) / count + (z * z) / (4 * count * count))) / denominator;
  return {
    share: p,
    // At the ends the bound is exactly 0 or 1; the difference of two roundings is not.
    low: hits === 0 ? 0 : Math.max(0, centre - half),
    high: hits === count ? 1 : Math.min(1, centre + half),
  };
}
/** Φ⁻¹(0.975). */
const probit95 = 1.959963984540054;

/**
 * How much of its band a score uses: 1 at the limit, above it outside; Infinity when not reached, null when the
 * band is open or the score does not apply.
 */
export function bandUse(value: number | null, band: Band): number | null {
  if (value === null) return Infinity;
  const uses: number[] = [];
  if (band.most !== undefined)
    uses.push(band.most > 0 ? value / band.most : value <= band.most ? 0 : Infinity);
  if (band.least !== undefined)
    uses.push(value > 0 ? band.least / value : band.least <= value ? 0 : Infinity);
  return uses.length === 0 ? null : Math.max(...uses);
}

/** The hardest used band of a trial, see `bandUse`; 0 when all are open. */
export function hardestUse(result: TrialResult): number {
  return result.scores.reduce(
    (most, score) => (score.applies ? Math.max(most, bandUse(score.value, score.band) ?? 0) : most),
    0,
  );
}

export interface Influence {
  readonly name: string;
  /** Spearman's rank correlation of the parameter with the value. */
  readonly correlation: number;
}

/** Rank correlation of each parameter with a value, largest in size first; 0 where nothing varied. */
export function whatMatters(
  spreads: readonly Spread[],
  factors: readonly Float64Array[],
  values: readonly number[],
): Influence[] {
  return spreads
    .map(({ name }, i) => {
      const correlation =
        values.length < 3 ? 0 : sampleRankCorrelation(Array.from(factors[i]), values.slice());
      return { name, correlation: Number.isFinite(correlation) ? correlation : 0 };
    })
    .sort((a, b) => Math.abs(b.correlation) - Math.abs(a.correlation));
}

export interface SpreadSummary {
  readonly trial: string;
  /** Samples that were flown. */
  readonly flown: number;
  /** Samples whose values were refused, or at which the program failed; not among the flown. */
  readonly lost: number;
  /** Share that fell outside a band, with its 95 % interval. */
  readonly failures: Proportion;
  /** Rank correlation with the hardest used band, largest first. */
  readonly matters: readonly Influence[];
  /** The same for each score that varied. */
  readonly mattersByScore: readonly { readonly name: string; readonly influences: readonly Influence[] }[];
  /** The sample that used its bands hardest: flown again from `overrides` and `seed`. */
  readonly worst: {
    readonly sample: number;
    readonly seed: number;
    readonly factors: Readonly<Record<string, number>>;
    readonly overrides: Overrides;
    readonly result: TrialResult;
  } | null;
}

/** What the samples say; `answers[k]` is that of task k, undefined where none came (a cancelled run). */
export function summariseSpread(
  tasks: readonly TrialTask[],
  spreads: readonly Spread[],
  factors: readonly Float64Array[],
  answers: readonly (TaskAnswer | undefined)[],
): SpreadSummary {
  const flown: { k: number; result: TrialResult; use: number }[] = [];
  answers.forEach((answer, k) => {
    if (answer?.kind === 'done') flown.push({ k, result: answer.result, use: hardestUse(answer.result) });
  });
  const told = answers.filter((answer) => answer !== undefined).length;
  const picked = factors.map((column) => Float64Array.from(flown, ({ k }) => column[k]));
  const names = flown[0]?.result.scores.map((score) => score.name) ?? [];
  const mattersByScore = names.flatMap((name, i) => {
    const values = flown.map(({ result }) => result.scores[i].value ?? Infinity);
    const varied = values.some((value) => value !== values[0]);
    return varied ? [{ name, influences: whatMatters(spreads, picked, values) }] : [];
  });
  const worst = flown.reduce<(typeof flown)[number] | null>(
    (a, b) => (a === null || b.use > a.use ? b : a),
    null,
  );
  return {
    trial: tasks[0]?.trial ?? '',
    flown: flown.length,
    lost: told - flown.length,
    failures: wilsonInterval(flown.filter(({ result }) => !result.pass).length, flown.length),
    matters: whatMatters(
      spreads,
      picked,
      flown.map(({ use }) => use),
    ),
    mattersByScore,
    worst:
      worst === null
        ? null
        : {
            sample: worst.k,
            seed: tasks[worst.k].seed,
            factors: Object.fromEntries(spreads.map(({ name }, i) => [name, factors[i][worst.k]])),
            overrides: tasks[worst.k].overrides ?? {},
            result: worst.result,
          },
  };
}
