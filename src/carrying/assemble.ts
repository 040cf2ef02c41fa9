/** Gathers what the sheet says from build, gains and results of trials: margins, plots, what was not tested. */
import type { Build } from '../craft/build.ts';
import { AXES, type Gains } from '../craft/gains.ts';
import { InputError, refuse } from '../craft/problem.ts';
import { VERSION } from '../flight/record.ts';
import { axisModels } from '../shaping/axisModel.ts';
import { exportConstants, type Convention } from '../shaping/conventions.ts';
import { loopCurves } from '../shaping/curves.ts';
import { rateLoop } from '../shaping/rateLoop.ts';
import { reportForBuild } from '../shaping/report.ts';
import { TRIALS } from '../trials/registry.ts';
import { bandText } from '../trials/report.ts';
import type { TrialResult } from '../trials/trial.ts';
import type { SheetContent, SheetQuantity } from './sheet.ts';
import { AXIS_DASH, linePlot } from './svgPlot.ts';

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
  readonly seed: number;
  readonly printedAt: string;
  /** How well measured quantities are known, by their name; from Measure. */
  readonly known?: Readonly<Record<string, string>>;
}

/** @throws InputError when the craft cannot be trimmed in hover. */
export function assembleSheet(input: SheetInput): SheetContent {
  const { build, gains, results } = input;
  const report = trimmed(build, () => reportForBuild(build, gains));
  return {
    build,
    gains,
    measured: quantitiesOf(build, input.known ?? {}),
    convention: input.convention.name,
    constants: exportConstants(gains, input.convention, 'text', build.name).trimEnd().split('\n'),
    margins: AXES.map((axis) => ({ axis, ...report[axis] })),
    scores: results.flatMap((result) =>
      result.scores.map((score) => ({
        trial: result.title,
        score: score.name,
        value: score.value === null ? 'not reached' : `${Number(score.value.toPrecision(3))} ${score.unit}`,
        band: bandText(score.band, score.unit),
        pass: score.pass,
      })),
    ),
    windProven: windWords(results),
    notTested: notTested(results),
    plots: trimmed(build, () => plotsOf(build, gains)),
    seed: input.seed,
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

function quantitiesOf(build: Build, known: Readonly<Record<string, string>>): SheetQuantity[] {
  const { airframe, propeller, battery, gyro } = build;
  const row = (name: string, value: number, unit: string): SheetQuantity => ({
    name,
    value: String(Number(value.toPrecision(4))),
    unit,
    known: known[name] ?? 'as entered',
  });
  return [
    row('all-up mass', airframe.mass_kg, 'kg'),
    row('inertia roll', airframe.inertia_kgm2.xx, 'kg m²'),
    row('inertia pitch', airframe.inertia_kgm2.yy, 'kg m²'),
    row('inertia yaw', airframe.inertia_kgm2.zz, 'kg m²'),
    row('propeller diameter', propeller.diameter_m, 'm'),
    row('thrust coefficient', propeller.thrustCoefficient, ''),
    row('power coefficient', propeller.powerCoefficient, ''),
    row('battery cells', battery.cells, ''),
    row('battery capacity', battery.capacity_Ah, 'A h'),
    row('gyro noise', gyro.noise_dps_per_rtHz, 'deg/s/√Hz'),
  ];
}

/** What wind the passed trials stand for; a failed one is never counted. */
function windWords(results: readonly TrialResult[]): string | null {
  const passed = (name: string) => results.some((result) => result.trial === name && result.pass);
  const parts: string[] = [];
  const sides = ['front', 'right', 'rear', 'left'].filter((side) => passed(`gust-${side}`));
  if (sides.length > 0) parts.push(`6 m/s gust from ${sides.join(', ')}`);
  const levels = ['light', 'moderate', 'severe'].filter((level) => passed(`turbulence-${level}`));
  if (levels.length > 0) parts.push(`${levels.join(' and ')} turbulence of MIL-F-8785C`);
  return parts.length === 0 ? null : `${parts.join('; ')}; one seed each`;
}

function notTested(results: readonly TrialResult[]): string[] {
  const run = new Set(results.map((result) => result.trial));
  const left = TRIALS.filter((trial) => !run.has(trial.name)).map((trial) => trial.title);
  return [
    ...(left.length === 0 ? [] : [`Trials not run: ${left.join('; ')}.`]),
    'Structure, wiring, radio link, fail-safe, navigation, and anything the model does not hold.',
    'More than one seed of turbulence, unless said above.',
  ];
}

function plotsOf(build: Build, gains: Gains): string[] {
  const models = axisModels(build);
  const curves = AXES.map((axis) => ({
    axis,
    ...loopCurves(rateLoop(models[axis].measured, gains, axis), build.gyro.noise_dps_per_rtHz),
  }));
  const lines = (pick: (c: (typeof curves)[number]) => { x: Float64Array; y: Float64Array }) =>
    curves.map((c) => ({ label: c.axis, dash: AXIS_DASH[c.axis], ...pick(c) }));
  const stepEnd_s = 0.6;
  return [
    linePlot(
      { title: 'Rate step, setpoint 1', xLabel: 's', yLabel: '', levels: [{ y: 1, label: '1' }] },
      lines((c) => {
        const step = c.step ?? { t_s: new Float64Array(0), y: new Float64Array(0) };
        const count = step.t_s.findIndex((t) => t > stepEnd_s);
        const last = count === -1 ? step.t_s.length : count;
        return { x: step.t_s.subarray(0, last), y: step.y.subarray(0, last) };
      }),
    ),
    linePlot(
      { title: 'Loop gain', xLabel: 'Hz', yLabel: 'dB', logX: true, levels: [{ y: 0, label: '0 dB' }] },
      lines((c) => ({ x: c.f_Hz, y: c.gain_dB })),
    ),
    linePlot(
      {
        title: 'Sensitivity to gusts',
        xLabel: 'Hz',
        yLabel: 'dB',
        logX: true,
        levels: [{ y: 20 * Math.log10(1.6), label: 'Ms 1.6' }],
      },
      lines((c) => ({ x: c.f_Hz, y: c.sensitivity_dB })),
    ),
  ];
}
