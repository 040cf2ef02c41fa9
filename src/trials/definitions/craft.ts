/** The craft itself: noise floor, throttle, battery, payload, faults, recovery. */
import { CALM } from '../../craft/wind.ts';
import type { Fault } from '../../disturbance/faults.ts';
import {
  energy_kJ_per_min,
  motorActivity_us,
  peakDrift_m,
  peakHeightError_m,
  peakTilt_deg,
  rateError_dps,
  rms,
  rowsBetween,
  saturation_pct,
  windingHeat_W,
} from '../measures.ts';
import { COMMON, type ScoreDefinition, type Trial, type TrialRun } from '../trial.ts';
import { gustWind, turbulenceWind } from '../winds.ts';
import { hoverThrottle } from './hoverThrottle.ts';

const moored = (_time_s: number, _flight: unknown, sticks: { moored: boolean }): void => {
  sticks.moored = true;
};

export const hoverNoise: Trial = {
  name: 'hover-noise',
  title: 'Hover, noise floor',
  purpose: 'Still air: what the gyro’s noise and vibration do to motors, heat and rest.',
  duration_s: 6,
  start: { kind: 'hover', height_m: 8 },
  scores: [
    { name: 'motor activity', unit: 'µs rms', band: { most: 20 }, source: COMMON },
    { name: 'winding heat', unit: 'W', band: { most: 12 }, source: COMMON },
    { name: 'rms rate', unit: 'deg/s', band: { most: 1.5 }, source: COMMON },
    { name: 'energy', unit: 'kJ/min', band: { most: 60 }, source: COMMON },
    { name: 'saturation', unit: '%', band: { most: 0.1 }, source: COMMON },
  ],
  setup: ({ build, wind }) => ({ build, wind: wind ?? CALM, sticks: moored }),
  score: ({ record }) => {
    const [from, to] = rowsBetween(record, 1.5, 6);
    const rate = (axis: string) => rms(record.column(`rate_${axis}_dps`), from, to);
    return [
      motorActivity_us(record, from, to),
      windingHeat_W(record, from, to),
      Math.hypot(rate('roll'), rate('pitch'), rate('yaw')),
      energy_kJ_per_min(record, from, to),
      saturation_pct(record, from, to),
    ];
  },
};

/** Full up, then down to idle, then hover: attitude must not be lost at either end of the range. */
export const punchAndChop: Trial = {
  name: 'punch-and-chop',
  title: 'Throttle punch and chop',
  purpose: 'Full throttle for a second, idle for a second, then hover, self-levelling.',
  duration_s: 5,
  start: { kind: 'free-air', height_m: 80 },
  scores: [
    { name: 'peak tilt', unit: 'deg', band: { most: 20 }, source: COMMON },
    { name: 'left over', unit: 'deg/s', band: { most: 6 }, source: COMMON },
  ],
  setup: ({ build, wind }) => ({
    build,
    wind: wind ?? CALM,
    sticks: (time_s, flight, sticks) => {
      sticks.levelling = true;
      const hover = hoverThrottle(flight);
      sticks.throttle = time_s < 0.5 ? hover : time_s < 1.5 ? 1 : time_s < 2.5 ? 0.02 : hover;
    },
  }),
  score: ({ record }) => {
    const [from, to] = rowsBetween(record, 0.5, 5);
    const [late, last] = rowsBetween(record, 4, 5);
    return [peakTilt_deg(record, from, to), rateError_dps(record, late, last)];
  },
};

const heldScores = (tilt: number, drift: number): ScoreDefinition[] => [
  { name: 'peak tilt', unit: 'deg', band: { most: tilt }, source: COMMON },
  { name: 'peak drift', unit: 'm', band: { most: drift }, source: COMMON },
  { name: 'height error', unit: 'm', band: { most: 1.5 }, source: COMMON },
  { name: 'saturation', unit: '%', band: { most: 10 }, source: COMMON },
];

function heldValues({ record }: TrialRun, from_s: number, to_s: number): number[] {
  const [from, to] = rowsBetween(record, from_s, to_s);
  return [
    peakTilt_deg(record, from, to),
    peakDrift_m(record, from, to),
    peakHeightError_m(record, from, to),
    saturation_pct(record, from, to),
  ];
}

export const lowBattery: Trial = {
  name: 'low-battery',
  title: 'Low battery in a gust',
  purpose: 'The same 6 m/s gust with the pack at 10 %.',
  duration_s: 6,
  start: { kind: 'hover', height_m: 8 },
  scores: heldScores(28, 3),
  setup: ({ build, wind }) => ({
    build: { ...build, battery: { ...build.battery, charge: 0.1 } },
    wind: wind ?? gustWind(6, 0, 1.5, 0.6),
    sticks: moored,
  }),
  score: (run) => heldValues(run, 0.2, 6),
};

