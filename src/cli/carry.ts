/** `carry`: the pre-flight sheet, the constants in the firmware's convention, build and gains as files. */
import { mkdirSync } from 'node:fs';
import path from 'node:path';
import type { Command } from 'commander';
import { assembleSheet, SHEET_TRIALS } from '../carrying/assemble.ts';
import { sheetHtml } from '../carrying/sheet.ts';
import { refuse } from '../craft/problem.ts';
import { CONVENTIONS, exportConstants, EXPORTS, parseConvention } from '../shaping/conventions.ts';
import { runTrial } from '../trials/runTrial.ts';
import { DONE, numberOption, printJson, readBuild, readGains, readJson, runVerb, writeText } from './io.ts';

interface CarryOptions {
  build: string;
  gains: string;
  convention?: string;
  out: string;
  seed: string;
  date?: string;
  trials: boolean;
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
    .option('--no-trials', 'leave the trials out')
    .option('--json', 'print one JSON object')
    .action((options: CarryOptions) => runVerb(() => carry(options)));
}

function carry(options: CarryOptions): number {
  const build = readBuild(options.build);
  const gains = readGains(options.gains);
  const seed = numberOption('seed', options.seed, 0, Number.MAX_SAFE_INTEGER, '', true);
  const convention =
    options.convention === undefined
      ? CONVENTIONS[0]
      : parseConvention(readJson(options.convention), options.convention);
  const results = options.trials ? SHEET_TRIALS.map((trial) => runTrial({ trial, build, gains, seed })) : [];
  const printedAt = options.date ?? new Date().toISOString().slice(0, 10);
  const sheet = sheetHtml(assembleSheet({ build, gains, convention, results, seed, printedAt }));
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
  const outside = results.filter((result) => !result.pass).map((result) => result.trial);
  if (options.json === true)
    printJson({ files, convention: convention.name, trialsRun: results.length, outside });
  else {
    process.stdout.write(`${files.join('\n')}\n`);
    if (outside.length > 0) process.stdout.write(`OUTSIDE its band: ${outside.join(', ')}\n`);
    process.stdout.write('A simulated pass is no clearance to fly.\n');
  }
  return DONE;
}

function makeFolder(folder: string): void {
  try {
    mkdirSync(folder, { recursive: true });
  } catch (error) {
    const code = error instanceof Error && 'code' in error ? String(error.code) : 'unwritable';
    throw refuse('command line', '--out', `${folder} (${code})`, 'a folder that can be made and written');
  }
}
