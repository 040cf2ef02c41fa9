/** `shape`: margins, poles, step and noise of a gain set on a build or a plant; starting gains. */
import type { Command } from 'commander';
import { z } from 'zod';
import { AXES, parseGains, type AxisName, type Gains } from '../craft/gains.ts';
import { parseJson, parseWith, quantity } from '../craft/fields.ts';
import { refuse } from '../craft/problem.ts';
import { axisModels, type TrimChoice } from '../shaping/axisModel.ts';
import { plantSystem, type ContinuousSystem, type Plant } from '../shaping/continuous.ts';
import {
  DEFAULT_NOISE_DPS_PER_RTHZ,
  gyroNoise,
  reportForBuild,
  reportForPlant,
  type AxisReport,
  type ShapeReport,
} from '../shaping/report.ts';
import { amigoGains, simcGains, startingGains, type AxisGainsFound } from '../shaping/startingGains.ts';
import { DONE, numberOption, printJson, readBuild, readGains, runVerb } from './io.ts';

interface ShapeOptions {
  build?: string;
  plant?: string;
  gains?: string;
  start?: boolean;
  forward?: string;
  climb?: string;
  charge?: string;
  elevation?: string;
  released?: boolean;
  noise_dps_per_rtHz?: string;
  json?: boolean;
}

const plantSchema = z.strictObject(
  {
    gain_dps2_per_us: quantity(-1e6, 1e6, 'deg/s² per µs').refine((value) => value !== 0, { error: 'not 0' }),
    lag_s: quantity(0, 10, 's'),
    delay_s: quantity(0, 1, 's'),
  },
  { error: 'an object with gain_dps2_per_us, lag_s, delay_s' },
);

export function addShapeCommand(program: Command): void {
  program
    .command('shape')
    .description('frequency response behind the gains: margins, poles, step, noise; or starting gains')
    .option('--build <file>', 'build file: the linear model is taken from it')
    .option('--plant <json>', 'plant K e^(−sTd)/(s(τs+1)): {"gain_dps2_per_us":…,"lag_s":…,"delay_s":…}')
    .option('--gains <file>', 'gains file (with --start only its loop rate, filters and limits are used)')
    .option('--start', 'propose starting gains, as a gains file on standard output')
    .option('--forward <m/s>', 'trim in forward flight', '0')
    .option('--climb <m/s>', 'trim in climb', '0')
    .option('--charge <share>', 'state of charge of the battery')
    .option('--elevation <m>', 'site elevation', '0')
    .option('--released', 'with the payload let go')
    .option(
      '--noise_dps_per_rtHz <density>',
      'gyro noise density for --plant, deg/s per √Hz',
      String(DEFAULT_NOISE_DPS_PER_RTHZ),
    )
    .option('--json', 'print one JSON object')
    .action((options: ShapeOptions) => runVerb(() => shape(options)));
}

function shape(options: ShapeOptions): number {
  if ((options.build === undefined) === (options.plant === undefined)) {
    throw refuse(
      'command line',
      '--build',
      options.build ?? options.plant,
      'exactly one of --build and --plant',
    );
  }
  if (options.gains === undefined && options.start !== true) {
    throw refuse('command line', '--gains', undefined, 'a gains file (or --start)');
  }
  const gains = options.gains === undefined ? DEFAULT_GAINS : readGains(options.gains);
  const noise = numberOption('noise_dps_per_rtHz', options.noise_dps_per_rtHz ?? '', 0, 10, 'deg/s per √Hz');
  if (options.start === true) return start(options, gains, noise);
  const report =
    options.plant !== undefined
      ? reportForPlant(readPlant(options.plant), gains, noise)
      : atTrim(options, (choice) => reportForBuild(readBuild(options.build ?? ''), gains, choice));
  if (options.json === true) {
    const density =
      options.plant === undefined ? readBuild(options.build ?? '').gyro.noise_dps_per_rtHz : noise;
    // Each axis by its own name and, as `match` gives them, under `axes`.
    printJson({ ...report, axes: report, loop_Hz: gains.loop_Hz, noise_dps_per_rtHz: density });
  } else describe(report);
  return DONE;
}

/** Used by --start without a gains file: a 400 Hz loop with a D low-pass. */
const DEFAULT_GAINS: Gains = parseGains({
  format: 'gustbench.gains/1',
  loop_Hz: 400,
  computeDelay_s: 0.001,
  axes: Object.fromEntries(
    AXES.map((axis) => [
      axis,
      { p_us_per_dps: 0, i_us_per_deg: 0, d_us_per_dps2: 0, feedforward_us_per_dps: 0 },
    ]),
  ),
  derivativeLowPass_Hz: 60,
});

function start(options: ShapeOptions, gains: Gains, noiseDensity: number): number {
  const { systems, plants, noise } = systemsOf(options, gains, noiseDensity);
  let found;
  try {
    found = startingGains(systems, gains, noise);
  } catch (error) {
    if (error instanceof RangeError)
      throw refuse(options.gains ?? '--start', 'loop_Hz', gains.loop_Hz, error.message);
    throw error;
  }
  for (const axis of AXES) {
    const one = found.axes[axis];
    process.stderr.write(`${axis}: limited by ${one.active}; loosened by ${one.loosenedBy}\n`);
    const [best] = one.loosening;
    if (best !== undefined && best.gain_pct >= 1)
      process.stderr.write(`  most by ${best.change}: I ${Math.round(best.gain_pct)} % higher\n`);
    process.stderr.write(`  found  ${gainsLine(one)}\n`);
    // The rules are made for a lag; a plant without one gets the same numbers with no derivative.
    const extra_s = gains.computeDelay_s + (systems[axis].delay_s - plants[axis].delay_s);
    process.stderr.write(`  SIMC   ${gainsLine(simcGains(plants[axis], 1 / gains.loop_Hz, extra_s))}\n`);
    process.stderr.write(`  AMIGO  ${gainsLine(amigoGains(plants[axis], 1 / gains.loop_Hz, extra_s))}\n`);
  }
  process.stderr.write('A simulated result is no clearance to fly.\n');
  process.stdout.write(`${JSON.stringify(found.gains, null, options.json === true ? 0 : 2)}\n`);
  return DONE;
}

