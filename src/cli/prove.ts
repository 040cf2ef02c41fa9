/** `prove`: trials with scores, bands, pass or fail; sweeps; spread over an uncertain build; JSON and HTML. */
import { existsSync } from 'node:fs';
import { availableParallelism } from 'node:os';
import type { Command } from 'commander';
import { InputError, refuse } from '../craft/problem.ts';
import { VERSION } from '../flight/record.ts';
import { inPlaceWorker, runTasks, type PoolRun, type PoolWork, type Progress } from '../trials/pool.ts';
import type { TaskAnswer } from '../trials/protocol.ts';
import { TRIALS, trialByName } from '../trials/registry.ts';
import { bandText, reportHtml, scoreText, type ReportContent } from '../trials/report.ts';
import {
  parseRun,
  PLAIN_RUN,
  runTasksOf,
  sweepOf,
  type RunDescription,
  type RunSubject,
  type SpreadRequest,
} from '../trials/runDescription.ts';
import type { TrialTask } from '../trials/runTrial.ts';
import { axisValue } from '../trials/sweep.ts';
import { mapOf, runSweep, SweepCells } from '../trials/sweepResult.ts';
import type { TrialResult } from '../trials/trial.ts';
import {
  latinHypercube,
  spreadSchema,
  spreadsOf,
  spreadTasks,
  summariseSpread,
  type SpreadSummary,
} from '../trials/uncertainty.ts';
import {
  DONE,
  numberOption,
  OUTSIDE_BAND,
  printJson,
  readBuild,
  readGains,
  readJson,
  readText,
  readWind,
  runVerb,
  writeText,
} from './io.ts';
import { threadWorker } from './trialPool.ts';

interface ProveOptions {
  build?: string;
  gains?: string;
  baseline?: string;
  wind?: string;
  trial?: string[];
  sweep?: string;
  cells?: string;
  spread?: string;
  run?: string;
  workers?: string;
  seed?: string;
  html?: string;
  notes?: string;
  list?: boolean;
  json?: boolean;
}

/** Stopped by Ctrl-C, as shells count it. */
const INTERRUPTED = 130;
/** A sweep result of 40,000 cells fits. */
const LARGEST_CELLS_BYTES = 100_000_000;
/** Finished cells are written down this often. */
const KEEP_EVERY_S = 5;

export function addProveCommand(program: Command): void {
  program
    .command('prove')
    .description('repeatable trials with scores and bands; sweeps over one or two fields; spread')
    .option('--build <file>', 'build file; may be left out where the run description has one')
    .option('--gains <file>', 'gains file; may be left out where the run description has one')
    .option('--trial <name...>', 'trials to run; all when absent (see --list)')
    .option('--baseline <file>', 'another gains file, flown on the same seed to compare with')
    .option('--wind <file>', 'wind in place of the trials’ own')
    .option('--sweep <file>', 'sweep file, gustbench.sweep/1: one trial over one or two fields')
    .option(
      '--cells <file>',
      'keep the sweep’s finished cells here; started again with it, the sweep goes on',
    )
    .option('--spread <samples>', 'fly each trial over this many samples of an uncertain build')
    .option(
      '--run <file>',
      'run description, gustbench.run/1: trials, bands, overrides, sweep, spread, notes',
    )
    .option('--workers <number>', 'worker threads; as many as there are cores when absent')
    .option('--seed <number>', 'seed of everything random')
    .option('--html <file>', 'report to write')
    .option('--notes <text>', 'notes for the report')
    .option('--list', 'list the trials and end')
    .option('--json', 'print one JSON object')
    .action((options: ProveOptions) => runVerb(() => prove(options)));
}

/** What to do, from files and options; an option goes before the run description. */
interface Plan {
  readonly run: RunDescription;
  readonly file: string;
  readonly subject: RunSubject;
  readonly workers: number;
  readonly options: ProveOptions;
}

async function prove(options: ProveOptions): Promise<number> {
  if (options.list === true) return list(options);
  const plan = planOf(options);
  const { run } = plan;
  if (options.sweep !== undefined || run.sweep !== null) return proveSweep(plan);
  if (options.spread !== undefined || run.spread !== null) return proveSpread(plan);
  if (options.cells !== undefined)
    throw refuse('command line', '--cells', options.cells, 'only with a sweep');
  return proveTrials(plan);
}

