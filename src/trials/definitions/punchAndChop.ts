/** Full up, down to idle, then hover: attitude must not be lost at either end of the range. */
import { CALM } from '../../craft/wind.ts';
import { leftOver, peakTilt, timeToTouch } from '../scores.ts';
import { defineTrial } from '../trial.ts';
import { hoverThrottle } from './hoverThrottle.ts';

const PUNCH_S = 0.5;
const DURATION_S = 5;

export const punchAndChop = defineTrial({
  name: 'punch-and-chop',
  title: 'Throttle punch and chop',
  purpose:
    'Full throttle, then almost idle, then hover, self-levelling: attitude must survive both ends of the range.',
  parameters: {
    punch_s: { value: 1, least: 0.1, most: 1.5, meaning: 'time at full throttle' },
    chop_s: { value: 1, least: 0.1, most: 1.5, meaning: 'time at low throttle' },
    low: { value: 0.02, least: 0, most: 0.3, meaning: 'throttle stick of the chop' },
  },
  scores: [peakTilt(15), leftOver(4, () => [DURATION_S - 1, DURATION_S]), timeToTouch(DURATION_S - 0.05)],
  traceSignals: ['throttle', 'rate_roll_dps', 'rate_pitch_dps', 'rate_yaw_dps', 'down_m'],
  duration_s: () => DURATION_S,
  start: () => ({ kind: 'free-air', height_m: 80 }),
  wind: () => CALM,
  scored: () => [PUNCH_S, DURATION_S],
  sticks: (time_s, sticks, flight, p) => {
    sticks.levelling = true;
    const t = time_s - PUNCH_S;
    if (t < 0 || t >= p.punch_s + p.chop_s) sticks.throttle = hoverThrottle(flight);
    else sticks.throttle = t < p.punch_s ? 1 : p.low;
  },
});
