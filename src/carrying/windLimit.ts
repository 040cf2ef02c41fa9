/**
 * The wind that a gain set is shown to hold: single gusts of rising strength from four sides and turbulence of
 * rising level, each over several seeds. What failed first, and how, stands beside what held.
 */
import type { Build } from '../craft/build.ts';
import type { Gains } from '../craft/gains.ts';
import { GUST_SIDES, type Side } from '../trials/definitions/gust.ts';
import { trialByName } from '../trials/registry.ts';
import { bandText, scoreText } from '../trials/report.ts';
import type { TrialTask } from '../trials/runTrial.ts';
import type { Score, TrialResult } from '../trials/trial.ts';

/** Greatest speeds of the gusts tried, m/s. */
export const GUST_STEPS_MPS: readonly number[] = [2, 4, 6, 8, 10, 12, 14];
/** Turbulence tried, in order of its wind at 20 ft. */
export const TURBULENCE_STEPS: readonly string[] = [
  'turbulence-light-scaled',
  'turbulence-light',
  'turbulence-moderate',
  'turbulence-severe',
];
const GUST_SEEDS = 3;
const TURBULENCE_SEEDS = 5;

interface GustFlight {
  readonly kind: 'gust';
  readonly side: Side;
  readonly peak_mps: number;
  readonly seed: number;
}
interface TurbulenceFlight {
  readonly kind: 'turbulence';
  readonly trial: string;
  readonly seed: number;
}
/** One flight of the proof. */
export type WindFlight = GustFlight | TurbulenceFlight;

/** What went wrong first. */
export interface WindFailure {
  /** "10 m/s", "Turbulence, severe". */
  readonly at: string;
  /** "from the right: peak tilt 17.2 deg (≤ 15 deg), peak drift": the worst score with its band, then the others. */
  readonly what: readonly string[];
}

/** What was shown; plain data, kept with the craft. */
export interface WindProof {
  readonly gust: {
    /** Greatest gust up to which everything held; null when not even the least did. */
    readonly held_mps: number | null;
    readonly failure: WindFailure | null;
    readonly seeds: readonly number[];
    readonly steps_mps: readonly number[];
    /** For each side: at each step, of how many seeds it held. */
    readonly sides: readonly { readonly side: string; readonly held: readonly number[] }[];
  };
  readonly turbulence: {
    readonly held: string | null;
    readonly failure: WindFailure | null;
    readonly seeds: readonly number[];
  };
  /** Flights that gave no answer (stopped, refused): they count as failed. */
  readonly missing: number;
}

/** All flights of the proof, seeds from `seed` up; the gentle ones come first. */
export function windFlights(seed: number): WindFlight[] {
  const gusts = GUST_STEPS_MPS.flatMap((peak_mps) =>
    GUST_SIDES.flatMap((side) =>
      seedsFrom(seed, GUST_SEEDS).map((one): WindFlight => ({ kind: 'gust', side, peak_mps, seed: one })),
    ),
  );
  const turbulence = TURBULENCE_STEPS.flatMap((trial) =>
    seedsFrom(seed, TURBULENCE_SEEDS).map((one): WindFlight => ({ kind: 'turbulence', trial, seed: one })),
  );
  return [...gusts, ...turbulence];
}

/** A flight as the trials' workers take it. */
export function windTask(flight: WindFlight, build: Build, gains: Gains): TrialTask {
  const about = { build, gains, wind: null, seed: flight.seed };
  return flight.kind === 'turbulence'
    ? { ...about, trial: flight.trial }
    : { ...about, trial: `gust-${flight.side}`, overrides: { 'trial.peak_mps': flight.peak_mps } };
}

interface Flown<F> {
  readonly flight: F;
  readonly result: TrialResult | null;
}

