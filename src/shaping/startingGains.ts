/**
 * Starting gains: the most gust rejection that the limits leave. For a range of plant gain (mass, voltage and
 * thrust are known only so well) the integral gain is maximised (Åström & Hägglund: for a load disturbance the
 * integrated error is 1/k_i) subject to maximum sensitivity, phase and delay margin and noise at the motors.
 * Published rules stand beside it for comparison.
 */
import { AXES, type AxisName, type Gains } from '../craft/gains.ts';
import { magnitude } from './complex.ts';
import type { ContinuousSystem, Plant } from './continuous.ts';
import { marginsOf } from './margins.ts';
import { noiseAtMotor, type GyroNoise } from './noise.ts';
import { closedLoopPoles } from './poles.ts';
import { openLoopAt, rateLoop, withGainsOf, type RateLoop } from './rateLoop.ts';

/** How far off the build may be; shares of the value, either way. */
export interface Uncertainty {
  /** Of mass and with it of inertia. */
  readonly mass: number;
  readonly voltage: number;
  readonly thrust: number;
}

export interface StartingLimits {
  /** Largest Ms; Åström & Hägglund give 1.4 to 2.0 for robust loops. */
  readonly maxSensitivity: number;
  readonly phaseMargin_deg: number;
  readonly delayMargin_ms: number;
  readonly noiseAtMotor_us_rms: number;
  readonly uncertainty: Uncertainty;
  /** The integral's time p/i is at least this many times 1/crossover: else the setpoint is overshot for long. */
  readonly leastIntegralTime_crossovers: number;
}

export const STARTING_LIMITS: StartingLimits = {
  maxSensitivity: 1.6,
  phaseMargin_deg: 45,
  delayMargin_ms: 4,
  noiseAtMotor_us_rms: 4,
  uncertainty: { mass: 0.05, voltage: 0.1, thrust: 0.1 },
  leastIntegralTime_crossovers: 6,
};

/** Lowest and highest plant gain over the nominal one: thrust and voltage raise it, inertia lowers it. */
export function plantGainRange(uncertainty: Uncertainty): readonly [number, number] {
  const { mass, voltage, thrust } = uncertainty;
  return [((1 - voltage) * (1 - thrust)) / (1 + mass), ((1 + voltage) * (1 + thrust)) / (1 - mass)];
}

export interface AxisGainsFound {
  readonly p_us_per_dps: number;
  readonly i_us_per_deg: number;
  readonly d_us_per_dps2: number;
}

export interface StartingAxis extends AxisGainsFound {
  /** The limit that stops more gain, and what would loosen it. */
  readonly active: string;
  readonly loosenedBy: string;
  /** Each limit's use, 1 = all of it. */
  readonly used: Readonly<Record<LimitName, number>>;
}

interface AxisTask {
  readonly system: ContinuousSystem;
  readonly gains: Gains;
  readonly axis: AxisName;
  readonly noise: GyroNoise;
  readonly limits: StartingLimits;
}

export type LimitName = 'maxSensitivity' | 'phaseMargin' | 'delayMargin' | 'noise' | 'integralTime';

const LOOSENED: Readonly<Record<LimitName, string>> = {
  maxSensitivity:
    'less delay in the loop: a faster loop, a higher D cutoff, or a propeller and motor with less lag',
  phaseMargin: 'less lag: a faster loop, a higher gyro and D cutoff, or a propeller and motor with less lag',
  delayMargin: 'less delay in the loop: a faster loop or a shorter compute delay',
  noise: 'a quieter gyro or mount, or a lower D cutoff',
  integralTime: 'a higher crossover: less delay and lag, so that P can rise',
};
const ACTIVE: Readonly<Record<LimitName, string>> = {
  maxSensitivity: 'maximum sensitivity',
  phaseMargin: 'phase margin',
  delayMargin: 'delay margin',
  noise: 'noise at the motors',
  integralTime: 'integral time against crossover',
};

const UNSTABLE: Readonly<Record<LimitName, number>> = {
  maxSensitivity: Infinity,
  phaseMargin: Infinity,
  delayMargin: Infinity,
  noise: Infinity,
  integralTime: Infinity,
};

/** The loops of a task at the lowest, nominal and highest plant gain; gains are put in for each trial. */
class Candidates {
  private readonly loops: readonly RateLoop[];

