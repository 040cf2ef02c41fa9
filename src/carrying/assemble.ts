/** Gathers what the sheet says from build, gains and results of trials: margins, plots, what was not tested. */
import type { Build } from '../craft/build.ts';
import { AXES, type Gains } from '../craft/gains.ts';
import { InputError, refuse } from '../craft/problem.ts';
import { VERSION } from '../flight/record.ts';
import { axisModels } from '../shaping/axisModel.ts';
import { exportConstants, type Convention } from '../shaping/conventions.ts';
import { loopCurves } from '../shaping/curves.ts';
import { gustResponse } from '../shaping/gust.ts';
import { rateLoop } from '../shaping/rateLoop.ts';
import { reportForBuild } from '../shaping/report.ts';
import { TRIALS } from '../trials/registry.ts';
import { bandText, scoreText } from '../trials/report.ts';
import type { Score, TrialResult } from '../trials/trial.ts';
import type { SheetContent, SheetQuantity, SheetTrial } from './sheet.ts';
import { AXIS_DASH, linePlot } from './svgPlot.ts';
import type { WindProof } from './windLimit.ts';
import { sheetWind, windNotTested } from './windWords.ts';

/** Trials that a sheet should have, quick enough to run for it. */
export const SHEET_TRIALS: readonly string[] = [
  'rate-step-roll-small',
  'rate-step-pitch-small',
  'rate-step-yaw-small',
  'hover-noise',
  'gust-front',
  'gust-right',
  'gust-rear',
  'gust-left',
  'turbulence-light',
  'turbulence-moderate',
  'low-battery',
  'weak-motor',
];

export interface SheetInput {
  readonly build: Build;
  readonly gains: Gains;
  readonly convention: Convention;
  readonly results: readonly TrialResult[];
  /** What the flights in rising wind have shown; null or absent when they were not flown. */
  readonly wind?: WindProof | null;
  readonly printedAt: string;
  /** How well measured quantities are known, by their name in `QUANTITIES`; from Measure. */
  readonly known?: Readonly<Record<string, string>>;
}

/** @throws InputError when the craft cannot be trimmed in hover. */
export function assembleSheet(input: SheetInput): SheetContent {
  const { build, gains, results, wind = null } = input;
  const report = trimmed(build, () => reportForBuild(build, gains));
  return {
    build,
    gains,
    measured: quantitiesOf(build, input.known ?? {}),
    convention: input.convention.name,
    constants: constantsOf(input),
    margins: AXES.map((axis) => ({ axis, ...report[axis] })),
    ...trialsOf(results),
    wind: wind === null ? null : sheetWind(wind),
    notTested: [...notRun(results), ...windNotTested(wind), ...NEVER_TESTED],
    plots: trimmed(build, () => plotsOf(build, gains, (axis) => report[axis].stable)),
    version: VERSION,
    printedAt: input.printedAt,
  };
}

function trimmed<T>(build: Build, run: () => T): T {
  try {
    return run();
  } catch (error) {
    if (error instanceof RangeError && !(error instanceof InputError)) {
      throw refuse(build.name, 'propeller', error.message, 'a craft that can hover');
    }
    throw error;
  }
}

/** The constants' own lines: loop, filters and cautions stand elsewhere on the sheet. */
function constantsOf({ gains, convention, build }: SheetInput): string[] {
  const lines = exportConstants(gains, convention, 'text', build.name).trimEnd().split('\n');
  return lines.slice(lines.indexOf('') + 1);
}

/** Kilograms in a pound (international yard and pound agreement, 1959). */
const POUND_KG = 0.45359237;