function list(options: ProveOptions): number {
  if (options.json === true) {
    const rows = TRIALS.map(({ name, title, purpose, parameters, scores }) => ({
      name,
      title,
      purpose,
      parameters,
      scores,
    }));
    printJson({ trials: rows });
  } else {
    for (const trial of TRIALS) process.stdout.write(`${trial.name.padEnd(30)}${trial.purpose}\n`);
  }
  return DONE;
}

function planOf(options: ProveOptions): Plan {
  const file = options.run ?? 'command line';
  const described = options.run === undefined ? PLAIN_RUN : parseRun(readJson(options.run), options.run);
  const build = options.build === undefined ? described.build : readBuild(options.build);
  const gains = options.gains === undefined ? described.gains : readGains(options.gains);
  if (build === null) throw refuse('command line', '--build', undefined, 'a build file');
  if (gains === null) throw refuse('command line', '--gains', undefined, 'a gains file');
  for (const name of options.trial ?? []) trialByName(name, '--trial');
  const seed =
    options.seed === undefined
      ? (described.seed ?? 1)
      : numberOption('seed', options.seed, 0, Number.MAX_SAFE_INTEGER, '', true);
  const run: RunDescription = {
    ...described,
    trials: options.trial ?? described.trials,
    notes: options.notes ?? described.notes,
    baseline: options.baseline === undefined ? described.baseline : readGains(options.baseline),
  };
  const workers =
    options.workers === undefined
      ? availableParallelism()
      : numberOption('workers', options.workers, 1, 64, '', true);
  const wind = options.wind === undefined ? described.wind : readWind(options.wind);
  return { run, file, subject: { build, gains, wind, seed }, workers, options };
}

// --- Trials ------------------------------------------------------------------------------------------------

async function proveTrials({ run, file, subject, workers, options }: Plan): Promise<number> {
  const { build, gains, seed, wind } = subject;
  const { baseline } = run;
  const tasks = runTasksOf(run, subject, file);
  const others = baseline === null ? [] : runTasksOf(run, { ...subject, gains: baseline }, file);
  const answers = await flyAll([...tasks, ...others], workers, 'trials');
  if (answers === null) return INTERRUPTED;
  const all = answers.map(resultOf);
  const results = all.slice(0, tasks.length);
  const before = all.slice(tasks.length);
  const pass = results.every((result) => result.pass);
  const content: ReportContent = {
    ...{ build, gains, results, seed, wind, notes: run.notes, overrides: run.overrides, bands: run.bands },
    ...(baseline === null ? {} : { baseline: { gains: baseline, results: before } }),
  };
  if (options.html !== undefined) writeText(options.html, [reportHtml(content)]);
  if (options.json === true) {
    printJson({
      pass,
      seed,
      version: VERSION,
      trials: results,
      ...(baseline === null ? {} : { baseline: before }),
    });
  } else {
    describe(results, before);
  }
  return pass ? DONE : OUTSIDE_BAND;
}

/** A task that could not be flown ends the verb: refused input as such, a crash as a plain line. */
function resultOf(answer: TaskAnswer): TrialResult {
  if (answer.kind === 'done') return answer.result;
  if (answer.kind === 'refused') throw new InputError(answer.file, answer.problems);
  throw refuse('prove', 'worker', answer.reason, 'a worker that lives through its trial');
}

function describe(results: readonly TrialResult[], before: readonly TrialResult[]): void {
  const lines: string[] = [];
  results.forEach((result, i) => {
    const why = result.stopped ?? result.note;
    lines.push(`${result.pass ? 'within ' : 'OUTSIDE'} ${result.title}${why === null ? '' : ` (${why})`}`);
    result.scores.forEach((score, k) => {
      const earlier = before.length === 0 ? '' : `${scoreText(before[i].scores[k])} `.padStart(20);
      const verdict = score.pass ? '' : '   OUTSIDE';
      lines.push(
        `        ${score.name.padEnd(22)}${scoreText(score).padEnd(20)}${earlier}${bandText(score.band, score.unit)}${verdict}`,
      );
    });
  });
  const within = results.filter((result) => result.pass).length;
  lines.push(
    `${within} of ${results.length} trials within their bands.`,
    'A simulated pass is no clearance to fly.',
  );
  process.stdout.write(`${lines.join('\n')}\n`);
}

// --- Sweep -------------------------------------------------------------------------------------------------

