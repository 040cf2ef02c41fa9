/** A craft with a fault, moored in a gust from the front: the frame that the fault trials share. */
import type { Build } from '../../craft/build.ts';
import type { Gains } from '../../craft/gains.ts';
import type { Fault } from '../../disturbance/faults.ts';
import { motorActivity, rmsRateError } from '../scores.ts';
import { defineTrial, type Parameter, type ParameterValues, type Trial } from '../trial.ts';
import { gustWind } from '../winds.ts';
import { heldScores, MOORED_SIGNALS, moor } from './moored.ts';

const DURATION_S = 6;

interface FaultyTrial<P extends string> {
  readonly name: string;
  readonly title: string;
  readonly purpose: string;
  readonly parameters: Readonly<Record<P, Parameter>>;
  readonly faults: (build: Build, gains: Gains, p: ParameterValues<P>) => readonly Fault[];
}

export function faulty<P extends string>(about: FaultyTrial<P>): Trial {
  return defineTrial<P | 'peak_mps'>({
    ...about,
    parameters: {
      ...about.parameters,
      peak_mps: { value: 6, least: 0, most: 30, meaning: 'greatest speed of the gust' },
    } as Readonly<Record<P | 'peak_mps', Parameter>>,
    scores: [...heldScores(20, 2.5, DURATION_S), rmsRateError(12), motorActivity(40)],
    traceSignals: [...MOORED_SIGNALS, 'cmd_FL_us', 'cmd_FR_us', 'cmd_RL_us', 'cmd_RR_us'],
    duration_s: () => DURATION_S,
    start: () => ({ kind: 'hover', height_m: 8 }),
    wind: (p) => gustWind(p.peak_mps, 0, 2, 0.6),
    scored: () => [0, DURATION_S],
    sticks: moor,
  });
}
