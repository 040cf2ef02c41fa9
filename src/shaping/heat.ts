/**
 * Heat in the windings that gyro noise adds: the current that the noisy command drives, squared, times the
 * resistance. At these frequencies the rotor hardly follows, so nearly all of it is heat and none is thrust.
 */
import type { PatternCurrent } from './axisModel.ts';
import { deviation, hasCovariance, noiseAtMotor, noisyLoop, stationary, type GyroNoise } from './noise.ts';
import type { RateLoop } from './rateLoop.ts';

/** Place of the rotor speed among the states of a craft's linear model. */
const ROTOR_STATE = 1;

/**
 * Mean heat per motor from one axis's noise, W.
 * @param loop a stable loop around an axis model's `measured` system
 */
export function noiseHeat_W(loop: RateLoop, noise: GyroNoise, current: PatternCurrent): number | null {
  const square = hasCovariance(loop)
    ? meanSquareCurrent(loop, noise, current)
    : standingRotor(loop, noise, current);
  return square === null ? null : current.resistance_ohm * current.meanSquareShare * square;
}

/** Over a tick the command is the older one for a share of it, then the newer; the rotor's speed hardly moves. */
function meanSquareCurrent(loop: RateLoop, noise: GyroNoise, current: PatternCurrent): number | null {
  const noisy = noisyLoop(loop, noise);
  const covariance = stationary(noisy);
  if (covariance === null) return null;
  const { layout, plant } = loop;
  const commandBack = (ticks: number): Float64Array => {
    if (ticks === 0) return noisy.command.slice();
    const row = new Float64Array(noisy.size);
    row[layout.pastCommands + ticks - 1] = 1;
    return row;
  };
  const square = (ticks: number): number | null => {
    const row = commandBack(ticks).map((value) => value * current.perUs_A);
    row[layout.plant + ROTOR_STATE] += current.perSpeed_A;
    const sigma = deviation(covariance, row);
    return sigma === null ? null : sigma * sigma;
  };
  const newer = square(plant.wholeTicks);
  const older = square(plant.wholeTicks + 1);
  return newer === null || older === null ? null : plant.oldShare * older + (1 - plant.oldShare) * newer;
}

/** For very long delays: the rotor taken to stand still, which errs to the hot side. */
function standingRotor(loop: RateLoop, noise: GyroNoise, current: PatternCurrent): number | null {
  const sigma = noiseAtMotor(loop, noise);
  return sigma === null ? null : (sigma * current.perUs_A) ** 2;
}
