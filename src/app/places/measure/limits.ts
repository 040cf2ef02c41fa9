/** How large and how many files a bench takes; refused before anything of them is read. */
import type { BenchKind } from './kinds.ts';
import { measureTexts as words } from './texts.ts';

/** Bytes of all files together. A gyro at rest for ten minutes at 2 kHz has about 100 MB. */
export const LARGEST_BYTES: Readonly<Record<BenchKind, number>> = {
  swing: 1_000_000,
  stand: 20_000_000,
  spinup: 100_000_000,
  still: 250_000_000,
};
const MOST_FILES = 20;

/** Why these files are not taken, null when they are. */
export function refusedFiles(kind: BenchKind, files: readonly File[]): string | null {
  if (files.length > MOST_FILES) return words.tooMany(files.length, MOST_FILES);
  const allowed_MB = LARGEST_BYTES[kind] / 1e6;
  const huge = files.find((file) => file.size > LARGEST_BYTES[kind]);
  if (huge !== undefined) return words.tooLarge(huge.name, huge.size / 1e6, allowed_MB);
  const all = files.reduce((sum, file) => sum + file.size, 0);
  return all > LARGEST_BYTES[kind] ? words.tooLargeTogether(all / 1e6, allowed_MB) : null;
}
