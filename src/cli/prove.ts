/** `prove`: trials with scores, bands, pass or fail; sweeps; JSON and HTML. */
import { availableParallelism } from 'node:os';
import type { Command } from 'commander';
import { z } from 'zod';
import { formatTag, parseWith } from '../craft/fields.ts';
import { InputError, refuse } from '../craft/problem.ts';
import { inPlaceWorker, runPool, type TaskAnswer, type TrialWorker } from '../trials/pool.ts';
import { bandText, reportHtml } from '../trials/report.ts';
import { TRIALS, trialByName } from '../trials/registry.ts';
import type { TrialTask } from '../trials/runTrial.ts';
import { axisValue, cellsInOrder, cellTask, parseSweep } from '../trials/sweep.ts';
import type { TrialResult } from '../trials/trial.ts';
import {
  DONE,
  numberOption,
  OUTSIDE_BAND,
  printJson,
  readBuild,
  readGains,
  readJson,
  readWind,
  runVerb,
  writeText,
} from './io.ts';
import { threadWorker } from './trialPool.ts';

interface ProveOptions {
  build: string;
  gains: string;
  wind?: string;
  trial?: string[];
  sweep?: string;
  run?: string;
  workers?: string;
  seed: string;
  html?: string;
  notes?: string;
  list?: boolean;
  json?: boolean;
}

/** A run description: trials with bands of one's own. */
const runSchema = z.strictObject({
  format: formatTag('gustbench.run/1'),
  trials: z.array(z.string()).max(200),
  bands: z
    .record(
      z.string(),
      z.record(z.string(), z.strictObject({ least: z.number().optional(), most: z.number().optional() })),
    )
    .default({}),
  notes: z.string().max(4000).default(''),
});

export function addProveCommand(program: Command): void {
  program
    .command('prove')
    .description('repeatable trials with scores and bands; sweeps over one or two fields')
    .requiredOption('--build <file>', 'build file')
    .requiredOption('--gains <file>', 'gains file')
    .option('--trial <name...>', 'trials to run; all when absent')
    .option('--wind <file>', 'wind in place of the trials’ own')
    .option('--sweep <file>', 'sweep file, gustbench.sweep/1')
    .option('--run <file>', 'run description, gustbench.run/1: trials and bands')
    .option('--workers <number>', 'worker threads')
    .option('--seed <number>', 'seed of everything random', '1')
    .option('--html <file>', 'report to write')
    .option('--notes <text>', 'notes for the report')
    .option('--list', 'list the trials')
    .option('--json', 'print one JSON object')
    .action((options: ProveOptions) => runVerb(() => prove(options)));
}

async function prove(options: ProveOptions): Promise<number> {
  if (options.list === true) {
    for (const trial of TRIALS) process.stdout.write(`${trial.name.padEnd(30)}${trial.purpose}\n`);
    return DONE;
  }
  const seed = numberOption('seed', options.seed, 0, Number.MAX_SAFE_INTEGER, '', true);
  const workers =
    options.workers === undefined
      ? availableParallelism()
      : numberOption('workers', options.workers, 1, 64, '', true);
  return options.sweep === undefined ? proveTrials(options, seed, workers) : proveSweep(options, workers);
}

async function proveTrials(options: ProveOptions, seed: number, workers: number): Promise<number> {
  const build = readBuild(options.build);
  const gains = readGains(options.gains);
  const run = options.run === undefined ? null : parseWith(runSchema, readJson(options.run), options.run);
  const wind = options.wind === undefined ? undefined : readWind(options.wind);
  const names = options.trial ?? run?.trials ?? TRIALS.map((trial) => trial.name);
  for (const name of names) trialByName(name);
  const results = new Array<TrialResult>(names.length);
  await overPool(
    workers,
    names.length,
    (index): TrialTask => ({
      trial: names[index],
      build,
      gains,
      seed,
      ...(wind === undefined ? {} : { wind }),
      ...(run?.bands[names[index]] === undefined ? {} : { bands: run.bands[names[index]] }),
    }),
    (index, answer) => {
      results[index] = resultOf(answer);
    },
  );
  const pass = results.every((result) => result.pass);
  if (options.html !== undefined) {
    writeText(options.html, [
      reportHtml({ build, gains, results, notes: options.notes ?? run?.notes ?? '', seed }),
    ]);
  }
  if (options.json === true) printJson({ pass, seed, trials: results });
  else describe(results);
  return pass ? DONE : OUTSIDE_BAND;
}

