/**
 * From a log and a build to the identified plant of each axis: time base, usable rows, frequency response,
 * fit, a piece held back to check it on, and sentences on where the model fails.
 */
import type { Build } from '../craft/build.ts';
import { AXES, parseGains, type AxisName, type Gains } from '../craft/gains.ts';
import { refuse } from '../craft/problem.ts';
import { findTimeBase, type TimeBase } from './align.ts';
import type { Reading } from './axisData.ts';
import { axisCommand_us, motorCommands_us } from './axisCommand.ts';
import { identifyAxis, type AxisContext, type AxisResult } from './identifyAxis.ts';
import type { FlightLog } from './log.ts';
import { modelPlant, type ModelPlant } from './modelPlant.ts';
import { suspectAttitude, type Offer } from './suspicions.ts';
import { usableRows, type LeftOut, type UsableRows } from './usable.ts';

export interface MatchResult {
  readonly axes: Readonly<Record<AxisName, AxisResult>>;
  readonly timeBase: Omit<TimeBase, 'stretches'>;
  /** What explained the rates best; null when no axis was fitted. */
  readonly reading: Reading | null;
  readonly leftOut: readonly LeftOut[];
  readonly offers: readonly Offer[];
  readonly remarks: readonly string[];
  /** Mean motor command of the usable rows, µs; null without motor commands. */
  readonly meanCommand_us: number | null;
  readonly model: ModelPlant;
  /** Compute delay of the controller that flew, s; 0 when the log does not say. */
  readonly computeDelay_s: number;
}

export interface MatchOptions {
  /** Rate of the controller that flew, where it is known; a record of the bench says it. */
  readonly loop_Hz?: number;
  readonly onProgress?: (share: number, doing: string) => void;
}

/** A controller that is faster than the rows by this ratio was logged only in part. */
const THINNED_RATIO = 1.4;

/**
 * Identifies all three axes.
 * @throws InputError when the log holds too little to look at; RangeError when the build cannot hover.
 */
export function matchLog(log: FlightLog, build: Build, options: MatchOptions = {}): MatchResult {
  const report = options.onProgress ?? (() => undefined);
  report(0, 'time base');
  const base = findTimeBase(log.t_s);
  if (base.stretches.length === 0) {
    throw refuse(log.name, 't', 'pauses all over', 'at least 32 rows that follow each other');
  }
  const flown = flownGains(log);
  const computeDelay_s = flown?.computeDelay_s ?? 0;
  const loop_Hz = options.loop_Hz ?? flown?.loop_Hz ?? null;
  const thinned = loop_Hz !== null && loop_Hz * base.period_s > THINNED_RATIO;
  const model = modelPlant(build, computeDelay_s);
  const usable = usableRows(log, base, build, model.hoverCommand_us);
  const context: AxisContext = {
    log,
    build,
    base,
    usable,
    reading: null,
    command: thinned ? 'between' : 'held',
    tick_s: loop_Hz === null ? base.period_s : 1 / loop_Hz,
    rotor_Hz: meanRotor_Hz(log, usable),
  };
  const results = new Map<AxisName, AxisResult>();
  let reading: Reading | null = null;
  const order = AXES.slice().sort((a, b) => liveliness(log, b) - liveliness(log, a));
  order.forEach((axis, i) => {
    report((0.1 + i) / 3.2, axis);
    const u_us = axisCommand_us(log, build, axis);
    const result = identifyAxis(axis, { ...context, reading }, u_us, model[axis]);
    // One clock stamped all axes: the liveliest one decides.
    reading ??= result.reading;
    results.set(axis, result);
  });
  report(1, 'done');
  const axes = Object.fromEntries(AXES.map((axis) => [axis, results.get(axis)])) as Record<
    AxisName,
    AxisResult
  >;
  const { stretches: _rows, ...timeBase } = base;
  return {
    axes,
    timeBase,
    reading,
    leftOut: usable.leftOut,
    offers: merged([...AXES.flatMap((axis) => axes[axis].offers), ...suspectAttitude(log)]),
    remarks: [...log.remarks, ...remarksOn(base, usable, build, loop_Hz)],
    meanCommand_us: meanMotorCommand_us(log, usable),
    model,
    computeDelay_s,
  };
}

/** Gains of a record's header; null when there are none, or were edited beyond reading. */
function flownGains(log: FlightLog): Gains | null {
  if (log.gainsJson === undefined) return null;
  try {
    return parseGains(JSON.parse(log.gainsJson), log.name);
  } catch {
    return null;
  }
}

function liveliness(log: FlightLog, axis: AxisName): number {
  const signal = log.setpoint_dps[axis] ?? log.gyro_dps[axis];
  if (signal === undefined) return 0;
  let sum = 0;
  let square = 0;
  for (const value of signal) {
    sum += value;
    square += value * value;
  }
  return square / signal.length - (sum / signal.length) ** 2;
}

function meanOver(usable: UsableRows, columns: readonly ArrayLike<number>[]): number | null {
  let sum = 0;
  let count = 0;
  for (const { stretch, begin, end } of usable.spans) {
    for (let i = begin; i < end; i++) {
      const row = stretch.row[i];
      if (row < 0) continue;
      for (const column of columns) sum += column[row];
      count += columns.length;
    }
  }
  return count > 0 ? sum / count : null;
}

function meanMotorCommand_us(log: FlightLog, usable: UsableRows): number | null {
  const motors = motorCommands_us(log);
  return motors === null ? null : meanOver(usable, motors);
}

function meanRotor_Hz(log: FlightLog, usable: UsableRows): number | null {
  const speeds = Object.values(log.rotorSpeed_rpm);
  const mean = speeds.length > 0 ? meanOver(usable, speeds) : null;
  return mean === null ? null : mean / 60;
}

function merged(offers: readonly Offer[]): Offer[] {
  const seen = new Set<string>();
  return offers.filter((offer) => {
    const key = `${offer.signals[0]} ${offer.unit ?? offer.sign ?? ''}`;
    if (seen.has(key)) return false;
    seen.add(key);
    return true;
  });
}

function remarksOn(base: TimeBase, usable: UsableRows, build: Build, loop_Hz: number | null): string[] {
  const remarks: string[] = [];
  const rate_Hz = 1 / base.period_s;
  if (base.irregular) {
    remarks.push('The rows follow no regular tick; their times were used as they stand.');
  } else if (base.lostRows > 0) {
    remarks.push(
      `${base.lostRows} rows were lost from a tick of ${rate_Hz.toFixed(0)} Hz; they were bridged.`,
    );
  }
  if (loop_Hz !== null && loop_Hz * base.period_s > THINNED_RATIO) {
    remarks.push(
      `The log holds ${rate_Hz.toFixed(0)} of ${loop_Hz.toFixed(0)} ticks a second; a log of every tick tells lag and delay better.`,
    );
  } else if (loop_Hz === null && build.esc.update_Hz * base.period_s > THINNED_RATIO) {
    remarks.push(
      `The rows come at ${rate_Hz.toFixed(0)} Hz, the motors’ commands at up to ${build.esc.update_Hz} Hz. If the controller runs faster than the rows, its rate must be told: the delay comes out too short otherwise.`,
    );
  }
  if (usable.airborneUnknown) {
    remarks.push('The log has neither throttle nor motor commands: all of it was taken as flown.');
  }
  if (usable.saturatedShare > 0.02) {
    remarks.push(
      `A motor was at its limit in ${(100 * usable.saturatedShare).toFixed(0)} % of the flight; there the craft is not linear and those rows were left out.`,
    );
  }
  return remarks;
}
