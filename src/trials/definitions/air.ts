/** Gusts, turbulence and the bridge's wake, moored: what the air does to attitude and place. */
import { parseScene } from '../../craft/scene.ts';
import {
  motorActivity_us,
  peakDrift_m,
  peakHeightError_m,
  peakTilt_deg,
  rateError_dps,
  rowsBetween,
  saturation_pct,
} from '../measures.ts';
import { COMMON, type ScoreDefinition, type Trial } from '../trial.ts';
import { gustWind, TURBULENCE_LEVELS_MPS, turbulenceWind, type TurbulenceLevel } from '../winds.ts';

const GUST_MPS = 6;
const SIDES = { front: 0, right: 90, rear: 180, left: 270 } as const;
export type Side = keyof typeof SIDES;
export const GUST_SIDES = Object.keys(SIDES) as readonly Side[];

const airScores = (tilt: number, drift: number): ScoreDefinition[] => [
  { name: 'peak tilt', unit: 'deg', band: { most: tilt }, source: COMMON },
  { name: 'peak drift', unit: 'm', band: { most: drift }, source: COMMON },
  { name: 'height error', unit: 'm', band: { most: 1.5 }, source: COMMON },
  { name: 'rms rate error', unit: 'deg/s', band: { most: 25 }, source: COMMON },
  { name: 'saturation', unit: '%', band: { most: 5 }, source: COMMON },
];

/** 1−cos gust from one side while moored; the craft's nose points north. */
export function gust(side: Side): Trial {
  return {
    name: `gust-${side}`,
    title: `Gust from the ${side}`,
    purpose: `A 1−cos gust of ${GUST_MPS} m/s, up in 0.6 s and down again, from the ${side}.`,
    duration_s: 6,
    start: { kind: 'hover', height_m: 8 },
    scores: airScores(25, 2.5),
    setup: ({ build, wind }) => ({
      build,
      wind: wind ?? gustWind(GUST_MPS, SIDES[side], 1, 0.6),
      sticks: (_time_s, _flight, sticks) => {
        sticks.moored = true;
      },
    }),
    score: ({ record }) => airValues(record, 0.9, 6),
  };
}

/** MIL-F-8785C level; `scale` below 1 is for small craft and says so in the title. */
export function turbulence(level: TurbulenceLevel, scale = 1): Trial {
  const name = scale === 1 ? `turbulence-${level}` : `turbulence-${level}-scaled`;
  const hard = { light: [22, 4], moderate: [32, 8], severe: [40, 15] }[level];
  return {
    name,
    title: scale === 1 ? `Turbulence, ${level}` : `Turbulence, ${level}, scaled × ${scale} for small craft`,
    purpose: `Twelve seconds of MIL-F-8785C ${level} turbulence, wind at 20 ft ${(TURBULENCE_LEVELS_MPS[level] * scale).toFixed(1)} m/s.`,
    duration_s: 12,
    start: { kind: 'hover', height_m: 8 },
    scores: airScores(hard[0] * Math.max(scale, 0.7), hard[1]),
    setup: ({ build, wind }) => ({
      build,
      wind: wind ?? turbulenceWind(level, scale),
      sticks: (_time_s, _flight, sticks) => {
        sticks.moored = true;
      },
    }),
    score: ({ record }) => airValues(record, 4, 12),
  };
}

function airValues(record: Parameters<typeof rowsBetween>[0], from_s: number, to_s: number): number[] {
  const [from, to] = rowsBetween(record, from_s, to_s);
  return [
    peakTilt_deg(record, from, to),
    peakDrift_m(record, from, to),
    peakHeightError_m(record, from, to),
    rateError_dps(record, from, to),
    saturation_pct(record, from, to),
  ];
}

/** A pier 3 m by 9 m across the wind, and the craft flown through the edge of its wake. */
const PIER = parseScene({
  format: 'gustbench.scene/1',
  name: 'trial-pier',
  title: 'One pier across the wind',
  note: 'Invented for the trial.',
  elevation_m: 0,
  ground: { tone: 'grass' },
  solids: [
    {
      name: 'pier',
      centre_m: [0, 0, -10],
      size_m: [9, 3, 20],
      look: 'pier',
      wake: { deficit: 0.6, turbulence_share: 0.3, length_m: 50 },
    },
  ],
  start: { position_m: [-14, 12, 0] },
  pilot_m: [-20, 12, -1.7],
  wind: { format: 'gustbench.wind/1', mean_mps: 8, from_deg: 270 },
});

/** Flies north through the wake's two edges at about 4 m/s by held tilt. */
export const wakeCrossing: Trial = {
  name: 'wake-crossing',
  title: 'Crossing a pier’s wake',
  purpose: 'In 8 m/s of wind, across the sheltered lane behind a pier and out again.',
  duration_s: 9,
  start: { kind: 'hover', height_m: 8 },
  scores: [
    { name: 'peak tilt', unit: 'deg', band: { most: 35 }, source: COMMON },
    { name: 'height error', unit: 'm', band: { most: 2 }, source: COMMON },
    { name: 'rms rate error', unit: 'deg/s', band: { most: 25 }, source: COMMON },
    { name: 'saturation', unit: '%', band: { most: 5 }, source: COMMON },
  ],
  setup: ({ build, wind }) => ({
    build,
    scene: PIER,
    wind: wind ?? PIER.wind,
    sticks: (time_s, _flight, sticks) => {
      sticks.levelling = true;
      sticks.heightHold = true;
      sticks.throttle = 0.5;
      sticks.pitch = time_s > 1 && time_s < 7 ? -0.3 : 0;
      // Leans into the wind so as not to be carried along.
      sticks.roll = -0.28;
    },
  }),
  score: ({ record }) => {
    const [from, to] = rowsBetween(record, 1, 9);
    return [
      peakTilt_deg(record, from, to),
      peakHeightError_m(record, from, to),
      rateError_dps(record, from, to),
      saturation_pct(record, from, to),
    ];
  },
};

/** Hover in some turbulence, then one gust: the two layers of the derivative-gain and cutoff map in one flight. */
export const gustAndNoise: Trial = {
  name: 'gust-and-noise',
  title: 'Noise at the motors, then a gust',
  purpose:
    'Self-levelled in half of moderate turbulence: noise at the motors, then a 6 m/s gust from the front.',
  duration_s: 8,
  start: { kind: 'hover', height_m: 8 },
  scores: [
    { name: 'gust excursion', unit: 'deg/s rms', band: { most: 4 }, source: COMMON },
    { name: 'motor activity', unit: 'µs rms', band: { most: 20 }, source: COMMON },
    { name: 'peak tilt', unit: 'deg', band: { most: 10 }, source: COMMON },
  ],
  setup: ({ build, wind }) => ({
    build,
    wind: wind ?? { ...turbulenceWind('moderate', 0.5), gusts: gustWind(GUST_MPS, 0, 3, 0.3).gusts },
    // Self-levelling alone: what tilts is the gust's doing, not a mooring's leaning into it.
    sticks: (_time_s, _flight, sticks) => {
      sticks.levelling = true;
      sticks.heightHold = true;
      sticks.throttle = 0.5;
    },
  }),
  score: ({ record }) => {
    const [quiet, noisy] = rowsBetween(record, 0.6, 2.8);
    const [from, to] = rowsBetween(record, 2.9, 8);
    return [
      rateError_dps(record, from, to),
      motorActivity_us(record, quiet, noisy),
      peakTilt_deg(record, from, to),
    ];
  },
};