  constructor(private readonly task: AxisTask) {
    const [low, high] = plantGainRange(task.limits.uncertainty);
    this.loops = [1, low, high].map((scale) => {
      const { system, gains, axis } = task;
      const scaledSystem = scale === 1 ? system : { ...system, B: system.B.clone().mul(scale) };
      return rateLoop(scaledSystem, gains, axis);
    });
  }

  at(found: AxisGainsFound): RateLoop {
    return withGainsOf(this.loops[0], found);
  }

  /** Each limit's use: above 1 it is broken. Unstable: Infinity. */
  usage(found: AxisGainsFound): Record<LimitName, number> {
    const { limits } = this.task;
    const used = { maxSensitivity: 0, phaseMargin: 0, delayMargin: 0, noise: 0, integralTime: 0 };
    for (const base of this.loops) {
      const loop = withGainsOf(base, found);
      if (!closedLoopPoles(loop).stable) return { ...UNSTABLE };
      const nyquist = Math.PI / loop.tick_s;
      const margins = marginsOf({
        at: (w) => openLoopAt(loop, w),
        low: nyquist * 2e-4,
        high: nyquist,
        sampled: true,
        coarse: true,
      });
      const raise = (name: LimitName, share: number) => (used[name] = Math.max(used[name], share));
      raise('maxSensitivity', (margins.maxSensitivity - 1) / (limits.maxSensitivity - 1));
      raise('phaseMargin', limits.phaseMargin_deg / Math.max(1e-6, margins.phaseMargin_deg ?? 180));
      raise('delayMargin', limits.delayMargin_ms / Math.max(1e-6, margins.delayMargin_ms ?? 1e6));
    }
    const loop = this.at(found);
    const noise = noiseAtMotor(loop, this.task.noise);
    used.noise = noise === null ? Infinity : noise / limits.noiseAtMotor_us_rms;
    const integralRate = found.i_us_per_deg / found.p_us_per_dps;
    used.integralTime = (integralRate * limits.leastIntegralTime_crossovers) / lastCrossover(loop);
    return used;
  }
}

/** Place in the search: log p, the ratio d/p (a time, s) and log of the ratio i/p (a rate, 1/s). */
type Place = readonly [number, number, number];

function gainsAt([logP, derivative_s, logRate]: Place): AxisGainsFound {
  const p = Math.exp(logP);
  return {
    p_us_per_dps: p,
    i_us_per_deg: p * Math.exp(logRate),
    d_us_per_dps2: p * Math.max(0, derivative_s),
  };
}

/** Crossover of the plant with P alone at a modest bandwidth: the search starts at the plant's own scale. */
function firstPlace(candidates: Candidates): Place {
  const loop = candidates.at({ p_us_per_dps: 1, i_us_per_deg: 0, d_us_per_dps2: 0 });
  const omega = Math.min(20, 0.2 / loop.tick_s);
  const p = 1 / Math.max(1e-12, magnitude(openLoopAt(loop, omega)));
  return [Math.log(p), 0.004, Math.log(omega / 8)];
}

const MOST_ROUNDS = 70;
const FIRST_STEPS: Place = [0.5, 0.006, 0.6];
const FINEST_STEP = 0.004;
/** Moves a round tries: each coordinate by itself, and more or less of everything along the ridge. */
const MOVES: readonly Place[] = [
  [1, 0, 0],
  [-1, 0, 0],
  [0, 1, 0],
  [0, -1, 0],
  [0, 0, 1],
  [0, 0, -1],
  [1, 0.5, 0.5],
  [-1, -0.5, -0.5],
];

/**
 * Pattern search from the plant's own scale.
 * @throws RangeError when no gain at all is within the limits.
 */
export function startingAxis(task: AxisTask): StartingAxis {
  const candidates = new Candidates(task);
  const score = (place: Place): number => {
    const found = gainsAt(place);
    const used = Math.max(...Object.values(candidates.usage(found)));
    if (!Number.isFinite(used)) return -1e9 - place[0];
    return used > 1 ? -1e3 * (used - 1) : Math.log(found.i_us_per_deg) + 0.3 * place[0];
  };
  let place = firstPlace(candidates);
  let best = score(place);
  let steps = FIRST_STEPS;
  for (let round = 0; round < MOST_ROUNDS && Math.max(steps[0], steps[2]) > FINEST_STEP; round++) {
    let improved = false;
    for (const move of MOVES) {
      const next: Place = [
        place[0] + move[0] * steps[0],
        Math.max(0, place[1] + move[1] * steps[1]),
        place[2] + move[2] * steps[2],
      ];
      const value = score(next);
      if (value > best) {
        best = value;
        place = next;
        improved = true;
      }
    }
    if (!improved) steps = [steps[0] / 2, steps[1] / 2, steps[2] / 2];
  }
  if (best <= -1) {
    throw new RangeError(
      `no gains for ${task.axis} keep all limits; the loop is too slow or too noisy for this craft`,
    );
  }
  const found = rounded(gainsAt(place));
  const used = candidates.usage(found);
  const active = (Object.keys(used) as LimitName[]).reduce((a, b) => (used[b] > used[a] ? b : a));
  return { ...found, used, active: ACTIVE[active], loosenedBy: LOOSENED[active] };
}

