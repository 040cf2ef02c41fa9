/** A 1−cos gust from one side while moored; the craft's nose points north. */
import { heightError, peakDrift, peakTilt, rmsRateError, saturation } from '../scores.ts';
import { defineTrial, type Trial } from '../trial.ts';
import { gustWind } from '../winds.ts';
import { MOORED_SIGNALS, moor } from './moored.ts';

const SIDES = { front: 0, right: 90, rear: 180, left: 270 } as const;
export type Side = keyof typeof SIDES;
export const GUST_SIDES = Object.keys(SIDES) as readonly Side[];
const START_S = 1;

export function gust(side: Side): Trial {
  return defineTrial({
    name: `gust-${side}`,
    title: `Gust from the ${side}`,
    purpose: `A single 1−cos gust from the ${side}: what it does to attitude and place.`,
    parameters: {
      peak_mps: { value: 6, least: 0, most: 30, meaning: 'greatest speed of the gust' },
      rise_s: { value: 0.6, least: 0.05, most: 10, meaning: 'time from nothing to the peak, and down again' },
    },
    scores: [peakTilt(15), peakDrift(1.5), heightError(0.5), rmsRateError(8), saturation(2)],
    traceSignals: MOORED_SIGNALS,
    duration_s: ({ rise_s }) => START_S + 2 * rise_s + 3.8,
    start: () => ({ kind: 'hover', height_m: 8 }),
    wind: (p) => gustWind(p.peak_mps, SIDES[side], START_S, p.rise_s),
    scored: ({ rise_s }) => [START_S - 0.1, START_S + 2 * rise_s + 3.8],
    sticks: moor,
  });
}
