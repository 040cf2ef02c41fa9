/** Rate step of one axis in free air: how fast and how cleanly the rate follows the stick. */
import type { AxisName } from '../../craft/gains.ts';
import { CALM } from '../../craft/wind.ts';
import { saturation, stepScoreSet } from '../scores.ts';
import { defineTrial, type Trial } from '../trial.ts';
import { hoverThrottle } from './hoverThrottle.ts';

const START_S = 0.5;

/** Hold times keep a roll or pitch step short of half a turn, so that gravity's side does not change it much. */
export function rateStep(axis: AxisName, size: 'small' | 'large'): Trial {
  const small = size === 'small';
  const yaw = axis === 'yaw';
  const window = ({ hold_s }: { hold_s: number }) => [START_S, START_S + hold_s] as const;
  return defineTrial({
    name: `rate-step-${axis}-${size}`,
    title: `Rate step, ${axis}, ${small ? 'small' : 'near full stick'}`,
    purpose: `How fast and how cleanly the ${axis} rate follows the stick when it jumps to ${small ? 'a fifth' : 'nine tenths'}.`,
    parameters: {
      stick: { value: small ? 0.2 : 0.9, least: 0.01, most: 1, meaning: 'stick deflection of the step' },
      hold_s: {
        value: small ? (yaw ? 1.6 : 0.8) : yaw ? 1.2 : 0.45,
        least: 0.1,
        most: 10,
        meaning: 'how long it is held',
      },
    },
    scores: [
      ...stepScoreSet(
        axis,
        ({ parameters: p, gains }) => ({
          start_s: START_S,
          end_s: START_S + p.hold_s,
          size_dps: p.stick * gains.maxRate_dps[axis],
        }),
        {
          rise_s: yaw ? 0.5 : 0.1,
          overshoot_pct: 25,
          settle_s: yaw ? 1.2 : 0.4,
          steady_pct: yaw ? 8 : 5,
        },
      ),
      saturation(small ? 1 : 60),
    ],
    traceSignals: [`sp_${axis}_dps`, `rate_${axis}_dps`, `u_${axis}_us`],
    duration_s: ({ hold_s }) => START_S + hold_s + 0.4,
    start: () => ({ kind: 'free-air', height_m: 60 }),
    wind: () => CALM,
    scored: window,
    sticks: (time_s, sticks, flight, p) => {
      sticks.throttle = hoverThrottle(flight);
      sticks[axis] = time_s >= START_S && time_s < START_S + p.hold_s ? p.stick : 0;
    },
  });
}
