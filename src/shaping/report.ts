/** The analysis of a gain set on a build or a plant: what the command line prints and the page shows. */
import type { Build } from '../craft/build.ts';
import { AXES, type AxisName, type Gains } from '../craft/gains.ts';
import { analyse } from './analysis.ts';
import { axisModels, type TrimChoice } from './axisModel.ts';
import { plantSystem, type ContinuousSystem, type Plant } from './continuous.ts';
import { gyroNoise, type GyroNoise } from './noise.ts';
import { rateLoop } from './rateLoop.ts';
import type { StepMetrics } from './stepInfo.ts';

export { gyroNoise };

/** Gyro noise density where only a plant is given. */
export const DEFAULT_NOISE_DPS_PER_RTHZ = 0.01;

export interface AxisReport {
  readonly plant: Plant;
  readonly stable: boolean;
  readonly conditionallyStable: boolean;
  readonly gainMargin_dB: number | null;
  readonly gainReduction_dB: number | null;
  readonly phaseMargin_deg: number | null;
  readonly delayMargin_ms: number | null;
  readonly crossover_Hz: number | null;
  readonly maxSensitivity: number | null;
  readonly polesMaxRadius: number;
  readonly step: StepMetrics;
  readonly noiseAtMotor_us_rms: number | null;
  readonly gainCrossings_Hz: readonly number[];
  readonly phaseCrossings_Hz: readonly number[];
  readonly fitError_dB: number | null;
  readonly fitError_deg: number | null;
  readonly statement: string;
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
  return perAxis((axis) => {
    const model = models[axis];
    return axisReport(model.measured, model.plant, gains, axis, noise, {
      dB: model.fitError_dB,
      deg: model.fitError_deg,
    });
  });
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
  fit: { dB: number; deg: number } | null,
): AxisReport {
  const result = analyse(rateLoop(system, gains, axis), noise.sigma_dps, noise.correlation);
  const { margins } = result;
  const hertz = (omega: number) => omega / (2 * Math.PI);
  return {
    plant,
    stable: result.stable,
    conditionallyStable: result.conditionallyStable,
    gainMargin_dB: margins.gainMargin_dB,
    gainReduction_dB: margins.gainReduction_dB,
    phaseMargin_deg: margins.phaseMargin_deg,
    delayMargin_ms: result.stable ? margins.delayMargin_ms : null,
    crossover_Hz: margins.crossover_Hz,
    maxSensitivity: Number.isFinite(margins.maxSensitivity) ? margins.maxSensitivity : null,
    polesMaxRadius: result.polesMaxRadius,
    step: result.step,
    noiseAtMotor_us_rms: result.noiseAtMotor_us_rms,
    gainCrossings_Hz: margins.gainCrossings.map((one) => hertz(one.omega)),
    phaseCrossings_Hz: margins.phaseCrossings.map((one) => hertz(one.omega)),
    fitError_dB: fit === null ? null : fit.dB,
    fitError_deg: fit === null ? null : fit.deg,
    statement: result.statement,
  };
}
