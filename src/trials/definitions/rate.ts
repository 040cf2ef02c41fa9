/** Rate steps and doublets, small and saturating, one axis at a time, in free air. */
import type { AxisName } from '../../craft/gains.ts';
import { CALM } from '../../craft/wind.ts';
import { axisStepScores, rateError_dps, rowsBetween, saturation_pct } from '../measures.ts';
import { COMMON, type Trial } from '../trial.ts';
import { hoverThrottle } from './hoverThrottle.ts';

const START_S = 0.5;
const SMALL = 0.2;
const LARGE = 0.9;

export function rateStep(axis: AxisName, size: 'small' | 'large'): Trial {
  const share = size === 'small' ? SMALL : LARGE;
  const hold_s = size === 'small' ? (axis === 'yaw' ? 1.6 : 0.8) : axis === 'yaw' ? 1.2 : 0.45;
  const slow = axis === 'yaw';
  return {
    name: `rate-step-${axis}-${size}`,
    title: `Rate step, ${axis}, ${size}`,
    purpose: `How fast and how cleanly ${axis} rate follows a step of ${share * 100} % stick.`,
    duration_s: START_S + hold_s + 0.4,
    start: { kind: 'free-air', height_m: 60 },
    scores: [
      { name: 'rise', unit: 's', band: { most: slow ? 0.6 : 0.15 }, source: COMMON },
      { name: 'overshoot', unit: '%', band: { most: size === 'small' ? 30 : 40 }, source: COMMON },
      { name: 'settling', unit: 's', band: { most: slow ? 1.5 : 0.6 }, source: COMMON },
      { name: 'steady error', unit: '%', band: { most: slow ? 12 : 8 }, source: COMMON },
      { name: 'saturation', unit: '%', band: { most: size === 'small' ? 1 : 60 }, source: COMMON },
    ],
    setup: ({ build, wind }) => ({
      build,
      wind: wind ?? CALM,
      sticks: (time_s, flight, sticks) => {
        sticks.throttle = hoverThrottle(flight);
        sticks[axis] = time_s >= START_S && time_s < START_S + hold_s ? share : 0;
      },
    }),
    score: ({ record, gains }) => {
      const step = axisStepScores(record, axis, START_S, START_S + hold_s, share * gains.maxRate_dps[axis]);
      const [from, to] = rowsBetween(record, START_S, START_S + hold_s);
      return [
        step.rise_s,
        step.overshoot_pct,
        step.settle_s,
        step.steadyError_pct,
        saturation_pct(record, from, to),
      ];
    },
  };
}

export function rateDoublet(axis: AxisName, size: 'small' | 'large'): Trial {
  const share = size === 'small' ? 0.25 : 0.85;
  const half_s = axis === 'yaw' ? 0.7 : 0.3;
  return {
    name: `doublet-${axis}-${size}`,
    title: `Doublet, ${axis}, ${size}`,
    purpose: `${axis} one way and the other: what is left when the stick is back in the middle.`,
    duration_s: START_S + 2 * half_s + 1.2,
    start: { kind: 'free-air', height_m: 60 },
    scores: [
      { name: 'rms rate error', unit: 'deg/s', band: { most: size === 'small' ? 30 : 120 }, source: COMMON },
      { name: 'left over', unit: 'deg/s', band: { most: size === 'small' ? 4 : 8 }, source: COMMON },
    ],
    setup: ({ build, wind }) => ({
      build,
      wind: wind ?? CALM,
      sticks: (time_s, flight, sticks) => {
        sticks.throttle = hoverThrottle(flight);
        const t = time_s - START_S;
        sticks[axis] = t < 0 ? 0 : t < half_s ? share : t < 2 * half_s ? -share : 0;
      },
    }),
    score: ({ record }) => {
      const end = START_S + 2 * half_s;
      const [from, to] = rowsBetween(record, START_S, end + 0.3);
      const [late, last] = rowsBetween(record, end + 0.7, end + 1.2);
      return [rateError_dps(record, from, to), rateError_dps(record, late, last)];
    },
  };
}
