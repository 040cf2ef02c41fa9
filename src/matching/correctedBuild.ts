/**
 * The build corrected by its own flight: inertia (or thrust), motor lag and gyro delay are scaled until the
 * build's linear model about hover has the plant that was fitted. What was changed, by how much and from which
 * log stands in the build's note.
 */
import { isElectric, parseBuild, type Build } from '../craft/build.ts';
import { AXES, type AxisName } from '../craft/gains.ts';
import { InputError } from '../craft/problem.ts';
import { axisModels, responseAt } from '../shaping/axisModel.ts';
import type { MatchResult } from './matchLog.ts';
import { modelPlant } from './modelPlant.ts';
import { reducePlant } from './reducedPlant.ts';
import type { ReducedEstimates } from './reducedEstimates.ts';

export interface CorrectedBuild {
  /** Null when no axis has numbers. */
  readonly build: Build | null;
  /** Sentences: what was changed. */
  readonly changes: readonly string[];
  /** Sentences: what could not be, and why. */
  readonly kept: readonly string[];
}

type Reduced = Readonly<Record<AxisName, { gain: number; lag_s: number; delay_s: number }>>;

const ROUNDS = 12;
const LARGEST_NOTE = 4000;
/** Gain ratios of all three axes within this share of each other point to the thrust, not to three inertias. */
const ALIKE_SHARE = 0.05;
/** A thrust correction must bring the hover command nearer to the logged one by at least this, µs. */
const HOVER_GAIN_US = 5;
const LONGEST_GYRO_DELAY_S = 0.05;
/** One step never changes a quantity by more: far from the fit the model is not linear in it. */
const LARGEST_STEP = 1.5;

/** @param logName for the note */
export function correctedBuild(build: Build, result: MatchResult, logName: string): CorrectedBuild {
  const fitted = AXES.flatMap((axis) => {
    const { estimates, offers } = result.axes[axis];
    return estimates === null || offers.length > 0 ? [] : [{ axis, estimates }];
  });
  if (fitted.length === 0) {
    return {
      build: null,
      changes: [],
      kept: ['No axis has numbers that are free of doubt; the build stays as it is.'],
    };
  }
  const kept: string[] = [];
  let used = fitted;
  let outcome = scaledToFit(build, used, result);
  while (outcome.problem !== null && used.length > 1) {
    // One axis that no real craft has must not keep the others from being mended: yaw first, its inertia is
    // bound by the other two.
    const dropped = used[used.length - 1].axis;
    kept.push(`${dropped} was left as it is: with it the fit asks for ${outcome.problem}.`);
    used = used.slice(0, -1);
    outcome = scaledToFit(build, used, result);
  }
  if (outcome.problem !== null) {
    kept.push(`The fit asks for ${outcome.problem}; the correction was stopped before that.`);
  }
  const current = outcome.build;
  const after = reducedModel(current);
  for (const { axis, estimates } of used) {
    const off = after[axis].gain / estimates.gain_dps2_per_us.value - 1;
    if (Math.abs(off) > 0.02) {
      kept.push(`${axis}: the model’s gain stays ${(100 * off).toFixed(0)} % from the fit.`);
    }
  }
  const changes = changesBetween(build, current);
  const told = changes.length > 0 ? changes.join(' ') : 'nothing had to be changed.';
  const note = [build.note, `Matched to ${logName}: ${told}`].filter(Boolean).join(' ');
  return {
    build: { ...current, note: note.slice(0, LARGEST_NOTE) },
    changes: changes.length > 0 ? changes : ['Nothing: the build has the plant that was fitted.'],
    kept,
  };
}

/** Scales step by step; a step that would make the build implausible is named and not taken. */
function scaledToFit(build: Build, fitted: readonly Fitted[], result: MatchResult) {
  let current = build;
  let before = reducedModel(build);
  const byThrust = thrustExplains(build, before, fitted, result);
  for (let round = 0; round < ROUNDS; round++) {
    const model = reducedModel(current);
    if (round > 0 && arrived(before, model)) break;
    before = model;
    let next = withLag(current, model, fitted);
    next =
      byThrust && round < ROUNDS / 2 ? withThrust(next, model, fitted) : withInertia(next, model, fitted);
    next = withDelay(next, model, fitted, result.computeDelay_s);
    const checked = plausible(next);
    if (typeof checked === 'string') return { build: current, problem: checked };
    current = checked;
  }
  return { build: current, problem: null };
}

