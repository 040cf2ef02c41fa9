/** The analysis of a gain set on a build or a plant: what the command line prints and the page shows. */
import type { Build } from '../craft/build.ts';
import { AXES, type AxisName, type Gains } from '../craft/gains.ts';
import { DEFAULT_LEVELLING } from '../flight/pilot.ts';
import { analyse, type AxisAnalysis } from './analysis.ts';
import { axisModels, type AxisModel, type TrimChoice } from './axisModel.ts';
import { complex, over } from './complex.ts';
import { plantSystem, type ContinuousSystem, type Plant } from './continuous.ts';
import { gustResponse } from './gust.ts';
import {
  disturbanceRejection,
  handlingBandwidth,
  type DisturbanceRejection,
  type HandlingBandwidth,
} from './handling.ts';
import { noiseHeat_W } from './heat.ts';
import { analyseLevelled } from './levelledLoop.ts';
import { gyroNoise, type GyroNoise } from './noise.ts';
import { closedLoopAt, openLoopAt, rateLoop, type RateLoop } from './rateLoop.ts';
import type { StepMetrics } from './stepInfo.ts';

export { gyroNoise };

/** Gyro noise density where only a plant is given. */
export const DEFAULT_NOISE_DPS_PER_RTHZ = 0.01;
/** Push of the gust response: angular acceleration from outside that stays, deg/s². */
const PUSH_DPS2 = 100;

export interface AxisReport {
  readonly plant: Plant;
  readonly stable: boolean;
  readonly conditionallyStable: boolean;
  /** Room for more gain; of an unstable loop the change of gain to the nearest crossing. */
  readonly gainMargin_dB: number | null;
  /** Room for less gain of a conditionally stable loop, negative. */
  readonly gainReduction_dB: number | null;
  readonly phaseMargin_deg: number | null;
  readonly delayMargin_ms: number | null;
  readonly crossover_Hz: number | null;
  readonly maxSensitivity: number | null;
  readonly sensitivityPeak_Hz: number | null;
  readonly maxComplementary: number | null;
  readonly polesMaxRadius: number;
  /** Setpoint to rate, sampled at the ticks. */
  readonly step: StepMetrics;
  readonly noiseAtMotor_us_rms: number | null;
  /** Mean heat per motor that the noise on this axis adds, W. */
  readonly noiseHeat_W: number | null;
  readonly gainCrossings_Hz: readonly number[];
  readonly phaseCrossings_Hz: readonly number[];
  /** Of the rate, against a disturbance. */
  readonly disturbanceRejection: DisturbanceRejection | null;
  /** Attitude over rate setpoint, ADS-33E. */
  readonly handling: HandlingBandwidth | null;
  readonly push: PushReport | null;
  /** With the self-levelling loop closed as well; null for yaw. */
  readonly levelled: LevelledReport | null;
  readonly fitError_dB: number | null;
  readonly fitError_deg: number | null;
  readonly statement: string;
  /** For each field that is null: why. */
  readonly reasons: Readonly<Record<string, string>>;
}

/** Answer to a push of `acceleration_dps2` that stays. */
export interface PushReport {
  readonly acceleration_dps2: number;
  readonly peakRate_dps: number;
  readonly lastingAngle_deg: number;
  readonly recovery_s: number | null;
}

export interface LevelledReport {
  readonly attitude_per_s: number;
  readonly stable: boolean;
  readonly polesMaxRadius: number;
  readonly gainMarginAtMotors_dB: number | null;
  readonly phaseMarginAtMotors_deg: number | null;
  readonly delayMarginAtMotors_ms: number | null;
  readonly maxSensitivityAtMotors: number | null;
  readonly phaseMarginAtAttitude_deg: number | null;
  readonly step: StepMetrics;
  readonly disturbanceRejection: DisturbanceRejection | null;
  readonly handling: HandlingBandwidth | null;
}

export type ShapeReport = Readonly<Record<AxisName, AxisReport>>;

/** Each axis around the same plant. */
export function reportForPlant(
  plant: Plant,
  gains: Gains,
  density = DEFAULT_NOISE_DPS_PER_RTHZ,
): ShapeReport {
  const noise = gyroNoise(density, 0, gains.loop_Hz);
  return perAxis((axis) => axisReport(plantSystem(plant), plant, gains, axis, noise, null));
}

/**
 * Each axis around the build's own linear model at a trim.
 * @throws RangeError when there is no trim there.
 */
export function reportForBuild(build: Build, gains: Gains, choice: TrimChoice = {}): ShapeReport {
  const models = axisModels(build, choice);
  const noise = gyroNoise(build.gyro.noise_dps_per_rtHz, build.gyro.bandwidth_Hz, gains.loop_Hz);
  return perAxis((axis) =>
    axisReport(models[axis].measured, models[axis].plant, gains, axis, noise, models[axis]),
  );
}

function perAxis(report: (axis: AxisName) => AxisReport): ShapeReport {
  return Object.fromEntries(AXES.map((axis) => [axis, report(axis)])) as unknown as ShapeReport;
}