async function proveSweep(plan: Plan): Promise<number> {
  const { options, workers } = plan;
  const kept = cellsOf(plan);
  const file = options.cells;
  let written_s = 0;
  const run = runSweep(kept, workerMaker(workers), workers, {
    progress: (progress) => {
      showProgress(progress, 'cells');
      if (file === undefined || progress.elapsed_s - written_s < KEEP_EVERY_S) return;
      written_s = progress.elapsed_s;
      keepCells(file, kept);
    },
  });
  const { end, deaths } = await untilDone(run);
  if (file !== undefined) keepCells(file, kept);
  const left = kept.count - kept.done;
  if (end === 'cancelled' || end === 'crashed' || left > 0) {
    const again =
      file === undefined
        ? 'nothing is kept without --cells FILE'
        : `started again with --cells ${file} it goes on`;
    process.stderr.write(`${kept.done} of ${kept.count} cells finished, ${left} left; ${again}\n`);
    if (end === 'cancelled') return INTERRUPTED;
    throw refuse(
      'prove',
      'worker',
      deaths.at(-1) ?? 'a cell that the program failed at',
      'workers that live through their cells',
    );
  }
  if (options.html !== undefined) {
    const { build, gains, wind, seed } = plan.subject;
    writeText(options.html, [
      reportHtml({ build, gains, wind, seed, results: [], notes: plan.run.notes, sweep: kept }),
    ]);
  }
  printSweep(kept, options.json === true);
  return kept.cells().every((cell) => cell.pass) ? DONE : OUTSIDE_BAND;
}

/** The sweep with what an earlier start of it finished. */
function cellsOf({ run, file, subject, options }: Plan): SweepCells {
  const source = options.sweep ?? file;
  const base = { build: subject.build, gains: subject.gains, wind: subject.wind };
  const parsed = sweepOf(
    run,
    options.sweep === undefined ? run.sweep : readJson(options.sweep),
    base,
    source,
  );
  const sweep = options.seed === undefined ? parsed : { ...parsed, seed: subject.seed };
  const fresh = new SweepCells(sweep, base);
  if (options.cells === undefined || !existsSync(options.cells)) return fresh;
  const kept = SweepCells.parse(parseCells(options.cells), options.cells);
  if (!kept.sameAs(fresh)) {
    throw refuse(
      options.cells,
      '',
      'cells of another sweep, build, gains or wind',
      `cells of ${source}, or a file that is not there yet`,
    );
  }
  return kept;
}

function parseCells(file: string): unknown {
  try {
    return JSON.parse(readText(file, LARGEST_CELLS_BYTES)) as unknown;
  } catch (error) {
    if (error instanceof InputError) throw error;
    throw refuse(file, '', 'broken off or not JSON', 'a sweep result, gustbench.sweep-result/1');
  }
}

function keepCells(file: string, kept: SweepCells): void {
  writeText(file, [JSON.stringify(kept)]);
}

function printSweep(kept: SweepCells, json: boolean): void {
  const { sweep } = kept;
  const map = mapOf(kept);
  const names = map.layers.map((layer) => layer.name);
  const at = (column: number, row: number) => ({
    x: axisValue(sweep.x, column),
    y: sweep.y === undefined ? null : axisValue(sweep.y, row),
  });
  if (json) {
    const cells = kept.cells().map(({ column, row, values, pass, reason }) => ({
      ...at(column, row),
      scores: values.length === 0 ? null : Object.fromEntries(names.map((name, i) => [name, values[i]])),
      pass,
      reason,
    }));
    const front = map.front.map((place) => at(place % kept.columns, Math.floor(place / kept.columns)));
    printJson({ pass: cells.every((cell) => cell.pass), version: VERSION, sweep, cells, front });
    return;
  }
  const lines = [
    [sweep.x.path, ...(sweep.y === undefined ? [] : [sweep.y.path]), ...names, 'verdict'].join('\t'),
  ];
  for (const cell of kept.cells()) {
    const { x, y } = at(cell.column, cell.row);
    const values = names.map((_, i) => cell.values[i] ?? '');
    const verdict = cell.pass ? 'within' : `OUTSIDE${cell.reason === null ? '' : `: ${cell.reason}`}`;
    lines.push([x, ...(y === null ? [] : [y]), ...values, verdict].join('\t'));
  }
  lines.push('A simulated pass is no clearance to fly.');
  process.stdout.write(`${lines.join('\n')}\n`);
}

// --- Spread ------------------------------------------------------------------------------------------------

