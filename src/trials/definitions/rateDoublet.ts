/** Doublet of one axis in free air: one way, the other way, and what is left when the stick is back. */
import type { AxisName } from '../../craft/gains.ts';
import { CALM } from '../../craft/wind.ts';
import { leftOver, rmsRateError, saturation } from '../scores.ts';
import { defineTrial, type Trial } from '../trial.ts';
import { hoverThrottle } from './hoverThrottle.ts';

const START_S = 0.5;

export function rateDoublet(axis: AxisName, size: 'small' | 'large'): Trial {
  const small = size === 'small';
  const yaw = axis === 'yaw';
  return defineTrial({
    name: `doublet-${axis}-${size}`,
    title: `Doublet, ${axis}, ${small ? 'small' : 'near full stick'}`,
    purpose: `${axis} one way, then the other: how far the rate lags behind and what is left when the stick is back in the middle.`,
    parameters: {
      stick: { value: small ? 0.25 : 0.85, least: 0.01, most: 1, meaning: 'stick deflection' },
      half_s: { value: yaw ? 0.7 : 0.3, least: 0.05, most: 5, meaning: 'time on each side' },
    },
    scores: [
      rmsRateError(small ? 35 : 120),
      leftOver(small ? 3 : 5, ({ parameters: p }) => [
        START_S + 2 * p.half_s + 0.7,
        START_S + 2 * p.half_s + 1.2,
      ]),
      saturation(small ? 1 : 60),
    ],
    traceSignals: [`sp_${axis}_dps`, `rate_${axis}_dps`, `u_${axis}_us`],
    duration_s: ({ half_s }) => START_S + 2 * half_s + 1.2,
    start: () => ({ kind: 'free-air', height_m: 60 }),
    wind: () => CALM,
    scored: ({ half_s }) => [START_S, START_S + 2 * half_s + 0.3],
    sticks: (time_s, sticks, flight, p) => {
      sticks.throttle = hoverThrottle(flight);
      const t = time_s - START_S;
      sticks[axis] = t < 0 ? 0 : t < p.half_s ? p.stick : t < 2 * p.half_s ? -p.stick : 0;
    },
  });
}
