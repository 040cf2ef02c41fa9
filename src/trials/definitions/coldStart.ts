/** From the legs into gusty wind by height hold, self-levelling. */
import { peakTilt, rmsRateError } from '../scores.ts';
import { COMMON, defineTrial, type ScoreDefinition } from '../trial.ts';
import { turbulenceWind } from '../winds.ts';

const DURATION_S = 6;
const ARM_S = 0.3;

const endHeight: ScoreDefinition = {
  name: 'height at end',
  unit: 'm',
  band: { least: 1.2 },
  source: COMMON,
  of: ({ record, rows }) => -record.column('down_m')[rows[1] - 1],
};

export const coldStart = defineTrial({
  name: 'cold-start',
  title: 'Start from the ground in wind',
  purpose:
    'Motors from rest, off the legs in gusty wind and up to a few metres by height hold, self-levelling.',
  parameters: {
    scale: {
      value: 0.8,
      least: 0,
      most: 2,
      meaning: 'factor on MIL-F-8785C light turbulence, 15 kn at 20 ft',
    },
  },
  scores: [peakTilt(25), endHeight, rmsRateError(15)],
  traceSignals: ['throttle', 'rate_roll_dps', 'rate_pitch_dps', 'rate_yaw_dps', 'down_m', 'touching'],
  duration_s: () => DURATION_S,
  start: () => ({ kind: 'ground' }),
  wind: (p) => turbulenceWind('light', p.scale, 0.5),
  scored: () => [ARM_S, DURATION_S],
  sticks: (time_s, sticks) => {
    sticks.armed = time_s > ARM_S;
    sticks.levelling = true;
    sticks.heightHold = true;
    sticks.throttle = time_s > 0.8 && time_s < 3 ? 1 : 0.5;
  },
});
