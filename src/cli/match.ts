/** `match`: a log of the real craft against its build, to the identified plant and a corrected build. */
import { createReadStream, statSync } from 'node:fs';
import type { Command } from 'commander';
import type { Build } from '../craft/build.ts';
import { AXES, type AxisName } from '../craft/gains.ts';
import { refuse } from '../craft/problem.ts';
import { parseColumns, type Columns } from '../matching/columns.ts';
import { correctedBuild, type CorrectedBuild } from '../matching/correctedBuild.ts';
import { inspectLog, type LogProposal } from '../matching/inspectLog.ts';
import { matchLog, type MatchResult } from '../matching/matchLog.ts';
import type { AxisResult } from '../matching/identifyAxis.ts';
import { readHead, readLog, type LogSource } from '../matching/readLog.ts';
import { HORIZON_S } from '../matching/validation.ts';
import { DONE, numberOption, printJson, readBuild, readJson, runVerb, writeText } from './io.ts';

interface MatchCliOptions {
  build: string;
  log: string;
  columns?: string;
  loop?: string;
  json?: boolean;
  out?: string;
}

const CHUNK_BYTES = 1 << 20;

export function addMatchCommand(program: Command): void {
  program
    .command('match')
    .description('identify the craft from a flight log and correct its build')
    .requiredOption('--build <file>', 'build file')
    .requiredOption('--log <file>', 'log: CSV, JSON lines, or a record of the bench')
    .option('--columns <file>', 'which column is what; a record of the bench needs none')
    .option('--loop <Hz>', 'rate of the controller, when the log holds only some of its ticks')
    .option('--json', 'print one JSON object')
    .option('--out <file>', 'corrected build to write')
    .action((options: MatchCliOptions) => runVerb(() => match(options)));
}

async function match(options: MatchCliOptions): Promise<number> {
  const build = readBuild(options.build);
  const given =
    options.columns === undefined ? null : parseColumns(readJson(options.columns), options.columns);
  const loop =
    options.loop === undefined ? {} : { loop_Hz: numberOption('loop', options.loop, 20, 20_000, 'Hz') };
  const source = fileSource(options.log);
  const proposal = inspectLog(await readHead(source), options.log);
  const columns = chooseColumns(options, proposal, given);
  const tell = progressTeller();
  const log = await readLog(source, proposal, columns, {
    range: build.esc,
    onProgress: (share) => tell(`reading ${(100 * share).toFixed(0)} %`),
  });
  const result = tryMatch(options, build, () =>
    matchLog(log, build, { ...loop, onProgress: (_share, doing) => tell(`matching: ${doing}`) }),
  );
  const corrected = tryMatch(options, build, () => correctedBuild(build, result, options.log));
  if (options.out !== undefined && corrected.build !== null) {
    writeText(options.out, [`${JSON.stringify(corrected.build, null, 2)}\n`]);
  }
  if (options.out !== undefined && corrected.build === null) {
    process.stderr.write(`${options.out} was not written: ${corrected.kept.join(' ')}\n`);
  }
  if (options.json === true) printJson(asJson(options, log.t_s, result, corrected));
  else describe(options, result, corrected);
  return DONE;
}

function fileSource(file: string): LogSource {
  let size_bytes: number;
  try {
    const stat = statSync(file);
    if (!stat.isFile()) throw refuse(file, '', 'not a file', 'a log file');
    size_bytes = stat.size;
  } catch (error) {
    if (!(error instanceof Error) || !('code' in error)) throw error;
    throw refuse(file, '', String(error.code), 'a file that can be read');
  }
  return { name: file, size_bytes, open: () => createReadStream(file, { highWaterMark: CHUNK_BYTES }) };
}

/** The columns given; a record's own; never a guess that nobody confirmed. */
function chooseColumns(options: MatchCliOptions, proposal: LogProposal, given: Columns | null): Columns {
  if (given !== null) return given;
  if (proposal.ownRecord) return proposal.columns;
  const guess = JSON.stringify(proposal.columns);
  throw refuse(
    options.log,
    'heads',
    proposal.form.heads.slice(0, 12).join(', '),
    `those of a record of the bench, or --columns FILE; to begin with: ${guess}`,
  );
}

