/** `fly`: one flight from files, as fast as it goes, to a record. */
import type { Command } from 'commander';
import { parseSticks, StickPlayer, type StickTrack } from '../control/sticksFile.ts';
import { refuse } from '../craft/problem.ts';
import { OPEN_FIELD } from '../craft/scene.ts';
import { CALM } from '../craft/wind.ts';
import type { Flight, FlightSetup, Start } from '../flight/flight.ts';
import { NEUTRAL_STICKS, type Sticks } from '../flight/pilot.ts';
import { recordCsv, type Recorder } from '../flight/record.ts';
import { runFlight } from '../flight/run.ts';
import { RECORD_SIGNALS } from '../flight/signals.ts';
import { DEG_PER_RAD } from '../math/angles.ts';
import { eulerFromQuaternion } from '../math/quaternion.ts';
import {
  DONE,
  numberOption,
  printJson,
  readBuild,
  readGains,
  readScene,
  readText,
  readWind,
  runVerb,
  writeText,
} from './io.ts';

interface FlyOptions {
  build: string;
  gains: string;
  wind?: string;
  scene?: string;
  sticks?: string;
  hover?: boolean;
  free?: boolean;
  levelling?: boolean;
  duration: string;
  seed: string;
  out?: string;
  json?: boolean;
}

const HOVER_HEIGHT_M = 5;
const FREE_HEIGHT_M = 50;
const LARGEST_STICKS_BYTES = 50_000_000;
/** Signals kept besides the record's own, for the summary. */
const SUMMARY_SIGNALS = [
  'u_roll_us',
  'u_pitch_us',
  'u_yaw_us',
  'heat_FL_W',
  'heat_FR_W',
  'heat_RL_W',
  'heat_RR_W',
];

export function addFlyCommand(program: Command): void {
  program
    .command('fly')
    .description('fly a build with gains and write the record')
    .requiredOption('--build <file>', 'build file')
    .requiredOption('--gains <file>', 'gains file')
    .option('--wind <file>', 'wind file; takes the place of the scene’s wind')
    .option('--scene <file>', 'scene file; an open field at sea level when absent')
    .option('--sticks <file>', 'sticks CSV: t_s, roll, pitch, yaw (−1…1), throttle (0…1)')
    .option('--hover', 'start hovering at 5 m, held in height and place by the bench’s mooring')
    .option('--free', 'start in free air at 50 m with no autopilot')
    .option('--levelling', 'self-levelling on: sticks ask for tilt, not for rate')
    .requiredOption('--duration <seconds>', 'length of the flight')
    .option('--seed <number>', 'seed of everything random', '1')
    .option('--out <file>', 'record CSV to write')
    .option('--json', 'print one JSON object')
    .action((options: FlyOptions) => runVerb(() => fly(options)));
}

function fly(options: FlyOptions): number {
  const duration_s = numberOption('duration', options.duration, 0.01, 36_000, 's');
  const seed = numberOption('seed', options.seed, 0, Number.MAX_SAFE_INTEGER, '', true);
  const build = readBuild(options.build);
  const gains = readGains(options.gains);
  const scene = options.scene === undefined ? OPEN_FIELD : readScene(options.scene);
  const wind =
    options.wind === undefined ? (options.scene === undefined ? CALM : scene.wind) : readWind(options.wind);
  const track =
    options.sticks === undefined
      ? null
      : parseSticks(readText(options.sticks, LARGEST_STICKS_BYTES), options.sticks);
  if (options.hover === true && options.free === true) {
    throw refuse('command line', '--free', '--hover', 'one of --hover and --free');
  }
  const setup: FlightSetup = { build, gains, wind, scene, seed, start: startOf(options) };
  const sticksAt = sticksFor(options, track);
  const began = performance.now();
  const result = tryFly(options, setup, duration_s, sticksAt);
  const took_s = (performance.now() - began) / 1000;
  if (options.out !== undefined) {
    const header = { build, gains, wind, scene, seed, faults: [] };
    writeText(options.out, recordCsv(result.record, header));
  }
  const summary = summarise(result.record, result.flight);
  if (options.json === true) printJson({ ...summary, record: options.out ?? null });
  else describe(summary, options.out);
  process.stderr.write(`${summary.duration_s.toFixed(2)} s flown in ${took_s.toFixed(2)} s\n`);
  return DONE;
}

/** A craft that cannot hover at this site is bad input, not a crash. */
function tryFly(
  options: FlyOptions,
  setup: FlightSetup,
  duration_s: number,
  sticksAt: (time_s: number, flight: Flight) => Sticks,
) {
  try {
    return runFlight(setup, duration_s, sticksAt, [...RECORD_SIGNALS, ...SUMMARY_SIGNALS]);
  } catch (error) {
    if (error instanceof RangeError)
      throw refuse(options.build, 'propeller', error.message, 'a craft that can hover at this site');
    throw error;
  }
}

function startOf(options: FlyOptions): Start {
  if (options.hover === true) return { kind: 'hover', height_m: HOVER_HEIGHT_M };
  if (options.free === true) return { kind: 'free-air', height_m: FREE_HEIGHT_M };
  return { kind: 'ground' };
}

