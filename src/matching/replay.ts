/**
 * The logged sticks flown by the simulated craft: rate setpoints and throttle of the log go into the full
 * nonlinear simulation, and what it does is laid beside what the real craft did.
 */
import type { Build } from '../craft/build.ts';
import { AXES, type AxisName, type Gains } from '../craft/gains.ts';
import { refuse } from '../craft/problem.ts';
import { CALM, type Wind } from '../craft/wind.ts';
import { Flight } from '../flight/flight.ts';
import { NEUTRAL_STICKS, type Sticks } from '../flight/pilot.ts';
import { signalIndex } from '../flight/signals.ts';
import { findTimeBase } from './align.ts';
import { motorCommands_us } from './axisCommand.ts';
import type { Column, FlightLog } from './log.ts';
import { crossSpectra } from './spectra.ts';

/** High enough that a throttle which is not quite this craft's does not bring it down within a run. */
const HEIGHT_M = 1000;
/** A run begins anew after this: attitude is not in the setpoints, and its error grows. */
const RUN_S = 10;
const SETTLE_S = 0.5;
const LONGEST_S = 300;
const LARGEST_RATE_DPS = 4000;
const SEGMENT_S = 2;

export interface ReplayAxis {
  readonly measured_dps: Float64Array;
  readonly simulated_dps: Float64Array;
  /** Measured less simulated. */
  readonly residual_dps: Float64Array;
  /** 100 (1 − ‖y − ŷ‖/‖y − mean y‖); 0 or less: the simulation says nothing. */
  readonly fit_pct: number;
  readonly residualRms_dps: number;
  readonly f_Hz: Float64Array;
  /** Densities of measured rate and residual, (deg/s)²/Hz. */
  readonly measuredDensity: Float64Array;
  readonly residualDensity: Float64Array;
  /** A sentence: where the simulation differs. */
  readonly says: string;
}

export interface Replay {
  /** Times of the log, one a row. */
  readonly t_s: Float64Array;
  /** Null where the log lacks setpoint or rate. */
  readonly axes: Readonly<Record<AxisName, ReplayAxis | null>>;
  readonly remarks: readonly string[];
}

export interface ReplayOptions {
  readonly from_s: number;
  readonly to_s: number;
  readonly wind?: Wind;
  readonly seed?: number;
  readonly onProgress?: (share: number) => void;
}

/**
 * Flies the setpoints of a part of the log with these gains.
 * @throws InputError when the log has no setpoints or the part is too long or too short.
 */
export function replayLog(log: FlightLog, build: Build, gains: Gains, options: ReplayOptions): Replay {
  const { from_s, to_s } = options;
  if (!(to_s - from_s >= 2 * SETTLE_S) || to_s - from_s > LONGEST_S) {
    throw refuse(log.name, 'replay', `${from_s} … ${to_s} s`, `a part of ${2 * SETTLE_S} to ${LONGEST_S} s`);
  }
  if (AXES.every((axis) => log.setpoint_dps[axis] === undefined)) {
    throw refuse(log.name, 'sp_roll', undefined, 'rate setpoints; a replay flies them');
  }
  const rows = rowsBetween(log.t_s, from_s, to_s);
  if (rows.end - rows.begin < 50) {
    throw refuse(log.name, 'replay', `${rows.end - rows.begin} rows`, 'a part with at least 50 rows');
  }
  const remarks: string[] = [];
  const simulated = flyRows(log, build, gains, rows, options, remarks);
  const t_s = log.t_s.slice(rows.begin, rows.end);
  const period_s = findTimeBase(t_s).period_s;
  const axes = Object.fromEntries(
    AXES.map((axis, i) => {
      const gyro = log.gyro_dps[axis];
      const present = gyro !== undefined && log.setpoint_dps[axis] !== undefined;
      return [
        axis,
        present
          ? compare(axis, Float64Array.from(gyro.subarray(rows.begin, rows.end)), simulated[i], period_s)
          : null,
      ];
    }),
  ) as Record<AxisName, ReplayAxis | null>;
  return { t_s, axes, remarks };
}

interface Rows {
  readonly begin: number;
  readonly end: number;
}

function rowsBetween(t_s: Float64Array, from_s: number, to_s: number): Rows {
  const first = t_s.findIndex((t) => t >= from_s);
  const begin = first === -1 ? t_s.length : first;
  const after = t_s.findIndex((t) => t > to_s);
  return { begin, end: after === -1 ? t_s.length : after };
}