function axisReport(
  system: ContinuousSystem,
  plant: Plant,
  gains: Gains,
  axis: AxisName,
  noise: GyroNoise,
  model: AxisModel | null,
): AxisReport {
  const loop = rateLoop(system, gains, axis);
  const result = analyse(loop, noise.sigma_dps, noise.correlation);
  const { margins, stable } = result;
  const hertz = (omega: number) => omega / (2 * Math.PI);
  const report = {
    plant,
    stable,
    conditionallyStable: result.conditionallyStable,
    gainMargin_dB: margins.gainMargin_dB,
    gainReduction_dB: margins.gainReduction_dB,
    phaseMargin_deg: margins.phaseMargin_deg,
    delayMargin_ms: stable ? margins.delayMargin_ms : null,
    crossover_Hz: margins.crossover_Hz,
    maxSensitivity: finite(margins.maxSensitivity),
    sensitivityPeak_Hz: finite(margins.sensitivityPeak_Hz),
    maxComplementary: finite(margins.maxComplementary),
    polesMaxRadius: result.polesMaxRadius,
    step: result.step,
    noiseAtMotor_us_rms: result.noiseAtMotor_us_rms,
    noiseHeat_W:
      stable && model !== null && model.current !== null ? noiseHeat_W(loop, noise, model.current) : null,
    gainCrossings_Hz: margins.gainCrossings.map((one) => hertz(one.omega)),
    phaseCrossings_Hz: margins.phaseCrossings.map((one) => hertz(one.omega)),
    disturbanceRejection: stable ? rejectionOf(loop, result) : null,
    handling: stable ? rateHandling(loop) : null,
    push: stable ? pushOf(loop) : null,
    levelled:
      axis === 'yaw' ? null : levelledReport(loop, (gains.levelling ?? DEFAULT_LEVELLING).attitude_per_s),
    fitError_dB: model === null ? null : model.fitError_dB,
    fitError_deg: model === null ? null : model.fitError_deg,
    statement: result.statement,
  };
  return { ...report, reasons: reasonsOf(report, axis, model) };
}

const finite = (value: number): number | null => (Number.isFinite(value) ? value : null);
const LOW_SHARE = 2e-5;

function rejectionOf(loop: RateLoop, { margins }: AxisAnalysis): DisturbanceRejection {
  const nyquist = Math.PI / loop.tick_s;
  return disturbanceRejection((omega) => openLoopAt(loop, omega), nyquist * LOW_SHARE, nyquist, {
    value: margins.maxSensitivity,
    hertz: margins.sensitivityPeak_Hz,
  });
}

/** Lowest frequency at which the attitude response is looked at, rad/s. */
const HANDLING_LOW_RADPS = 0.05;

function rateHandling(loop: RateLoop): HandlingBandwidth {
  const attitude = (omega: number) => over(closedLoopAt(loop, omega), complex(0, omega));
  return handlingBandwidth(attitude, HANDLING_LOW_RADPS, Math.PI / loop.tick_s, 'rate');
}

function pushOf(loop: RateLoop): PushReport {
  const { peakRate_dps, lastingAngle_deg, recovery_s } = gustResponse(loop, PUSH_DPS2);
  return { acceleration_dps2: PUSH_DPS2, peakRate_dps, lastingAngle_deg, recovery_s };
}

function levelledReport(loop: RateLoop, attitude_per_s: number): LevelledReport {
  const result = analyseLevelled(loop, attitude_per_s);
  const { atMotors, atAttitude, stable } = result;
  return {
    attitude_per_s,
    stable,
    polesMaxRadius: result.polesMaxRadius,
    gainMarginAtMotors_dB: atMotors.gainMargin_dB,
    phaseMarginAtMotors_deg: atMotors.phaseMargin_deg,
    delayMarginAtMotors_ms: stable ? atMotors.delayMargin_ms : null,
    maxSensitivityAtMotors: finite(atMotors.maxSensitivity),
    phaseMarginAtAttitude_deg: atAttitude.phaseMargin_deg,
    step: result.step,
    disturbanceRejection: stable ? result.rejection : null,
    handling: stable ? result.handling : null,
  };
}

/** Why each null of a report is one. */
function reasonsOf(
  report: Omit<AxisReport, 'reasons'>,
  axis: AxisName,
  model: AxisModel | null,
): Record<string, string> {
  const unstable = 'the loop is unstable';
  const noCrossing = 'the loop gain does not cross 1 below half the loop rate';
  const onlyBuild = 'a plant has no motors; give a build';
  const why: Record<string, string> = {
    gainMargin_dB:
      'the loop nowhere turns by 180° at a gain below 1: more gain alone does not upset this model',
    gainReduction_dB: report.stable
      ? 'the loop nowhere turns by 180° at a gain above 1: less gain does not upset it'
      : 'no lower gain is on the edge of stability',
    phaseMargin_deg: noCrossing,
    crossover_Hz: noCrossing,
    delayMargin_ms: report.stable ? noCrossing : unstable,
    maxSensitivity: 'the loop passes through −1',
    sensitivityPeak_Hz: 'the loop passes through −1',
    maxComplementary: 'the loop passes through −1',
    noiseAtMotor_us_rms: report.stable ? 'the noise does not settle' : unstable,
    noiseHeat_W: !report.stable
      ? unstable
      : model === null
        ? onlyBuild
        : 'the build gives a motor lag and no electric constants',
    disturbanceRejection: unstable,
    handling: unstable,
    push: unstable,
    levelled: axis === 'yaw' ? 'self-levelling steers roll and pitch; yaw keeps its rate' : unstable,
    fitError_dB: 'the plant was given, nothing was fitted',
    fitError_deg: 'the plant was given, nothing was fitted',
  };
  const reasons: Record<string, string> = {};
  for (const [key, value] of Object.entries(report)) if (value === null) reasons[key] = why[key] ?? unstable;
  for (const [key, value] of Object.entries(report.step)) {
    if (value === null)
      reasons[`step.${key}`] = report.stable ? 'not reached while the step was watched' : unstable;
  }
  return reasons;
}