export const payloadDrop: Trial = {
  name: 'payload-drop',
  title: 'Payload drop',
  purpose: 'The payload is let go in hover; a craft without one is only held.',
  duration_s: 6,
  start: { kind: 'hover', height_m: 8 },
  scores: heldScores(15, 1.5),
  setup: ({ build, wind }) => ({
    build,
    wind: wind ?? CALM,
    sticks: moored,
    act: (time_s, flight) => {
      if (time_s >= 1.5 && !flight.payloadDropped) flight.dropPayload();
    },
  }),
  score: (run) => heldValues(run, 1.4, 6),
};

/** A trial of the craft with a fault, moored in a gust. */
function faulty(
  name: string,
  title: string,
  purpose: string,
  faults: (reach_m: number) => readonly Fault[],
  tilt = 30,
  drift = 3.5,
): Trial {
  return {
    name,
    title,
    purpose,
    duration_s: 6,
    start: { kind: 'hover', height_m: 8 },
    scores: heldScores(tilt, drift),
    setup: ({ build, wind }) => ({
      build,
      wind: wind ?? gustWind(6, 0, 2, 0.6),
      faults: faults(
        Math.max(...build.rotors.map((rotor) => Math.hypot(rotor.position_m[0], rotor.position_m[1]))),
      ),
      sticks: moored,
    }),
    score: (run) => heldValues(run, 0.2, 6),
  };
}

export const shiftedCentre = faulty(
  'shifted-centre',
  'Shifted centre of mass',
  'Centre of mass 10 % of the reach forward and to the right, in a gust.',
  (reach) => [{ kind: 'shifted-payload', shift_m: [0.07 * reach, 0.07 * reach, 0] }],
);
export const weakMotor = faulty(
  'weak-motor',
  'One weak motor',
  'The front left rotor gives 80 % of its thrust, in a gust.',
  () => [{ kind: 'weak-motor', corner: 'FL', share: 0.8 }],
);
export const chippedPropeller = faulty(
  'chipped-propeller',
  'Chipped propeller',
  'The rear right propeller gives 90 % and vibrates six times as much, in a gust.',
  () => [{ kind: 'chipped-propeller', corner: 'RR', share: 0.9, imbalance: 6 }],
);
export const lateLoop = faulty(
  'loop-jitter',
  'Late and jittering loop',
  'Commands up to half a tick late at random, 2 % of ticks missed, in a gust.',
  () => [{ kind: 'late-loop', delay_s: 0, jitter_s: 0.00125, missedTickShare: 0.02 }],
);

export const coldStart: Trial = {
  name: 'cold-start',
  title: 'Start from the ground in wind',
  purpose: 'From the legs in 6 m/s of gusty wind to two metres by height hold, self-levelling.',
  duration_s: 6,
  start: { kind: 'ground' },
  scores: [
    { name: 'peak tilt', unit: 'deg', band: { most: 30 }, source: COMMON },
    { name: 'height at end', unit: 'm', band: { least: 1.2 }, source: COMMON },
    { name: 'rms rate error', unit: 'deg/s', band: { most: 40 }, source: COMMON },
  ],
  setup: ({ build, wind }) => ({
    build,
    wind: wind ?? turbulenceWind('light', 0.8),
    sticks: (time_s, _flight, sticks) => {
      sticks.armed = time_s > 0.3;
      sticks.levelling = true;
      sticks.heightHold = true;
      sticks.throttle = time_s > 0.8 && time_s < 3 ? 1 : 0.5;
    },
  }),
  score: ({ record }) => {
    const [from, to] = rowsBetween(record, 0.3, 6);
    const down = record.column('down_m');
    return [peakTilt_deg(record, from, to), -down[down.length - 1], rateError_dps(record, from, to)];
  },
};

export const invertedRecovery: Trial = {
  name: 'inverted-recovery',
  title: 'Recovery from inverted',
  purpose: 'Let go upside down at 60 m with self-levelling: time and height until level.',
  duration_s: 5,
  start: { kind: 'free-air', height_m: 60, roll_deg: 175 },
  scores: [
    { name: 'time to level', unit: 's', band: { most: 2 }, source: COMMON },
    { name: 'height lost', unit: 'm', band: { most: 20 }, source: COMMON },
  ],
  setup: ({ build, wind }) => ({
    build,
    wind: wind ?? CALM,
    sticks: (_time_s, _flight, sticks) => {
      sticks.levelling = true;
      sticks.heightHold = true;
      sticks.throttle = 0.5;
    },
  }),
  score: ({ record }) => {
    const t = record.column('t_s');
    const x = record.column('qx');
    const y = record.column('qy');
    const down = record.column('down_m');
    let last = 0;
    let lowest = -Infinity;
    for (let k = 0; k < t.length; k++) {
      const tilt = Math.acos(Math.max(-1, Math.min(1, 1 - 2 * (x[k] ** 2 + y[k] ** 2))));
      if (tilt > 0.26) last = k;
      lowest = Math.max(lowest, down[k]);
    }
    return [last === t.length - 1 ? NaN : t[last], lowest - down[0]];
  },
};
