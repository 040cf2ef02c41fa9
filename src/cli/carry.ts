/** `carry`: the pre-flight sheet, the constants in the firmware's convention, build and gains as files. */
import { mkdirSync } from 'node:fs';
import { availableParallelism } from 'node:os';
import path from 'node:path';
import type { Command } from 'commander';
import { assembleSheet, QUANTITY_NAMES, SHEET_TRIALS } from '../carrying/assemble.ts';
import { sheetHtml } from '../carrying/sheet.ts';
import { windFlights, windProof, windTask, type WindProof } from '../carrying/windLimit.ts';
import { windSentences } from '../carrying/windWords.ts';
import type { Build } from '../craft/build.ts';
import type { Gains } from '../craft/gains.ts';
import { InputError, refuse } from '../craft/problem.ts';
import {
  CONVENTIONS,
  exportConstants,
  EXPORTS,
  parseConvention,
  type Convention,
} from '../shaping/conventions.ts';
import { inPlaceWorker, runTasks } from '../trials/pool.ts';
import type { TaskAnswer } from '../trials/protocol.ts';
import type { TrialTask } from '../trials/runTrial.ts';
import type { TrialResult } from '../trials/trial.ts';
import { DONE, numberOption, printJson, readBuild, readGains, readJson, runVerb, writeText } from './io.ts';
import { threadWorker } from './trialPool.ts';

interface CarryOptions {
  build: string;
  gains: string;
  convention?: string;
  out: string;
  seed: string;
  date?: string;
  known?: string;
  trials: boolean;
  windLimit: boolean;
  json?: boolean;
}

const ENDINGS = {
  c: 'rate_gains.h',
  cpp: 'rate_gains.hpp',
  json: 'constants.json',
  text: 'constants.txt',
} as const;

export function addCarryCommand(program: Command): void {
  program
    .command('carry')
    .description('pre-flight sheet (HTML, printable), constants for the firmware, build and gains as files')
    .requiredOption('--build <file>', 'build file')
    .requiredOption('--gains <file>', 'gains file')
    .requiredOption('--out <folder>', 'folder to write into; made when it is missing')
    .option(
      '--convention <file>',
      'gain convention, gustbench.convention/1; µs and deg/s per second when absent',
    )
    .option('--seed <number>', 'seed of the trials', '1')
    .option('--date <text>', 'date printed on the sheet; today when absent')
    .option('--known <file>', 'how well quantities are known: a JSON object of quantity and text, "± 3 %"')
    .option('--no-trials', 'leave the trials out, and with them the wind limit')
    .option('--no-wind-limit', 'leave the flights in rising wind out')
    .option('--json', 'print one JSON object')
    .action((options: CarryOptions) => runVerb(() => carry(options)));
}

async function carry(options: CarryOptions): Promise<number> {
  const build = readBuild(options.build);
  const gains = readGains(options.gains);
  const seed = numberOption('seed', options.seed, 0, Number.MAX_SAFE_INTEGER, '', true);
  const convention =
    options.convention === undefined
      ? CONVENTIONS[0]
      : parseConvention(readJson(options.convention), options.convention);
  const known = options.known === undefined ? {} : readKnown(options.known);
  const trials = options.trials
    ? SHEET_TRIALS.map((trial): TrialTask => ({ trial, build, gains, wind: null, seed }))
    : [];
  const flights = options.trials && options.windLimit ? windFlights(seed) : [];
  const flown = await flyAll([...trials, ...flights.map((flight) => windTask(flight, build, gains))]);
  const results = flown.slice(0, trials.length).filter((one) => one !== null);
  const wind = flights.length === 0 ? null : windProof(flights, flown.slice(trials.length));
  const printedAt = options.date ?? new Date().toISOString().slice(0, 10);
  const sheet = sheetHtml(assembleSheet({ build, gains, convention, results, wind, printedAt, known }));
  const files = writeFiles(options, { build, gains, convention, sheet });
  tell(options, convention, files, results, wind);
  return DONE;
}

