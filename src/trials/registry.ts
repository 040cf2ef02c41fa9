/** All trials, in the order in which they are run. A new one is its own definition and one line here. */
import { AXES } from '../craft/gains.ts';
import { refuse } from '../craft/problem.ts';
import { gust, gustAndNoise, GUST_SIDES, turbulence, wakeCrossing } from './definitions/air.ts';
import {
  chippedPropeller,
  coldStart,
  hoverNoise,
  invertedRecovery,
  lateLoop,
  lowBattery,
  payloadDrop,
  punchAndChop,
  shiftedCentre,
  weakMotor,
} from './definitions/craft.ts';
import { rateDoublet, rateStep } from './definitions/rate.ts';
import type { Trial } from './trial.ts';

export const TRIALS: readonly Trial[] = [
  ...AXES.flatMap((axis) => [rateStep(axis, 'small'), rateStep(axis, 'large')]),
  ...AXES.flatMap((axis) => [rateDoublet(axis, 'small'), rateDoublet(axis, 'large')]),
  ...GUST_SIDES.map((side) => gust(side)),
  turbulence('light'),
  turbulence('moderate'),
  turbulence('severe'),
  turbulence('light', 0.5),
  turbulence('moderate', 0.5),
  wakeCrossing,
  hoverNoise,
  gustAndNoise,
  punchAndChop,
  lowBattery,
  payloadDrop,
  shiftedCentre,
  weakMotor,
  chippedPropeller,
  lateLoop,
  coldStart,
  invertedRecovery,
];

/** @throws InputError naming the trial and those that exist. */
export function trialByName(name: string): Trial {
  const found = TRIALS.find((trial) => trial.name === name);
  if (found === undefined) {
    throw refuse('--trial', 'name', name, `one of ${TRIALS.map((trial) => trial.name).join(', ')}`);
  }
  return found;
}