async function proveSpread(plan: Plan): Promise<number> {
  const { run, subject, workers, options } = plan;
  const { build, gains, wind, seed } = subject;
  const request = spreadRequest(plan);
  const spreads = spreadsOf(request.shares);
  const factors = latinHypercube(spreads, request.samples, seed);
  const summaries: SpreadSummary[] = [];
  for (const trial of request.trials) {
    const tasks = spreadTasks(trial, { build, gains, wind }, spreads, factors, seed, run.overrides).map(
      (task) => ({ ...task, bands: run.bands[trial] ?? {} }),
    );
    const answers = await flyAll(tasks, workers, `samples of ${trial}`);
    if (answers === null) return INTERRUPTED;
    summaries.push(summariseSpread(tasks, spreads, factors, answers));
  }
  if (options.html !== undefined) {
    const { notes, overrides, bands } = run;
    const spread = { request, summaries };
    writeText(options.html, [
      reportHtml({ build, gains, wind, seed, results: [], notes, overrides, bands, spread }),
    ]);
  }
  const pass = summaries.every((one) => one.failures.share === 0 && one.lost === 0);
  if (options.json === true) {
    printJson({ pass, seed, version: VERSION, spreads: summaries });
  } else {
    for (const one of summaries) describeSpread(one);
    process.stdout.write('A simulated pass is no clearance to fly.\n');
  }
  return pass ? DONE : OUTSIDE_BAND;
}

/** Of the run description, with --spread N and --trial before it. */
function spreadRequest({ run, options }: Plan): SpreadRequest {
  const described = run.spread ?? { trials: run.trials, samples: 100, shares: spreadSchema.parse({}) };
  const samples =
    options.spread === undefined
      ? described.samples
      : numberOption('spread', options.spread, 3, 10_000, 'samples', true);
  return { ...described, trials: options.trial ?? described.trials, samples };
}

function describeSpread({ trial, flown, lost, failures, matters, worst }: SpreadSummary): void {
  const percent = (share: number) => `${(100 * share).toFixed(1)} %`;
  const lines = [
    `${trial}: ${percent(failures.share)} of ${flown} samples outside a band (95 %: ${percent(failures.low)} to ${percent(failures.high)})${lost > 0 ? `; ${lost} could not be flown` : ''}`,
    `        what matters   ${matters.map((one) => `${one.name} ${one.correlation.toFixed(2)}`).join(', ')}`,
    ...(worst === null
      ? []
      : [
          `        worst sample   ${Object.entries(worst.factors)
            .map(([name, f]) => `${name} × ${f.toFixed(3)}`)
            .join(', ')}`,
        ]),
  ];
  process.stdout.write(`${lines.join('\n')}\n`);
}

// --- Workers -----------------------------------------------------------------------------------------------

/** One worker flies in this thread: nothing to start, nothing to wait for. */
function workerMaker(count: number) {
  const entry = new URL(import.meta.url);
  return count === 1 ? inPlaceWorker : () => threadWorker(entry);
}

/** Answers in the order of the tasks; null when stopped by Ctrl-C. */
async function flyAll(
  tasks: readonly TrialTask[],
  workers: number,
  what: string,
): Promise<TaskAnswer[] | null> {
  const answers = new Array<TaskAnswer>(tasks.length);
  const work: PoolWork = {
    count: tasks.length,
    taskAt: (index) => tasks[index],
    hear: (index, answer) => {
      answers[index] = answer;
    },
    progress: (progress) => showProgress(progress, what),
  };
  const { end, deaths } = await untilDone(runTasks(workerMaker(workers), workers, work));
  if (end === 'cancelled') return null;
  if (end === 'crashed')
    throw refuse('prove', 'worker', deaths.at(-1), 'workers that live through their trials');
  return answers;
}

/** Waits; Ctrl-C stops the run with what is finished. */
async function untilDone(run: PoolRun) {
  const stop = (): void => run.cancel();
  process.once('SIGINT', stop);
  try {
    return await run.done;
  } finally {
    process.off('SIGINT', stop);
  }
}

/** Tenths of the way, on standard error, once a run takes more than a moment. */
function showProgress({ done, count, elapsed_s, left_s }: Progress, what: string): void {
  const tenth = (n: number) => Math.floor((10 * n) / count);
  if (elapsed_s < 2 || tenth(done) === tenth(done - 1)) return;
  const left = left_s === null ? '' : `, about ${Math.ceil(left_s)} s left`;
  process.stderr.write(`${done} of ${count} ${what}${left}\n`);
}