/** Highest frequency at which the loop gain still falls through 1, rad/s. */
function lastCrossover(loop: RateLoop): number {
  const nyquist = Math.PI / loop.tick_s;
  const at = (share: number) => nyquist * 1e-3 ** (1 - share);
  for (let k = 160; k > 0; k--) {
    if (magnitude(openLoopAt(loop, at((k - 1) / 160))) > 1) return at((k - 1) / 160);
  }
  return at(0);
}

/** Three significant digits, downward: what a person would type. */
function rounded(found: AxisGainsFound): AxisGainsFound {
  const down = (value: number) => {
    if (value <= 0) return 0;
    const unit = 10 ** (Math.floor(Math.log10(value)) - 2);
    return Number((Math.floor(value / unit) * unit).toPrecision(3));
  };
  return {
    p_us_per_dps: down(found.p_us_per_dps),
    i_us_per_deg: down(found.i_us_per_deg),
    d_us_per_dps2: down(found.d_us_per_dps2),
  };
}

export interface StartingSet {
  readonly gains: Gains;
  readonly axes: Readonly<Record<AxisName, StartingAxis>>;
}

/** Starting gains for all axes; everything but p, i and d is kept from `gains`. */
export function startingGains(
  systems: Readonly<Record<AxisName, ContinuousSystem>>,
  gains: Gains,
  noise: GyroNoise,
  limits: StartingLimits = STARTING_LIMITS,
): StartingSet {
  const axes = Object.fromEntries(
    AXES.map((axis) => [axis, startingAxis({ system: systems[axis], gains, axis, noise, limits })]),
  ) as Record<AxisName, StartingAxis>;
  const own = (axis: AxisName) => {
    const { p_us_per_dps, i_us_per_deg, d_us_per_dps2 } = axes[axis];
    return { ...gains.axes[axis], p_us_per_dps, i_us_per_deg, d_us_per_dps2 };
  };
  return {
    axes,
    gains: {
      ...gains,
      name: 'Starting gains',
      axes: { roll: own('roll'), pitch: own('pitch'), yaw: own('yaw') },
    },
  };
}

// --- Published rules, for comparison ----------------------------------------------------------------------

/**
 * SIMC for an integrating plant with lag, k' e^(−θs)/(s(τ₂s+1)) (Skogestad 2003, table 1): series form
 * K_c = 1/(k'(τ_c+θ)), τ_I = 4(τ_c+θ), τ_D = τ₂, τ_c = θ for tight control; given here in the parallel form of
 * this program. θ is the plant's delay plus half a tick of the hold.
 */
export function simcGains(plant: Plant, tick_s: number, extraDelay_s: number): AxisGainsFound {
  const theta = plant.delay_s + extraDelay_s + tick_s / 2;
  const tauC = theta;
  const Kc = 1 / (plant.gain_dps2_per_us * (tauC + theta));
  const tauI = 4 * (tauC + theta);
  const tauD = plant.lag_s;
  const series = 1 + tauD / tauI;
  return { p_us_per_dps: Kc * series, i_us_per_deg: Kc / tauI, d_us_per_dps2: Kc * tauD };
}

/**
 * Approximate M-constrained integral gain optimisation (AMIGO) for an integrating plant, Åström & Hägglund,
 * Advanced PID Control (2006), eq. 7.7: K = 0.45/(K_v L), T_i = 8L, T_d = 0.5L; the lag counts as delay.
 */
export function amigoGains(plant: Plant, tick_s: number, extraDelay_s: number): AxisGainsFound {
  const L = plant.delay_s + extraDelay_s + tick_s / 2 + plant.lag_s;
  const K = 0.45 / (plant.gain_dps2_per_us * L);
  return { p_us_per_dps: K, i_us_per_deg: K / (8 * L), d_us_per_dps2: K * 0.5 * L };
}
