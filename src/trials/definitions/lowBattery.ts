/** A gust with the pack nearly empty: what thrust is left for control. */
import { defineTrial } from '../trial.ts';
import { gustWind } from '../winds.ts';
import { heldScores, MOORED_SIGNALS, moor } from './moored.ts';

const DURATION_S = 6;

export const lowBattery = defineTrial({
  name: 'low-battery',
  title: 'Low battery in a gust',
  purpose: 'A gust from the front with the pack nearly empty.',
  parameters: {
    charge: { value: 0.1, least: 0.01, most: 1, meaning: 'state of charge' },
    peak_mps: { value: 6, least: 0, most: 30, meaning: 'greatest speed of the gust' },
  },
  scores: heldScores(15, 1.5, DURATION_S),
  traceSignals: [...MOORED_SIGNALS, 'battery_V'],
  duration_s: () => DURATION_S,
  start: () => ({ kind: 'hover', height_m: 8 }),
  wind: (p) => gustWind(p.peak_mps, 0, 1.5, 0.6),
  build: (build, p) => ({ ...build, battery: { ...build.battery, charge: p.charge } }),
  scored: () => [0, DURATION_S],
  sticks: moor,
});
