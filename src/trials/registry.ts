/** All trials, in the order in which they are run. A new one is its own definition and one line here. */
import { AXES } from '../craft/gains.ts';
import { refuse } from '../craft/problem.ts';
import { bridgeWake } from './definitions/bridgeWake.ts';
import { chippedPropeller } from './definitions/chippedPropeller.ts';
import { coldStart } from './definitions/coldStart.ts';
import { gust, GUST_SIDES } from './definitions/gust.ts';
import { gustAndNoise } from './definitions/gustAndNoise.ts';
import { hoverNoise } from './definitions/hoverNoise.ts';
import { invertedRecovery } from './definitions/invertedRecovery.ts';
import { loopJitter } from './definitions/loopJitter.ts';
import { lowBattery } from './definitions/lowBattery.ts';
import { payloadDrop } from './definitions/payloadDrop.ts';
import { punchAndChop } from './definitions/punchAndChop.ts';
import { rateDoublet } from './definitions/rateDoublet.ts';
import { rateStep } from './definitions/rateStep.ts';
import { shiftedCentre } from './definitions/shiftedCentre.ts';
import { turbulence } from './definitions/turbulence.ts';
import { weakMotor } from './definitions/weakMotor.ts';
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
  bridgeWake,
  hoverNoise,
  gustAndNoise,
  punchAndChop,
  lowBattery,
  payloadDrop,
  shiftedCentre,
  weakMotor,
  chippedPropeller,
  loopJitter,
  coldStart,
  invertedRecovery,
];

/** @throws InputError naming the trial and those that exist. */
export function trialByName(name: string, file = 'trials'): Trial {
  const found = TRIALS.find((trial) => trial.name === name);
  if (found === undefined) {
    throw refuse(file, 'trial', name, `one of ${TRIALS.map((trial) => trial.name).join(', ')}`);
  }
  return found;
}