/** Another round would change nothing that can be seen. */
function arrived(before: Reduced, now: Reduced): boolean {
  return AXES.every(
    (axis) =>
      Math.abs(now[axis].gain / before[axis].gain - 1) < 1e-4 &&
      Math.abs(now[axis].lag_s - before[axis].lag_s) < 1e-6 &&
      Math.abs(now[axis].delay_s - before[axis].delay_s) < 1e-6,
  );
}

interface Fitted {
  readonly axis: AxisName;
  readonly estimates: ReducedEstimates;
}

/** What a gyro would show of the build's own linear model, in the form the fit has. */
function reducedModel(build: Build): Reduced {
  const models = axisModels(build);
  return Object.fromEntries(
    AXES.map((axis) => {
      const { plant } = reducePlant((omega) => responseAt(models[axis].measured, omega));
      return [axis, { gain: plant.gain_dps2_per_us, lag_s: plant.lag_s, delay_s: plant.delay_s }];
    }),
  ) as Reduced;
}

function limited(ratio: number): number {
  return Math.min(LARGEST_STEP, Math.max(1 / LARGEST_STEP, ratio));
}

/** Row and column of each fitted axis by the root of its ratio: the tensor stays positive definite. */
function withInertia(build: Build, model: Reduced, fitted: readonly Fitted[]): Build {
  const ratio: Record<AxisName, number> = { roll: 1, pitch: 1, yaw: 1 };
  for (const { axis, estimates } of fitted) {
    ratio[axis] = limited(model[axis].gain / estimates.gain_dps2_per_us.value);
  }
  const { xx, yy, zz, xy, xz, yz } = build.airframe.inertia_kgm2;
  return {
    ...build,
    airframe: {
      ...build.airframe,
      inertia_kgm2: {
        xx: xx * ratio.roll,
        yy: yy * ratio.pitch,
        zz: zz * ratio.yaw,
        xy: xy * Math.sqrt(ratio.roll * ratio.pitch),
        xz: xz * Math.sqrt(ratio.roll * ratio.yaw),
        yz: yz * Math.sqrt(ratio.pitch * ratio.yaw),
      },
    },
  };
}

/** Thrust and torque coefficients by the square of the mean gain ratio: the gain about hover goes with its root. */
function withThrust(build: Build, model: Reduced, fitted: readonly Fitted[]): Build {
  const logs = fitted.map(({ axis, estimates }) =>
    Math.log(estimates.gain_dps2_per_us.value / model[axis].gain),
  );
  const factor = limited(Math.exp((2 * logs.reduce((sum, value) => sum + value, 0)) / logs.length));
  return scaledThrust(build, factor);
}

function scaledThrust(build: Build, factor: number): Build {
  const { propeller } = build;
  const row = <T extends { ct: number; cp: number }>(one: T): T => ({
    ...one,
    ct: one.ct * factor,
    cp: one.cp * factor,
  });
  return {
    ...build,
    propeller: {
      ...propeller,
      thrustCoefficient: propeller.thrustCoefficient * factor,
      powerCoefficient: propeller.powerCoefficient * factor,
      ...(propeller.staticTable === undefined ? {} : { staticTable: propeller.staticTable.map(row) }),
      ...(propeller.advanceTable === undefined ? {} : { advanceTable: propeller.advanceTable.map(row) }),
    },
  };
}

/** All three gains off alike, and the log hovers where the changed thrust says: then it is the thrust. */
function thrustExplains(
  build: Build,
  model: Reduced,
  fitted: readonly Fitted[],
  result: MatchResult,
): boolean {
  if (fitted.length < 3 || result.meanCommand_us === null) return false;
  const ratios = fitted.map(({ axis, estimates }) => estimates.gain_dps2_per_us.value / model[axis].gain);
  const mean = Math.exp(ratios.reduce((sum, value) => sum + Math.log(value), 0) / ratios.length);
  if (ratios.some((ratio) => Math.abs(ratio / mean - 1) > ALIKE_SHARE)) return false;
  const logged = result.meanCommand_us;
  const own = Math.abs(result.model.hoverCommand_us - logged);
  try {
    const changed = modelPlant(scaledThrust(build, mean * mean)).hoverCommand_us;
    return own - Math.abs(changed - logged) > HOVER_GAIN_US;
  } catch (error) {
    if (error instanceof RangeError) return false;
    throw error;
  }
}