/** Gyro rates of the simulated craft at the log's rows, per axis. */
function flyRows(
  log: FlightLog,
  build: Build,
  gains: Gains,
  rows: Rows,
  options: ReplayOptions,
  remarks: string[],
): Float64Array[] {
  const { t_s } = log;
  const scaled = { ...gains, maxRate_dps: largestSetpoints(log, gains) };
  const setup = {
    build,
    gains: scaled,
    wind: options.wind ?? CALM,
    seed: options.seed ?? 1,
    start: { kind: 'free-air', height_m: HEIGHT_M } as const,
  };
  const out = AXES.map(() => new Float64Array(rows.end - rows.begin));
  const places = AXES.map((axis) => signalIndex(`gyro_${axis}_dps`));
  const sticks: Sticks = { ...NEUTRAL_STICKS, armed: true };
  const collective = collectiveOf(log, build, rows);
  let flight = new Flight(setup);
  let runBegin_s = t_s[rows.begin];
  let stopped = 0;
  for (let row = rows.begin; row < rows.end; row++) {
    const now_s = t_s[row];
    if (now_s - runBegin_s > RUN_S || flight.stopped !== null) {
      if (flight.stopped !== null) stopped++;
      flight = new Flight(setup);
      // The settling of a new run is flown with the setpoints before it.
      runBegin_s = now_s;
    }
    sticksAt(log, scaled, row, sticks);
    sticks.throttle = throttleOf(flight, build, collective === null ? 0 : collective[row - rows.begin]);
    while (flight.stopped === null && flight.time_s <= now_s - runBegin_s + 1e-9) flight.tick(sticks);
    for (let i = 0; i < 3; i++) out[i][row - rows.begin] = flight.signals[places[i]];
    if (row % 2000 === 0) options.onProgress?.((row - rows.begin) / (rows.end - rows.begin));
  }
  if (stopped > 0) remarks.push(`The simulated craft was lost ${stopped} times and began anew.`);
  remarks.push(
    `Flown in still air, in runs of ${RUN_S} s that each begin level and at rest: the first ${SETTLE_S} s of a run and what the wind did are not the model’s fault.`,
  );
  return out;
}

/** Full stick is the largest setpoint logged, so that sticks reach it; the rate loop does not use it. */
function largestSetpoints(log: FlightLog, gains: Gains): Gains['maxRate_dps'] {
  const largest = (axis: AxisName) => {
    let most = gains.maxRate_dps[axis];
    for (const value of log.setpoint_dps[axis] ?? []) most = Math.max(most, Math.abs(value));
    return Math.min(LARGEST_RATE_DPS, most);
  };
  return { roll: largest('roll'), pitch: largest('pitch'), yaw: largest('yaw') };
}

function sticksAt(log: FlightLog, gains: Gains, row: number, into: Sticks): void {
  const stick = (axis: AxisName) => {
    const setpoint = log.setpoint_dps[axis];
    return setpoint === undefined ? 0 : Math.max(-1, Math.min(1, setpoint[row] / gains.maxRate_dps[axis]));
  };
  into.roll = stick('roll');
  into.pitch = stick('pitch');
  into.yaw = stick('yaw');
}

/** Logged collective about its mean, µs per row; null when the log says nothing of it. */
function collectiveOf(log: FlightLog, build: Build, rows: Rows): Float64Array | null {
  const { min_us, max_us } = build.esc;
  const motors = motorCommands_us(log);
  const { throttle } = log;
  if (motors === null && throttle === undefined) return null;
  const out = Float64Array.from({ length: rows.end - rows.begin }, (_, i) => {
    const row = rows.begin + i;
    if (motors !== null) return motors.reduce((sum: number, motor: Column) => sum + motor[row] / 4, 0);
    return min_us + (throttle === undefined ? 0 : throttle[row]) * (max_us - min_us);
  });
  const mean = out.reduce((sum, value) => sum + value, 0) / out.length;
  for (let i = 0; i < out.length; i++) out[i] -= mean;
  return out;
}

/** Throttle stick that gives the simulated craft's hover command plus `more_us`. */
function throttleOf(flight: Flight, build: Build, more_us: number): number {
  const { idle_us, max_us } = build.esc;
  const hover_us = flight.trim.command_us.reduce((sum, value) => sum + value, 0) / 4;
  return Math.max(0, Math.min(1, (hover_us + more_us - idle_us) / (max_us - idle_us)));
}

function compare(
  axis: AxisName,
  measured: Float64Array,
  simulated: Float64Array,
  period_s: number,
): ReplayAxis {
  const residual = measured.map((value, i) => value - simulated[i]);
  const mean = measured.reduce((sum, value) => sum + value, 0) / measured.length;
  const off = residual.reduce((sum, value) => sum + value * value, 0);
  const all = measured.reduce((sum, value) => sum + (value - mean) ** 2, 0);
  const segment = 2 ** Math.floor(Math.log2(Math.max(16, Math.min(SEGMENT_S / period_s, measured.length))));
  const spectra = crossSpectra([[measured, residual]], 1 / period_s, segment);
  const fit_pct = all > 0 ? 100 * (1 - Math.sqrt(off / all)) : 0;
  return {
    measured_dps: measured,
    simulated_dps: simulated,
    residual_dps: residual,
    fit_pct,
    residualRms_dps: Math.sqrt(off / residual.length),
    f_Hz: spectra.f_Hz,
    measuredDensity: spectra.auto[0],
    residualDensity: spectra.auto[1],
    says: sentence(axis, fit_pct, spectra.f_Hz, spectra.auto[1]),
  };
}

/** Where most of the residual lies. */
function sentence(axis: AxisName, fit_pct: number, f_Hz: Float64Array, density: Float64Array): string {
  const bands: [number, number, string][] = [
    [0, 1, 'below 1 Hz: trim, wind or drag'],
    [1, 12, 'from 1 to 12 Hz: gain, lag or delay of the build, or other gains than were flown'],
    [12, Infinity, 'above 12 Hz: noise and vibration'],
  ];
  const power = bands.map(([low, high]) =>
    density.reduce((sum, d, k) => (f_Hz[k] >= low && f_Hz[k] < high ? sum + d : sum), 0),
  );
  const total = power.reduce((sum, value) => sum + value, 0);
  const most = power.indexOf(Math.max(...power));
  const share = total > 0 ? (100 * power[most]) / total : 0;
  return `${axis}: the simulation follows ${fit_pct.toFixed(0)} %; ${share.toFixed(0)} % of what is left lies ${bands[most][2]}.`;
}