/** @param results in the order of `flights`; null where there is no answer */
export function windProof(
  flights: readonly WindFlight[],
  results: readonly (TrialResult | null)[],
): WindProof {
  const flown = flights.map((flight, i) => ({ flight, result: results[i] ?? null }));
  const gusts = flown.filter((one): one is Flown<GustFlight> => one.flight.kind === 'gust');
  const rough = flown.filter((one): one is Flown<TurbulenceFlight> => one.flight.kind === 'turbulence');
  return {
    gust: gustProof(gusts),
    turbulence: turbulenceProof(rough),
    missing: flown.filter((one) => one.result === null).length,
  };
}

function gustProof(flown: readonly Flown<GustFlight>[]): WindProof['gust'] {
  const steps_mps = [...new Set(flown.map(({ flight }) => flight.peak_mps))].sort((a, b) => a - b);
  const at = (peak_mps: number) => flown.filter(({ flight }) => flight.peak_mps === peak_mps);
  const { held, failed } = upTo(steps_mps, (step) => at(step).every(passed));
  const sides = [...new Set(flown.map(({ flight }) => flight.side))];
  return {
    held_mps: held,
    failure:
      failed === null
        ? null
        : { at: `${failed} m/s`, what: failuresOf(at(failed), ({ side }) => `from the ${side}`) },
    seeds: seedsOf(flown),
    steps_mps,
    sides: sides.map((side) => ({
      side,
      held: steps_mps.map((step) => at(step).filter((one) => one.flight.side === side && passed(one)).length),
    })),
  };
}

function turbulenceProof(flown: readonly Flown<TurbulenceFlight>[]): WindProof['turbulence'] {
  const steps = [...new Set(flown.map(({ flight }) => flight.trial))];
  const at = (trial: string) => flown.filter(({ flight }) => flight.trial === trial);
  const { held, failed } = upTo(steps, (step) => at(step).every(passed));
  return {
    held: held === null ? null : trialByName(held).title,
    failure:
      failed === null
        ? null
        : { at: trialByName(failed).title, what: failuresOf(at(failed), ({ seed }) => `seed ${seed}`) },
    seeds: seedsOf(flown),
  };
}

/** The last step before the first that fails, and that one: a pass above a failure proves nothing. */
function upTo<T>(
  steps: readonly T[],
  holds: (step: T) => boolean,
): { readonly held: T | null; readonly failed: T | null } {
  const first = steps.findIndex((step) => !holds(step));
  const count = first === -1 ? steps.length : first;
  return { held: count === 0 ? null : steps[count - 1], failed: first === -1 ? null : steps[first] };
}

const MOST_FAILURES = 4;

function failuresOf<F extends WindFlight>(
  flown: readonly Flown<F>[],
  where: (flight: F) => string,
): string[] {
  const told = new Map<string, string>();
  for (const one of flown) {
    const place = where(one.flight);
    if (!passed(one) && !told.has(place)) told.set(place, `${place}: ${failureText(one.result)}`);
  }
  return [...told.values()].slice(0, MOST_FAILURES);
}

function failureText(result: TrialResult | null): string {
  if (result === null) return 'no answer';
  if (result.stopped !== null) return result.stopped;
  const [worst, ...others] = result.scores
    .filter((score) => !score.pass)
    .sort((a, b) => excess(b) - excess(a));
  const more = others.length === 0 ? '' : `, ${others.map(({ name }) => name).join(', ')}`;
  return `${worst.name} ${scoreText(worst)} (${bandText(worst.band, worst.unit)})${more}`;
}

/** How far outside its band, as a share of the band's edge; what was never reached is furthest. */
function excess({ value, band }: Score): number {
  if (value === null) return Infinity;
  const over = band.most === undefined ? 0 : (value - band.most) / Math.max(Math.abs(band.most), 1e-9);
  const under = band.least === undefined ? 0 : (band.least - value) / Math.max(Math.abs(band.least), 1e-9);
  return Math.max(over, under);
}

function passed({ result }: Flown<WindFlight>): boolean {
  return result?.pass === true;
}

function seedsOf(flown: readonly Flown<WindFlight>[]): number[] {
  return [...new Set(flown.map(({ flight }) => flight.seed))].sort((a, b) => a - b);
}

function seedsFrom(seed: number, count: number): number[] {
  return Array.from({ length: count }, (_, i) => seed + i);
}
