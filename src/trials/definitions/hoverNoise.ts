/** Still air: what the gyro's noise and vibration do to motors, heat, pack and rest. */
import { CALM } from '../../craft/wind.ts';
import { rms } from '../measures.ts';
import {
  energyPerMinute,
  heatOverQuiet,
  motorActivity,
  packPerMinute,
  saturation,
  windingHeat,
} from '../scores.ts';
import { COMMON, defineTrial, type ScoreDefinition } from '../trial.ts';
import { moor } from './moored.ts';

const DURATION_S = 6;

const rmsRate: ScoreDefinition = {
  name: 'rms rate',
  unit: 'deg/s',
  band: { most: 1 },
  source: COMMON,
  of: ({ record, rows }) =>
    Math.hypot(...['roll', 'pitch', 'yaw'].map((axis) => rms(record.column(`rate_${axis}_dps`), ...rows))),
};

export const hoverNoise = defineTrial({
  name: 'hover-noise',
  title: 'Hover, noise floor',
  purpose: 'Still air: what the gyro’s noise and vibration do to motors, winding heat, pack and rest.',
  parameters: {},
  scores: [
    motorActivity(20),
    heatOverQuiet(15),
    windingHeat({}),
    rmsRate,
    energyPerMinute({}),
    packPerMinute(15),
    saturation(0.1),
  ],
  traceSignals: ['gyro_roll_dps', 'rate_roll_dps', 'cmd_FL_us', 'heat_FL_W'],
  duration_s: () => DURATION_S,
  start: () => ({ kind: 'hover', height_m: 8 }),
  wind: () => CALM,
  scored: () => [1.5, DURATION_S],
  sticks: moor,
});
