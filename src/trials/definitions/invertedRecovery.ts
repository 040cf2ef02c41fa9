/** Let go upside down: time and height until level. */
import { CALM } from '../../craft/wind.ts';
import { timeToTouch } from '../scores.ts';
import { COMMON, defineTrial, type ScoreDefinition } from '../trial.ts';

const DURATION_S = 5;
/** Tilt that counts as level, deg. */
const LEVEL_DEG = 15;

const timeToLevel: ScoreDefinition = {
  name: 'time to level',
  unit: 's',
  band: { most: 1.5 },
  source: COMMON,
  of: ({ record }) => {
    const t = record.column('t_s');
    const x = record.column('qx');
    const y = record.column('qy');
    const level = Math.cos((LEVEL_DEG * Math.PI) / 180);
    let after = 0;
    for (let k = 0; k < t.length; k++) if (1 - 2 * (x[k] ** 2 + y[k] ** 2) < level) after = k + 1;
    return after < t.length ? t[after] : NaN;
  },
};

const heightLost: ScoreDefinition = {
  name: 'height lost',
  unit: 'm',
  band: { most: 15 },
  source: COMMON,
  of: ({ record }) => {
    const down = record.column('down_m');
    return down.reduce((lowest, value) => Math.max(lowest, value), down[0]) - down[0];
  },
};

export const invertedRecovery = defineTrial({
  name: 'inverted-recovery',
  title: 'Recovery from inverted',
  purpose: 'Let go upside down with self-levelling on: time and height until it is level.',
  parameters: {
    roll_deg: { value: 175, least: -180, most: 180, meaning: 'roll angle at the start' },
    height_m: { value: 60, least: 10, most: 500, meaning: 'height at the start' },
  },
  scores: [timeToLevel, heightLost, timeToTouch(DURATION_S - 0.05)],
  traceSignals: ['sp_roll_dps', 'rate_roll_dps', 'rate_pitch_dps', 'throttle', 'down_m'],
  duration_s: () => DURATION_S,
  start: (p) => ({ kind: 'free-air', height_m: p.height_m, roll_deg: p.roll_deg }),
  wind: () => CALM,
  sticks: (_time_s, sticks) => {
    sticks.levelling = true;
    sticks.heightHold = true;
    sticks.throttle = 0.5;
  },
});
