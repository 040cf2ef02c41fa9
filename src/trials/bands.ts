/** Bands of a person's own, in place of a trial's: as data in run descriptions and sweeps. */
import { z } from 'zod';
import { quantity } from '../craft/fields.ts';
import { refuse } from '../craft/problem.ts';
import type { Band, Trial } from './trial.ts';

/** Bands in place of a trial's own, by score name. */
export type Bands = Readonly<Record<string, Band>>;

const limit = quantity(-1e12, 1e12, '').optional();

export const bandsSchema = z.record(
  z.string(),
  z.strictObject(
    { least: limit, most: limit },
    { error: 'an object with least, most or both; {} leaves the score open' },
  ),
  { error: 'bands by score' },
);

/** Values of build, gains, wind and trial by path. */
export const overridesSchema = z.record(z.string(), quantity(-1e12, 1e12, ''), { error: 'numbers by path' });

/** @throws InputError for a band of a score that the trial does not have, or one that nothing can keep */
export function checkBands(trial: Trial, bands: Bands, file = 'bands'): void {
  for (const [name, { least, most }] of Object.entries(bands)) {
    const path = `bands.${trial.name}.${name}`;
    if (!trial.scores.some((score) => score.name === name)) {
      throw refuse(file, path, name, `one of ${trial.scores.map((score) => score.name).join(', ')}`);
    }
    if (least !== undefined && most !== undefined && least > most) {
      throw refuse(file, `${path}.least`, least, `at most ${most}, the greatest`);
    }
  }
}