/** A build that cannot hover is bad input, not a crash. */
function tryMatch<T>(options: MatchCliOptions, build: Build, run: () => T): T {
  try {
    return run();
  } catch (error) {
    if (!(error instanceof RangeError)) throw error;
    throw refuse(options.build, 'propeller', `${build.name}: ${error.message}`, 'a craft that can hover');
  }
}

function progressTeller(): (text: string) => void {
  let last = '';
  return (text) => {
    if (!process.stderr.isTTY || text === last) return;
    last = text;
    process.stderr.write(`\r\u001b[K${text}`);
    if (text.endsWith('done')) process.stderr.write('\r\u001b[K');
  };
}

function axisJson(axis: AxisResult) {
  const { estimates, fit } = axis;
  if (estimates === null || fit === null) {
    return {
      gain_dps2_per_us: null,
      lag_s: null,
      delay_s: null,
      fit_pct: null,
      usable_s: null,
      note: axis.note,
    };
  }
  return {
    gain_dps2_per_us: estimates.gain_dps2_per_us,
    lag_s: estimates.lag_s,
    delay_s: estimates.delay_s,
    fit_pct: axis.fit_pct,
    usable_s: axis.usable_s,
    note: axis.note,
    terms: { lead_s: fit.lead_s ?? null, damping_per_s: fit.damping_per_s ?? null },
    noise: {
      gyro_dps: Math.sqrt(fit.noise.gyroVariance),
      disturbance_dps2: Math.sqrt(fit.noise.drive / (2 * fit.noise.decay_per_s)),
      whiteness: fit.whiteness,
    },
  };
}

function asJson(options: MatchCliOptions, t_s: Float64Array, result: MatchResult, corrected: CorrectedBuild) {
  const { timeBase } = result;
  return {
    log: options.log,
    rows: t_s.length,
    duration_s: t_s[t_s.length - 1],
    timeBase: { ...timeBase, reading: result.reading },
    axes: Object.fromEntries(AXES.map((axis) => [axis, axisJson(result.axes[axis])])),
    fitIs: `100 (1 − ‖y − ŷ‖/‖y − mean y‖) on a piece held back, simulated ${HORIZON_S} s at a time`,
    leftOut: result.leftOut,
    offers: result.offers,
    remarks: result.remarks,
    correctedBuild: corrected.build,
    changes: corrected.changes,
    kept: corrected.kept,
    written: corrected.build === null ? null : (options.out ?? null),
  };
}

function describe(options: MatchCliOptions, result: MatchResult, corrected: CorrectedBuild): void {
  const lines = [
    ...AXES.flatMap((axis) => axisLines(axis, result.axes[axis])),
    ...result.remarks,
    ...result.offers.map((offer) => offer.because),
    ...corrected.changes.map((change) => `build: ${change}`),
    ...corrected.kept.map((sentence) => `build: ${sentence}`),
    ...(options.out !== undefined && corrected.build !== null ? [`corrected build: ${options.out}`] : []),
    'A model that fits a log is no clearance to fly: first hover restrained, propellers clear, a kill switch at hand.',
  ];
  process.stdout.write(`${lines.join('\n')}\n`);
}

function axisLines(axis: AxisName, result: AxisResult): string[] {
  const { estimates } = result;
  if (estimates === null) return [`${axis.padEnd(6)} no numbers: ${result.note}`];
  const { gain_dps2_per_us: gain, lag_s, delay_s } = estimates;
  const fit = result.fit_pct === null ? '' : `, fit ${result.fit_pct.toFixed(0)} %`;
  return [
    `${axis.padEnd(6)} gain ${gain.value.toPrecision(4)} ± ${(1.96 * gain.sigma).toPrecision(2)} deg/s² per µs, ` +
      `lag ${(1000 * lag_s.value).toFixed(1)} ± ${(1960 * lag_s.sigma).toFixed(1)} ms, ` +
      `delay ${(1000 * delay_s.value).toFixed(2)} ± ${(1960 * delay_s.sigma).toFixed(2)} ms${fit}, ${result.usable_s.toFixed(0)} s`,
    `       ${result.note}`,
  ];
}
