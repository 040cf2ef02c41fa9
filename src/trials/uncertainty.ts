/**
 * Spread over what is not known well: Latin hypercube samples of mass, inertia, thrust, voltage, delay and
 * noise; share of failures with Wilson's interval; the parameter that matters most by rank correlation.
 */
import { sampleRankCorrelation } from 'simple-statistics';
import { RandomStream } from '../math/random.ts';
import type { Subject } from './fieldPath.ts';

export interface Spread {
  readonly name: string;
  /** Standard uncertainty as a share of the value. */
  readonly share: number;
  readonly apply: (subject: Subject, factor: number) => Subject;
}

const inertia = (subject: Subject, factor: number): Subject => {
  const I = subject.build.airframe.inertia_kgm2;
  const scaled = {
    xx: I.xx * factor,
    yy: I.yy * factor,
    zz: I.zz * factor,
    xy: I.xy * factor,
    xz: I.xz * factor,
    yz: I.yz * factor,
  };
  return {
    ...subject,
    build: { ...subject.build, airframe: { ...subject.build.airframe, inertia_kgm2: scaled } },
  };
};

export const SPREADS: readonly Spread[] = [
  {
    name: 'mass',
    share: 0.03,
    apply: (s, f) => ({
      ...s,
      build: { ...s.build, airframe: { ...s.build.airframe, mass_kg: s.build.airframe.mass_kg * f } },
    }),
  },
  { name: 'inertia', share: 0.1, apply: inertia },
  {
    name: 'thrust',
    share: 0.07,
    apply: (s, f) => {
      const { propeller } = s.build;
      const staticTable = propeller.staticTable?.map((row) => ({ ...row, ct: row.ct * f, cp: row.cp * f }));
      return {
        ...s,
        build: {
          ...s.build,
          propeller: {
            ...propeller,
            thrustCoefficient: propeller.thrustCoefficient * f,
            powerCoefficient: propeller.powerCoefficient * f,
            ...(staticTable === undefined ? {} : { staticTable }),
          },
        },
      };
    },
  },
  {
    name: 'voltage',
    share: 0.25,
    apply: (s, f) => ({
      ...s,
      build: { ...s.build, battery: { ...s.build.battery, charge: Math.max(0.05, Math.min(1, 0.65 * f)) } },
    }),
  },
  {
    name: 'delay',
    share: 0.3,
    apply: (s, f) => ({
      ...s,
      gains: {
        ...s.gains,
        computeDelay_s: Math.max(0, Math.min(0.05, (s.gains.computeDelay_s + 0.0005) * f)),
      },
    }),
  },
  {
    name: 'noise',
    share: 0.3,
    apply: (s, f) => ({
      ...s,
      build: {
        ...s.build,
        gyro: { ...s.build.gyro, noise_dps_per_rtHz: s.build.gyro.noise_dps_per_rtHz * Math.max(0, f) },
      },
    }),
  },
];

/**
 * Latin hypercube (McKay, Beckman, Conover 1979): each of `count` equal slices of each parameter is drawn
 * once. Returns factors, normal about 1 with the spread's share, cut at three of them.
 */
export function latinHypercube(spreads: readonly Spread[], count: number, seed: number): Float64Array[] {
  return spreads.map((spread) => {
    const stream = new RandomStream(seed, `hypercube.${spread.name}`);
    const slices = Array.from({ length: count }, (_, i) => i);
    for (let i = count - 1; i > 0; i--) {
      const j = Math.floor(stream.uniform() * (i + 1));
      [slices[i], slices[j]] = [slices[j], slices[i]];
    }
    return Float64Array.from(slices, (slice) => {
      const z = normalQuantile((slice + stream.uniform()) / count);
      return 1 + spread.share * Math.max(-3, Math.min(3, z));
    });
  });
}

/** Inverse of the normal distribution by bisection on its series; enough digits for sampling. */
function normalQuantile(p: number): number {
  let low = -6;
  let high = 6;
  for (let k = 0; k < 50; k++) {
    const middle = (low + high) / 2;
    if (normalBelow(middle) < p) low = middle;
    else high = middle;
  }
  return (low + high) / 2;
}

/** Φ(x), Abramowitz & Stegun 26.2.17 (error below 7.5e-8). */
function normalBelow(x: number): number {
  const t = 1 / (1 + 0.2316419 * Math.abs(x));
  const tail =
    (Math.exp((-x * x) / 2) / Math.sqrt(2 * Math.PI)) *
    t *
    (0.31938153 + t * (-0.356563782 + t * (1.781477937 + t * (-1.821255978 + t * 1.330274429))));
  return x >= 0 ? 1 - tail : tail;
}

export interface Proportion {
  readonly share: number;
  readonly low: number;
  readonly high: number;
}

/** Wilson's score interval for `hits` of `count`, by default 95 % (Wilson 1927). */
export function wilsonInterval(hits: number, count: number, z = 1.959963984540054): Proportion {
  if (count === 0) return { share: 0, low: 0, high: 1 };
  const p = hits / count;
  const denominator = 1 + (z * z) / count;
  const centre = (p + (z * z) / (2 * count)) / denominator;
  const half = (z * Math.sqrt((p * (1 - p)) / count + (z * z) / (4 * count * count))) / denominator;
  return { share: p, low: Math.max(0, centre - half), high: Math.min(1, centre + half) };
}

/** Spearman's rank correlation of each parameter with a score, largest in size first. */
export function whatMatters(
  spreads: readonly Spread[],
  factors: readonly Float64Array[],
  values: readonly number[],
): { readonly name: string; readonly correlation: number }[] {
  return spreads
    .map((spread, i) => {
      const correlation =
        values.length < 3 ? 0 : sampleRankCorrelation(Array.from(factors[i]), values.slice());
      return { name: spread.name, correlation: Number.isFinite(correlation) ? correlation : 0 };
    })
    .sort((a, b) => Math.abs(b.correlation) - Math.abs(a.correlation));
}
