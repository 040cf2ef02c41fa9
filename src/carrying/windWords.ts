/** The wind limit as the sheet says it. */
import type { SheetWind } from './sheet.ts';
import type { WindFailure, WindProof } from './windLimit.ts';

/** A mile is 1609.344 m (international yard and pound agreement, 1959). */
const MPH_PER_MPS = 3600 / 1609.344;

/** @returns sentences and the table of sides against speeds */
export function sheetWind(proof: WindProof): SheetWind {
  const { gust } = proof;
  return {
    sentences: windSentences(proof),
    steps: gust.steps_mps.map((step) => `${step} m/s`),
    sides: gust.sides.map(({ side, held }) => ({
      side,
      held: held.map((count) => (count === gust.seeds.length ? 'held' : `${count} of ${gust.seeds.length}`)),
    })),
  };
}

/** What held, and what failed first. */
export function windSentences(proof: WindProof): string[] {
  return [
    gustSentence(proof),
    turbulenceSentence(proof),
    ...(proof.missing === 0 ? [] : [`${proof.missing} flights gave no answer and count as failed.`]),
  ];
}

function gustSentence({ gust }: WindProof): string {
  const held =
    gust.held_mps === null
      ? `Gust: did not hold ${gust.steps_mps[0]} m/s, the least tried, from all four sides`
      : `Gust: held up to ${speed(gust.held_mps)} from all four sides, ${seedWords(gust.seeds)}`;
  const highest = gust.steps_mps[gust.steps_mps.length - 1];
  return `${held}; ${failureWords(gust.failure, `no failure up to ${highest} m/s, the highest tried`)}`;
}

function turbulenceSentence({ turbulence }: WindProof): string {
  const held =
    turbulence.held === null
      ? 'Turbulence of MIL-F-8785C: did not hold the least level tried'
      : `Turbulence of MIL-F-8785C: held up to “${turbulence.held}”, ${seedWords(turbulence.seeds)}`;
  return `${held}; ${failureWords(turbulence.failure, 'no failure up to the highest level tried')}`;
}

function failureWords(failure: WindFailure | null, none: string): string {
  return failure === null ? `${none}.` : `first failure at ${failure.at}: ${failure.what.join('; ')}.`;
}

function speed(mps: number): string {
  return `${mps} m/s (${Math.floor(mps * MPH_PER_MPS)} mph)`;
}

function seedWords(seeds: readonly number[]): string {
  if (seeds.length === 1) return `one seed (${seeds[0]})`;
  return `${seeds.length} seeds (${seeds[0]} to ${seeds[seeds.length - 1]})`;
}

/** What the flights in wind leave open. */
export function windNotTested(proof: WindProof | null): string[] {
  if (proof === null) return ['Wind limit: gusts of rising speed and turbulence over several seeds.'];
  const highest = proof.gust.steps_mps[proof.gust.steps_mps.length - 1];
  const steps = proof.gust.held_mps === highest ? [`Gusts above ${highest} m/s.`] : [];
  return [
    ...steps,
    'Gusts of another length than 0.6 s up and 0.6 s down; up- and downdraughts; gusts near the ground.',
  ];
}