function readKnown(file: string): Record<string, string> {
  const raw = readJson(file);
  if (typeof raw !== 'object' || raw === null || Array.isArray(raw))
    throw refuse(file, '', JSON.stringify(raw)?.slice(0, 40), 'an object of quantity and text');
  const known: Record<string, string> = {};
  for (const [name, text] of Object.entries(raw)) {
    if (!QUANTITY_NAMES.includes(name)) throw refuse(file, name, name, `one of ${QUANTITY_NAMES.join(', ')}`);
    if (typeof text !== 'string' || text.length > LONGEST_KNOWN)
      throw refuse(file, name, JSON.stringify(text), `a text of at most ${LONGEST_KNOWN} characters`);
    known[name] = text;
  }
  return known;
}
const LONGEST_KNOWN = 60;

/** Results in the order of the tasks. @throws InputError when the craft cannot fly them. */
async function flyAll(tasks: readonly TrialTask[]): Promise<(TrialResult | null)[]> {
  const workers = Math.min(availableParallelism(), Math.ceil(tasks.length / FLIGHTS_A_WORKER));
  const entry = new URL(import.meta.url);
  const answers = new Array<TaskAnswer | null>(tasks.length).fill(null);
  await runTasks(workers > 1 ? () => threadWorker(entry) : inPlaceWorker, workers, {
    count: tasks.length,
    taskAt: (index) => tasks[index],
    hear: (index, answer) => {
      answers[index] = answer;
    },
    progress: ({ done, count, left_s }) => {
      if (done % FLIGHTS_A_LINE === 0 && left_s !== null)
        process.stderr.write(`${done} of ${count} flights, about ${Math.ceil(left_s)} s left\n`);
    },
  }).done;
  return answers.map((answer) => {
    if (answer?.kind === 'refused') throw new InputError(answer.file, answer.problems);
    return answer?.kind === 'done' ? answer.result : null;
  });
}
/** Fewer are not worth the start of a thread. */
const FLIGHTS_A_WORKER = 8;
const FLIGHTS_A_LINE = 25;

interface Carried {
  readonly build: Build;
  readonly gains: Gains;
  readonly convention: Convention;
  readonly sheet: string;
}

function writeFiles(options: CarryOptions, { build, gains, convention, sheet }: Carried): string[] {
  makeFolder(options.out);
  const files: string[] = [];
  const write = (name: string, text: string): void => {
    const file = path.join(options.out, name);
    writeText(file, [text]);
    files.push(file);
  };
  write('sheet.html', sheet);
  try {
    for (const kind of EXPORTS) write(ENDINGS[kind], exportConstants(gains, convention, kind, build.name));
  } catch (error) {
    if (error instanceof RangeError)
      throw refuse(options.gains, 'axes', error.message, 'gains that the convention can express');
    throw error;
  }
  write('build.json', `${JSON.stringify(build, null, 2)}\n`);
  write('gains.json', `${JSON.stringify(gains, null, 2)}\n`);
  return files;
}

function tell(
  options: CarryOptions,
  convention: Convention,
  files: readonly string[],
  results: readonly TrialResult[],
  wind: WindProof | null,
): void {
  const outside = results.filter((result) => !result.pass).map((result) => result.trial);
  if (options.json === true) {
    printJson({ files, convention: convention.name, trialsRun: results.length, outside, wind });
    return;
  }
  process.stdout.write(`${files.join('\n')}\n`);
  if (outside.length > 0) process.stdout.write(`OUTSIDE its band: ${outside.join(', ')}\n`);
  if (wind !== null) process.stdout.write(`${windSentences(wind).join('\n')}\n`);
  process.stdout.write('A simulated pass is no clearance to fly.\n');
}

function makeFolder(folder: string): void {
  try {
    mkdirSync(folder, { recursive: true });
  } catch (error) {
    const code = error instanceof Error && 'code' in error ? String(error.code) : 'unwritable';
    throw refuse('command line', '--out', `${folder} (${code})`, 'a folder that can be made and written');
  }
}