/** A task that could not be flown ends the verb: refused input as such, a crash as a plain line. */
function resultOf(answer: TaskAnswer): TrialResult {
  if (answer.kind === 'done') return answer.result;
  if (answer.kind === 'refused') throw new InputError(answer.file, answer.problems);
  throw refuse('prove', 'worker', answer.reason, 'a worker that lives');
}

async function proveSweep(options: ProveOptions, workers: number): Promise<number> {
  const subject = {
    build: readBuild(options.build),
    gains: readGains(options.gains),
    wind: options.wind === undefined ? null : readWind(options.wind),
  };
  const file = options.sweep ?? '';
  const sweep = parseSweep(readJson(file), subject, file);
  const rows = sweep.y?.count ?? 1;
  const order = cellsInOrder(sweep.x.count, rows);
  const names = trialByName(sweep.trial).scores.map((score) => score.name);
  const cells = new Array<{
    x: number;
    y: number | null;
    scores: Record<string, number | null> | null;
    pass: boolean;
    refused?: string;
  }>(order.length);
  let shown = 0;
  await overPool(
    workers,
    order.length,
    (index) => cellTask(sweep, subject, order[index]),
    (index, answer) => {
      const cell = order[index];
      const at = {
        x: axisValue(sweep.x, cell.column),
        y: sweep.y === undefined ? null : axisValue(sweep.y, cell.row),
      };
      const place = cell.row * sweep.x.count + cell.column;
      if (answer.kind === 'done') {
        const scores = Object.fromEntries(answer.result.scores.map((score) => [score.name, score.value]));
        cells[place] = { ...at, scores, pass: answer.result.pass };
      } else {
        const why =
          answer.kind === 'refused'
            ? `${answer.problems[0]?.path}: ${answer.problems[0]?.allowed}`
            : answer.reason;
        cells[place] = { ...at, scores: null, pass: false, refused: why };
      }
      shown++;
      if (shown % 50 === 0) process.stderr.write(`${shown} of ${order.length} cells\n`);
    },
  );
  const pass = cells.every((cell) => cell.pass);
  if (options.json === true) printJson({ pass, sweep, cells });
  else {
    process.stdout.write(`${[sweep.x.path, sweep.y?.path ?? '', ...names, 'pass'].join('\t')}\n`);
    for (const cell of cells) {
      process.stdout.write(
        `${[cell.x, cell.y ?? '', ...names.map((name) => cell.scores?.[name] ?? ''), cell.pass ? 'within' : 'OUTSIDE'].join('\t')}\n`,
      );
    }
  }
  return pass ? DONE : OUTSIDE_BAND;
}

async function overPool(
  count: number,
  tasks: number,
  taskAt: (index: number) => TrialTask,
  hear: (index: number, answer: TaskAnswer) => void,
): Promise<void> {
  const entry = new URL(import.meta.url);
  const workers: TrialWorker[] =
    count === 1
      ? [inPlaceWorker()]
      : Array.from({ length: Math.min(count, tasks) }, () => threadWorker(entry));
  let problem: unknown = null;
  const run = runPool(workers, tasks, taskAt, (index, answer) => {
    try {
      hear(index, answer);
    } catch (error) {
      problem ??= error;
      run.cancel();
    }
  });
  await run.done;
  for (const worker of workers) worker.end();
  if (problem !== null) throw problem;
}

function describe(results: readonly TrialResult[]): void {
  for (const result of results) {
    process.stdout.write(
      `${result.pass ? 'within ' : 'OUTSIDE'} ${result.title}${result.stopped === null ? '' : ` (${result.stopped})`}\n`,
    );
    for (const score of result.scores) {
      const value =
        score.value === null ? 'not reached' : `${Number(score.value.toPrecision(3))} ${score.unit}`;
      process.stdout.write(
        `        ${score.name.padEnd(18)}${value.padEnd(20)}${bandText(score.band, score.unit)}${score.pass ? '' : '   OUTSIDE'}\n`,
      );
    }
  }
  process.stdout.write('A simulated pass is no clearance to fly.\n');
}