/** What the sheet says of a build, by the name that Measure uses for how well it is known. */
const QUANTITIES: Readonly<Record<string, (build: Build) => readonly [value: number, unit: string]>> = {
  'all-up mass': ({ airframe }) => [airframe.mass_kg, 'kg'],
  'inertia roll': ({ airframe }) => [airframe.inertia_kgm2.xx, 'kg m²'],
  'inertia pitch': ({ airframe }) => [airframe.inertia_kgm2.yy, 'kg m²'],
  'inertia yaw': ({ airframe }) => [airframe.inertia_kgm2.zz, 'kg m²'],
  'propeller diameter': ({ propeller }) => [propeller.diameter_m, 'm'],
  'thrust coefficient': ({ propeller }) => [propeller.thrustCoefficient, ''],
  'power coefficient': ({ propeller }) => [propeller.powerCoefficient, ''],
  'battery cells': ({ battery }) => [battery.cells, ''],
  'battery capacity': ({ battery }) => [battery.capacity_Ah, 'A h'],
  'gyro noise': ({ gyro }) => [gyro.noise_dps_per_rtHz, 'deg/s/√Hz'],
};

/** Names of the quantities on the sheet. */
export const QUANTITY_NAMES: readonly string[] = Object.keys(QUANTITIES);

function quantitiesOf(build: Build, known: Readonly<Record<string, string>>): SheetQuantity[] {
  return Object.entries(QUANTITIES).map(([name, read]) => {
    const [value, unit] = read(build);
    const text = String(Number(value.toPrecision(4)));
    return {
      name,
      value: unit === 'kg' ? `${text} kg (${Number((value / POUND_KG).toPrecision(4))} lb)` : text,
      unit: unit === 'kg' ? '' : unit,
      known: Object.hasOwn(known, name) ? known[name] : 'as entered',
    };
  });
}

/** More than this does not fit beside the rest on the second page. */
const MOST_ROWS = 12;
/** What stands of one trial: a table's row of about two lines. */
const LONGEST_SCORES = 150;

/** What is outside its band comes first and is never left out of sight. */
function trialsOf(results: readonly TrialResult[]): Pick<SheetContent, 'trials' | 'moreTrials'> {
  const order = (result: TrialResult) =>
    (result.pass ? 1000 : 0) + (SHEET_TRIALS.includes(result.trial) ? 0 : 100);
  const sorted = [...results].sort((a, b) => order(a) - order(b));
  const left = sorted.slice(MOST_ROWS);
  const names = (pass: boolean) =>
    left.filter((result) => result.pass === pass).map((result) => result.title);
  const parts = [
    ['Also OUTSIDE their bands', names(false)],
    ['Also within their bands', names(true)],
  ] as const;
  return {
    trials: sorted.slice(0, MOST_ROWS).map(sheetTrial),
    moreTrials: parts
      .filter(([, titles]) => titles.length > 0)
      .map(([what, titles]) => `${what} (${titles.length}): ${titles.join('; ')}.`)
      .join(' '),
  };
}

function sheetTrial(result: TrialResult): SheetTrial {
  const { title, seed, pass, stopped, note } = result;
  const outside = result.scores.filter((score) => !score.pass);
  const whole = [...outside, ...result.scores.filter((score) => score.pass)].map(scoreWords);
  const text = note ?? (stopped === null ? fitting(whole) : `ended early: ${stopped}`);
  return { trial: `${title}${changedParameters(result)}`, scores: text, seed, pass };
}

/** What trials call the source of a band that a person has set. */
const OWN_BAND = 'set by the user';

function scoreWords(score: Score): string {
  const own = score.source === OWN_BAND ? ', own band' : '';
  return `${score.name} ${scoreText(score)} (${bandText(score.band, score.unit)}${own})${score.pass ? '' : ' OUTSIDE'}`;
}

function fitting(parts: readonly string[]): string {
  let text = '';
  let used = 0;
  for (const part of parts) {
    if (used > 0 && text.length + part.length > LONGEST_SCORES) break;
    text += used === 0 ? part : `; ${part}`;
    used++;
  }
  const left = parts.length - used;
  return left === 0 ? text : `${text}; ${left} more`;
}