/** Motor lag by roll and pitch, weighted by how well each is known; yaw's is hidden behind its lead. */
function withLag(build: Build, model: Reduced, fitted: readonly Fitted[]): Build {
  const ratio = weightedRatio(
    fitted.filter(({ axis }) => axis !== 'yaw'),
    ({ axis, estimates }) => ({
      value: estimates.lag_s.value / model[axis].lag_s,
      sigma: estimates.lag_s.sigma / model[axis].lag_s,
    }),
  );
  if (ratio === null || !(ratio > 0)) return build;
  const step = limited(ratio);
  const { motor, propeller } = build;
  if (isElectric(motor)) {
    return { ...build, propeller: { ...propeller, inertia_kgm2: propeller.inertia_kgm2 * step } };
  }
  return {
    ...build,
    motor: {
      ...motor,
      lag_s: motor.lag_s * step,
      ...(motor.lagDown_s === undefined ? {} : { lagDown_s: motor.lagDown_s * step }),
    },
  };
}

/** What of the delay the controller's computing and the gyro's bandwidth do not make is the gyro's. */
function withDelay(build: Build, model: Reduced, fitted: readonly Fitted[], computeDelay_s: number): Build {
  const more_s = weightedRatio(
    fitted.filter(({ axis }) => axis !== 'yaw'),
    ({ axis, estimates }) => ({
      value: estimates.delay_s.value - computeDelay_s - model[axis].delay_s,
      sigma: estimates.delay_s.sigma,
    }),
  );
  if (more_s === null) return build;
  const delay_s = Math.min(LONGEST_GYRO_DELAY_S, Math.max(0, build.gyro.delay_s + more_s));
  return { ...build, gyro: { ...build.gyro, delay_s } };
}

function weightedRatio(
  fitted: readonly Fitted[],
  of: (one: Fitted) => { value: number; sigma: number },
): number | null {
  let top = 0;
  let below = 0;
  for (const one of fitted) {
    const { value, sigma } = of(one);
    const weight = 1 / Math.max(sigma * sigma, 1e-18);
    top += weight * value;
    below += weight;
  }
  return below > 0 ? top / below : null;
}

/** The build as parsed, or what is wrong with it. */
function plausible(build: Build): Build | string {
  try {
    return parseBuild(build);
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    const [first] = error.problems;
    return `${first.path} ${first.value} (allowed: ${first.allowed})`;
  }
}

function changesBetween(before: Build, after: Build): string[] {
  const sentences: string[] = [];
  const say = (name: string, old: number, now: number) => {
    if (Math.abs(now - old) < 0.001 * Math.abs(old) + 1e-9) return;
    const change = old === 0 ? '' : ` (${now > old ? '+' : ''}${(100 * (now / old - 1)).toFixed(1)} %)`;
    sentences.push(`${name} ${Number(old.toPrecision(4))} → ${Number(now.toPrecision(4))}${change}.`);
  };
  for (const key of ['xx', 'yy', 'zz', 'xy', 'xz', 'yz'] as const) {
    say(`airframe.inertia_kgm2.${key}`, before.airframe.inertia_kgm2[key], after.airframe.inertia_kgm2[key]);
  }
  say('propeller.thrustCoefficient', before.propeller.thrustCoefficient, after.propeller.thrustCoefficient);
  say('propeller.powerCoefficient', before.propeller.powerCoefficient, after.propeller.powerCoefficient);
  say('propeller.inertia_kgm2', before.propeller.inertia_kgm2, after.propeller.inertia_kgm2);
  if (!isElectric(before.motor) && !isElectric(after.motor)) {
    say('motor.lag_s', before.motor.lag_s, after.motor.lag_s);
  }
  say('gyro.delay_s', before.gyro.delay_s, after.gyro.delay_s);
  return sentences;
}