function gainsLine(found: AxisGainsFound): string {
  const shown = (value: number) => Number(value.toPrecision(3));
  return `P ${shown(found.p_us_per_dps)} µs/(deg/s), I ${shown(found.i_us_per_deg)} µs/deg, D ${shown(found.d_us_per_dps2)} µs/(deg/s²)`;
}

function systemsOf(options: ShapeOptions, gains: Gains, noiseDensity: number) {
  if (options.plant !== undefined) {
    const plant = readPlant(options.plant);
    const system = plantSystem(plant);
    return {
      plants: { roll: plant, pitch: plant, yaw: plant } satisfies Record<AxisName, Plant>,
      systems: { roll: system, pitch: system, yaw: system } satisfies Record<AxisName, ContinuousSystem>,
      noise: gyroNoise(noiseDensity, 0, gains.loop_Hz),
    };
  }
  const build = readBuild(options.build ?? '');
  const models = atTrim(options, (choice) => axisModels(build, choice));
  return {
    plants: { roll: models.roll.plant, pitch: models.pitch.plant, yaw: models.yaw.plant },
    systems: { roll: models.roll.measured, pitch: models.pitch.measured, yaw: models.yaw.measured },
    noise: gyroNoise(build.gyro.noise_dps_per_rtHz, build.gyro.bandwidth_Hz, gains.loop_Hz),
  };
}

function readPlant(text: string): Plant {
  return parseWith(plantSchema, parseJson(text, '--plant'), '--plant');
}

/** Runs with the trim of the options; no trim there is bad input. */
function atTrim<T>(options: ShapeOptions, run: (choice: TrimChoice) => T): T {
  const choice: TrimChoice = {
    forward_mps: numberOption('forward', options.forward ?? '0', -60, 60, 'm/s'),
    climb_mps: numberOption('climb', options.climb ?? '0', -10, 30, 'm/s'),
    elevation_m: numberOption('elevation', options.elevation ?? '0', -450, 6000, 'm'),
    ...(options.charge === undefined ? {} : { charge: numberOption('charge', options.charge, 0, 1, '') }),
    payloadReleased: options.released === true,
  };
  try {
    return run(choice);
  } catch (error) {
    if (error instanceof RangeError)
      throw refuse(options.build ?? '', 'trim', error.message, 'a point at which the craft can be trimmed');
    throw error;
  }
}

function describe(report: ShapeReport): void {
  const shown = (value: number | null, unit: string, digits = 3) =>
    value === null ? '—' : `${Number(value.toPrecision(digits))} ${unit}`;
  const millis = (value: number | null) => (value === null ? null : value * 1000);
  const rows: [string, (axis: AxisReport) => string][] = [
    ['plant gain', (a) => shown(a.plant.gain_dps2_per_us, 'deg/s²/µs')],
    ['plant lag', (a) => shown(a.plant.lag_s * 1000, 'ms')],
    ['stable', (a) => (a.stable ? (a.conditionallyStable ? 'conditionally' : 'yes') : 'NO')],
    ['gain margin', (a) => shown(a.gainMargin_dB, 'dB')],
    ['phase margin', (a) => shown(a.phaseMargin_deg, 'deg')],
    ['delay margin', (a) => shown(a.delayMargin_ms, 'ms')],
    ['crossover', (a) => shown(a.crossover_Hz, 'Hz')],
    ['Ms', (a) => shown(a.maxSensitivity, '')],
    ['rise 10–90 %', (a) => shown(a.step.rise_s === null ? null : a.step.rise_s * 1000, 'ms')],
    ['overshoot', (a) => shown(a.step.overshoot_pct, '%')],
    ['settling 2 %', (a) => shown(a.step.settle_s === null ? null : a.step.settle_s * 1000, 'ms')],
    ['bandwidth', (a) => shown(a.handling?.bandwidth_Hz ?? null, 'Hz')],
    ['phase delay', (a) => shown(millis(a.handling?.phaseDelay_s ?? null), 'ms')],
    ['rejects below', (a) => shown(a.disturbanceRejection?.bandwidth_Hz ?? null, 'Hz')],
    ['push leaves', (a) => shown(a.push?.lastingAngle_deg ?? null, 'deg')],
    ['noise at motors', (a) => shown(a.noiseAtMotor_us_rms, 'µs rms')],
    ['heat by noise', (a) => shown(millis(a.noiseHeat_W), 'mW a motor')],
    ['levelled PM', (a) => shown(a.levelled?.phaseMarginAtMotors_deg ?? null, 'deg')],
  ];
  const lines = [['', ...AXES].map((cell) => cell.padEnd(18)).join('')];
  for (const [name, cell] of rows)
    lines.push([name, ...AXES.map((axis) => cell(report[axis]))].map((text) => text.padEnd(18)).join(''));
  for (const axis of AXES) lines.push(`${axis}: ${report[axis].statement}`);
  lines.push('A simulated result is no clearance to fly.');
  process.stdout.write(`${lines.map((line) => line.trimEnd()).join('\n')}\n`);
}
