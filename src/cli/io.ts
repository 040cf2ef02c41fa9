/** Reading and writing for the command line: files to text, problems to one line, exit codes. */
import { readFileSync, writeFileSync } from 'node:fs';
import { parseBuild, type Build } from '../craft/build.ts';
import { LARGEST_JSON_BYTES, parseJson } from '../craft/fields.ts';
import { parseGains, type Gains } from '../craft/gains.ts';
import { describeProblem, InputError, refuse } from '../craft/problem.ts';
import { parseScene, type Scene } from '../craft/scene.ts';
import { parseWind, type Wind } from '../craft/wind.ts';

/** Exit codes of every verb. */
export const DONE = 0;
export const OUTSIDE_BAND = 1;
export const BAD_INPUT = 2;

/**
 * Text of a file.
 * @throws InputError when it cannot be read or is larger than `most` bytes.
 */
export function readText(file: string, most = LARGEST_JSON_BYTES): string {
  let bytes: Buffer;
  try {
    bytes = readFileSync(file);
  } catch (error) {
    const code = error instanceof Error && 'code' in error ? String(error.code) : 'unreadable';
    throw refuse(file, '', code, 'a file that can be read');
  }
  if (bytes.length > most) throw refuse(file, '', `${bytes.length} bytes`, `at most ${most} bytes`);
  if (bytes.subarray(0, 4096).includes(0)) throw refuse(file, '', 'binary data', 'a text file');
  return bytes.toString('utf8');
}

export const readJson = (file: string): unknown => parseJson(readText(file), file);
export const readBuild = (file: string): Build => parseBuild(readJson(file), file);
export const readGains = (file: string): Gains => parseGains(readJson(file), file);
export const readWind = (file: string): Wind => parseWind(readJson(file), file);
export const readScene = (file: string): Scene => parseScene(readJson(file), file);

/** Writes text in pieces. @throws InputError when the place cannot be written. */
export function writeText(file: string, pieces: Iterable<string>): void {
  try {
    writeFileSync(file, '');
    for (const piece of pieces) writeFileSync(file, piece, { flag: 'a' });
  } catch (error) {
    const code = error instanceof Error && 'code' in error ? String(error.code) : 'unwritable';
    throw refuse(file, '', code, 'a place that can be written');
  }
}

/** A number option. @throws InputError naming the option, the value and what is allowed. */
export function numberOption(
  name: string,
  text: string,
  min: number,
  max: number,
  unit: string,
  whole = false,
): number {
  const value = text.trim() === '' ? NaN : Number(text);
  if (!Number.isFinite(value) || value < min || value > max || (whole && !Number.isInteger(value))) {
    const kind = whole ? 'a whole number' : 'a number';
    throw refuse(
      'command line',
      `--${name}`,
      text,
      `${kind} from ${min} to ${max}${unit === '' ? '' : ` ${unit}`}`,
    );
  }
  return value;
}

/** Runs a verb: bad input becomes one line on standard error and exit code 2, never a stack. */
export async function runVerb(verb: () => number | Promise<number>): Promise<void> {
  try {
    process.exitCode = await verb();
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    const more = error.problems.length - 1;
    const rest = more > 0 ? ` (and ${more} more like it)` : '';
    process.stderr.write(`${describeProblem(error.file, error.problems[0])}${rest}\n`);
    process.exitCode = BAD_INPUT;
  }
}

/** Prints one JSON object on standard output. */
export function printJson(value: unknown): void {
  process.stdout.write(`${JSON.stringify(value)}\n`);
}
