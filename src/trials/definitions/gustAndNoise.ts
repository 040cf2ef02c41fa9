/** Quiet hover, then one sharp gust: both layers of the map of derivative gain and cutoff in one flight. */
import { AXES } from '../../craft/gains.ts';
import { motorActivity_us, peakDrift_m, rowsBetween } from '../measures.ts';
import { peakTilt } from '../scores.ts';
import { COMMON, defineTrial, type ScoreDefinition, type TrialRun } from '../trial.ts';
import { gustWind } from '../winds.ts';

const GUST_S = 3;
const DURATION_S = 8;

const excursion: ScoreDefinition = {
  name: 'gust excursion',
  unit: 'deg/s',
  band: { most: 20 },
  source: COMMON,
  of: ({ record, rows: [from, to] }: TrialRun) => {
    const axes = AXES.map((axis) => record.column(`rate_${axis}_dps`));
    let most = 0;
    for (let k = from; k < to; k++) most = Math.max(most, Math.hypot(axes[0][k], axes[1][k], axes[2][k]));
    return most;
  },
};

const quietActivity: ScoreDefinition = {
  name: 'motor activity',
  unit: 'µs rms',
  band: { most: 20 },
  source: COMMON,
  of: ({ record }) => motorActivity_us(record, ...rowsBetween(record, 0.8, GUST_S)),
};

const drift: ScoreDefinition = {
  name: 'peak drift',
  unit: 'm',
  band: {},
  source: COMMON,
  of: ({ record, rows }) => peakDrift_m(record, ...rows),
};

export const gustAndNoise = defineTrial({
  name: 'gust-and-noise',
  title: 'Noise floor, then a gust',
  purpose: 'Quiet hover for the noise at the motors, then one sharp gust, self-levelling alone.',
  parameters: {
    peak_mps: { value: 6, least: 0, most: 30, meaning: 'greatest speed of the gust' },
    rise_s: { value: 0.15, least: 0.05, most: 2, meaning: 'time from nothing to the peak, and down again' },
    from_deg: { value: 30, least: -360, most: 360, meaning: 'where it comes from' },
  },
  scores: [excursion, quietActivity, peakTilt(10), drift],
  traceSignals: ['rate_roll_dps', 'rate_pitch_dps', 'rate_yaw_dps', 'cmd_FL_us', 'wind_n_mps'],
  duration_s: () => DURATION_S,
  start: () => ({ kind: 'hover', height_m: 8 }),
  wind: (p) => gustWind(p.peak_mps, p.from_deg, GUST_S, p.rise_s),
  scored: () => [GUST_S, DURATION_S],
  // Self-levelling alone: what tilts is the gust's doing, not a mooring's leaning into it.
  sticks: (_time_s, sticks) => {
    sticks.levelling = true;
    sticks.heightHold = true;
    sticks.throttle = 0.5;
  },
});