/** What a person changed about a trial stands with its name: another gust is another trial. */
function changedParameters({ trial, parameters }: TrialResult): string {
  const own = TRIALS.find((one) => one.name === trial)?.parameters ?? {};
  const changed = Object.entries(parameters).filter(
    ([name, value]) => Object.hasOwn(own, name) && own[name].value !== value,
  );
  return changed.length === 0 ? '' : ` (${changed.map(([name, value]) => `${name} ${value}`).join(', ')})`;
}

const NEVER_TESTED: readonly string[] = [
  'Structure, wiring, radio link, fail-safe, navigation, and anything else the model does not hold.',
];

function notRun(results: readonly TrialResult[]): string[] {
  const run = new Set(results.map((result) => result.trial));
  const left = TRIALS.filter((trial) => !run.has(trial.name)).map((trial) => trial.title);
  const skipped = results.filter((result) => result.note !== null).map((result) => result.title);
  return [
    ...(left.length === 0 ? [] : [`Trials not run: ${left.join('; ')}.`]),
    ...(skipped.length === 0 ? [] : [`Trials that say nothing about this build: ${skipped.join('; ')}.`]),
  ];
}

type AxisCurves = ReturnType<typeof loopCurves> & { axis: (typeof AXES)[number] };
interface Curve {
  readonly x: Float64Array;
  readonly y: Float64Array;
}
const NOTHING: Curve = { x: new Float64Array(0), y: new Float64Array(0) };
/** Push from outside in the gust plot, deg/s²: a step of angular acceleration that stays. */
const PUSH_DPS2 = 100;
/** Length of the plots in time, s. */
const SHOWN_S = 0.6;
/** Upper end of common practice for the peak of the sensitivity, Ms. */
const COMMON_MS = 1.6;

function plotsOf(build: Build, gains: Gains, stable: (axis: (typeof AXES)[number]) => boolean): string[] {
  const models = axisModels(build);
  const loops = AXES.map((axis) => ({ axis, loop: rateLoop(models[axis].measured, gains, axis) }));
  const curves = loops.map(({ axis, loop }) => ({
    axis,
    ...loopCurves(loop, build.gyro.noise_dps_per_rtHz),
  }));
  const lines = (pick: (c: AxisCurves) => Curve) =>
    curves.map((c) => ({ label: c.axis, dash: AXIS_DASH[c.axis], ...pick(c) }));
  const gusts = new Map(loops.map(({ axis, loop }) => [axis, stable(axis) ? pushCurve(loop) : NOTHING]));
  return [
    linePlot(
      { title: 'Rate step, setpoint 1', xLabel: 's', yLabel: '', levels: [{ y: 1, label: '1' }] },
      lines((c) => (c.step === null ? NOTHING : firstPart(c.step.t_s, c.step.y))),
    ),
    linePlot(
      { title: `Rate after a gust’s push of ${PUSH_DPS2} deg/s²`, xLabel: 's', yLabel: 'deg/s' },
      lines((c) => gusts.get(c.axis) ?? NOTHING),
    ),
    linePlot(
      { title: 'Loop gain', xLabel: 'Hz', yLabel: 'dB', logX: true, levels: [{ y: 0, label: '0 dB' }] },
      lines((c) => ({ x: c.f_Hz, y: c.gain_dB })),
    ),
    linePlot(
      {
        title: 'Sensitivity (below 0 dB: gusts held down)',
        xLabel: 'Hz',
        yLabel: 'dB',
        logX: true,
        levels: [{ y: 20 * Math.log10(COMMON_MS), label: `Ms ${COMMON_MS}` }],
      },
      lines((c) => ({ x: c.f_Hz, y: c.sensitivity_dB })),
    ),
  ];
}

function pushCurve(loop: ReturnType<typeof rateLoop>): Curve {
  const { t_s, rate_dps } = gustResponse(loop, PUSH_DPS2, SHOWN_S);
  return firstPart(t_s, rate_dps);
}

function firstPart(t_s: Float64Array, y: Float64Array): Curve {
  const count = t_s.findIndex((t) => t > SHOWN_S);
  const last = count === -1 ? t_s.length : count;
  return { x: t_s.subarray(0, last), y: y.subarray(0, last) };
}