/** Sticks of the file, or neutral: with --free the throttle then stays where it hovers. */
function sticksFor(options: FlyOptions, track: StickTrack | null) {
  const player = track === null ? null : new StickPlayer(track);
  const sticks: Sticks = {
    ...NEUTRAL_STICKS,
    armed: true,
    levelling: options.levelling === true,
    moored: options.hover === true,
  };
  return (time_s: number, flight: Flight): Sticks => {
    if (player !== null) player.at(time_s, sticks);
    else if (options.free === true) sticks.throttle = hoverThrottle(flight);
    return sticks;
  };
}

function hoverThrottle(flight: Flight): number {
  const { escIdle_us, escMax_us } = flight.craft;
  const mean = flight.trim.command_us.reduce((sum, value) => sum + value, 0) / 4;
  return (mean - escIdle_us) / (escMax_us - escIdle_us);
}

interface Summary {
  duration_s: number;
  ticks: number;
  stopped: Flight['stopped'];
  peakTilt_deg: number;
  peakDrift_m: number;
  peakHeight_m: number;
  rateRms_dps: Record<'roll' | 'pitch' | 'yaw', number>;
  axisCommandRms_us: Record<'roll' | 'pitch' | 'yaw', number>;
  meanWindingHeat_W: number;
  endBattery_V: number;
  final: {
    north_m: number;
    east_m: number;
    down_m: number;
    roll_deg: number;
    pitch_deg: number;
    yaw_deg: number;
  };
}

function summarise(record: Recorder, flight: Flight): Summary {
  const column = (name: string) => record.column(name);
  const [qw, qx, qy, qz] = ['qw', 'qx', 'qy', 'qz'].map(column);
  const [north, east, down] = ['north_m', 'east_m', 'down_m'].map(column);
  let peakTilt = 0;
  let peakDrift = 0;
  for (let k = 0; k < record.length; k++) {
    peakTilt = Math.max(peakTilt, Math.acos(Math.max(-1, Math.min(1, 1 - 2 * (qx[k] ** 2 + qy[k] ** 2)))));
    peakDrift = Math.max(peakDrift, Math.hypot(north[k] - north[0], east[k] - east[0]));
  }
  const rms = (name: string) => {
    const values = column(name);
    const mean = values.reduce((sum, value) => sum + value, 0) / values.length;
    return Math.sqrt(values.reduce((sum, value) => sum + (value - mean) ** 2, 0) / values.length);
  };
  const perAxis = (prefix: string, unit: string) => ({
    roll: rms(`${prefix}_roll_${unit}`),
    pitch: rms(`${prefix}_pitch_${unit}`),
    yaw: rms(`${prefix}_yaw_${unit}`),
  });
  const last = record.length - 1;
  const [roll, pitch, yaw] = eulerFromQuaternion(qw[last], qx[last], qy[last], qz[last]);
  const heat = SUMMARY_SIGNALS.slice(3).map(
    (name) => column(name).reduce((sum, value) => sum + value, 0) / record.length,
  );
  return {
    duration_s: record.length * flight.tick_s,
    ticks: record.length,
    stopped: flight.stopped,
    peakTilt_deg: peakTilt * DEG_PER_RAD,
    peakDrift_m: peakDrift,
    peakHeight_m: -down.reduce((least, value) => Math.min(least, value), Infinity),
    rateRms_dps: perAxis('rate', 'dps'),
    axisCommandRms_us: perAxis('u', 'us'),
    meanWindingHeat_W: heat.reduce((sum, value) => sum + value, 0) / 4,
    endBattery_V: column('battery_V')[last],
    final: {
      north_m: north[last],
      east_m: east[last],
      down_m: down[last],
      roll_deg: roll * DEG_PER_RAD,
      pitch_deg: pitch * DEG_PER_RAD,
      yaw_deg: yaw * DEG_PER_RAD,
    },
  };
}

function describe(summary: Summary, out: string | undefined): void {
  const lines = [
    `flown            ${summary.duration_s.toFixed(2)} s, ${summary.ticks} ticks`,
    `peak tilt        ${summary.peakTilt_deg.toFixed(1)} deg`,
    `peak drift       ${summary.peakDrift_m.toFixed(2)} m`,
    `rate rms         roll ${summary.rateRms_dps.roll.toFixed(2)}, pitch ${summary.rateRms_dps.pitch.toFixed(2)}, yaw ${summary.rateRms_dps.yaw.toFixed(2)} deg/s`,
    `axis command rms roll ${summary.axisCommandRms_us.roll.toFixed(2)}, pitch ${summary.axisCommandRms_us.pitch.toFixed(2)}, yaw ${summary.axisCommandRms_us.yaw.toFixed(2)} µs`,
    `winding heat     ${summary.meanWindingHeat_W.toFixed(2)} W a motor`,
    `battery at end   ${summary.endBattery_V.toFixed(2)} V`,
    ...(summary.stopped === null
      ? []
      : [`STOPPED at tick ${summary.stopped.tick}: ${summary.stopped.reason}, ${summary.stopped.what}`]),
    ...(out === undefined ? [] : [`record           ${out}`]),
    'A simulated flight is no clearance to fly.',
  ];
  process.stdout.write(`${lines.join('\n')}\n`);
}
