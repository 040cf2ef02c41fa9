/**
 * Starting gains: the most gust rejection that the limits leave. For a range of plant gain (mass, voltage and
 * thrust are known only so well) the integral gain is maximised (Åström & Hägglund: for a load disturbance the
 * integrated error is 1/k_i) subject to maximum sensitivity, phase and delay margin and noise at the motors.
 * Published rules stand beside it for comparison.
 */
import { AXES, type AxisName, type Gains } from '../craft/gains.ts';
import { magnitude } from './complex.ts';
import type { ContinuousSystem, Plant } from './continuous.ts';
import { closedLoopPoles, noiseAtMotor } from './analysis.ts';
import { marginsOf } from './margins.ts';
import { openLoopAt, rateLoop, type RateLoop } from './rateLoop.ts';
import type { GyroNoise } from './report.ts';

export interface StartingLimits {
  /** Largest Ms; Åström & Hägglund give 1.4 to 2.0 for robust loops. */
  readonly maxSensitivity: number;
  readonly phaseMargin_deg: number;
  readonly delayMargin_ms: number;
  readonly noiseAtMotor_us_rms: number;
  /** The plant's gain may be off by this share either way. */
  readonly gainUncertainty: number;
  /** Largest p/i time share: the integral acts no faster than this many crossover periods. */
  readonly leastIntegralTime_crossovers: number;
}

export const STARTING_LIMITS: StartingLimits = {
  maxSensitivity: 1.6,
  phaseMargin_deg: 45,
  delayMargin_ms: 4,
  noiseAtMotor_us_rms: 4,
  gainUncertainty: 0.25,
  leastIntegralTime_crossovers: 6,
};

export interface AxisGainsFound {
  readonly p_us_per_dps: number;
  readonly i_us_per_deg: number;
  readonly d_us_per_dps2: number;
}

export interface StartingAxis extends AxisGainsFound {
  /** The limit that stops more gain, and what would loosen it. */
  readonly active: string;
  readonly loosenedBy: string;
}

interface AxisTask {
  readonly system: ContinuousSystem;
  readonly gains: Gains;
  readonly axis: AxisName;
  readonly noise: GyroNoise;
  readonly limits: StartingLimits;
}

type LimitName = 'maxSensitivity' | 'phaseMargin' | 'delayMargin' | 'noise';

const LOOSENED: Readonly<Record<LimitName, string>> = {
  maxSensitivity:
    'less delay in the loop: a faster loop, a higher D cutoff, or a propeller and motor with less lag',
  phaseMargin: 'less lag: a faster loop, a higher gyro and D cutoff, or a propeller and motor with less lag',
  delayMargin: 'less delay in the loop: a faster loop or a shorter compute delay',
  noise: 'a quieter gyro or mount, or a lower D cutoff',
};
const ACTIVE: Readonly<Record<LimitName, string>> = {
  maxSensitivity: 'maximum sensitivity',
  phaseMargin: 'phase margin',
  delayMargin: 'delay margin',
  noise: 'noise at the motors',
};

/** Each limit's use: above 1 it is broken. Unstable: Infinity. */
function usage(task: AxisTask, found: AxisGainsFound): Record<LimitName, number> {
  const { limits } = task;
  const used: Record<LimitName, number> = { maxSensitivity: 0, phaseMargin: 0, delayMargin: 0, noise: 0 };
  for (const scale of [1 - limits.gainUncertainty, 1, 1 + limits.gainUncertainty]) {
    const loop = loopWith(task, found, scale);
    const nyquist = Math.PI / loop.tick_s;
    if (closedLoopPoles(loop).some((pole) => Math.hypot(pole.re, pole.im) >= 1 - 1e-7)) {
      return { maxSensitivity: Infinity, phaseMargin: Infinity, delayMargin: Infinity, noise: Infinity };
    }
    const margins = marginsOf({
      at: (w) => openLoopAt(loop, w),
      low: nyquist * 2e-4,
      high: nyquist,
      sampled: true,
      coarse: true,
    });
    used.maxSensitivity = Math.max(
      used.maxSensitivity,
      (margins.maxSensitivity - 1) / (limits.maxSensitivity - 1),
    );
    used.phaseMargin = Math.max(
      used.phaseMargin,
      limits.phaseMargin_deg / Math.max(1e-6, margins.phaseMargin_deg ?? 180),
    );
    used.delayMargin = Math.max(
      used.delayMargin,
      limits.delayMargin_ms / Math.max(1e-6, margins.delayMargin_ms ?? 1e6),
    );
  }
  const noise = noiseAtMotor(loopWith(task, found, 1), task.noise.sigma_dps, task.noise.correlation);
  used.noise = noise === null ? Infinity : noise / limits.noiseAtMotor_us_rms;
  return used;
}

function loopWith(task: AxisTask, found: AxisGainsFound, plantScale: number): RateLoop {
  const { gains, axis, system } = task;
  const own = { ...gains.axes[axis], ...found };
  const scaledSystem = plantScale === 1 ? system : { ...system, B: system.B.clone().mul(plantScale) };
  return rateLoop(scaledSystem, { ...gains, axes: { ...gains.axes, [axis]: own } }, axis);
}

/** Crossover of the plant times a gain of one, to start the search at the right scale. */
function startOf(task: AxisTask): AxisGainsFound {
  const loop = loopWith(task, { p_us_per_dps: 1, i_us_per_deg: 0, d_us_per_dps2: 0 }, 1);
  const omega = Math.min(20, 0.2 / loop.tick_s);
  const p = 1 / Math.max(1e-12, magnitude(openLoopAt(loop, omega)));
  return { p_us_per_dps: p, i_us_per_deg: (p * omega) / 8, d_us_per_dps2: 0 };
}

/**
 * Pattern search over log p, the ratio d/p (a time) and the ratio i/p (a rate), from the plant's own scale.
 * @throws RangeError when no gain at all is within the limits.
 */
export function startingAxis(task: AxisTask): StartingAxis {
  const first = startOf(task);
  const p0 = first.p_us_per_dps;
  let x = [Math.log(p0), 0.004, Math.log(first.i_us_per_deg / p0)];
  const gainsOf = (v: readonly number[]): AxisGainsFound => {
    const p = Math.exp(v[0]);
    return { p_us_per_dps: p, i_us_per_deg: p * Math.exp(v[2]), d_us_per_dps2: p * Math.max(0, v[1]) };
  };
  const score = (v: readonly number[]): number => {
    const found = gainsOf(v);
    const used = Math.max(...Object.values(usage(task, found)));
    const loop = loopWith(task, found, 1);
    const crossover = crossoverOf(loop);
    const tooFast = (Math.exp(v[2]) * task.limits.leastIntegralTime_crossovers) / Math.max(1e-9, crossover);
    if (!Number.isFinite(used)) return -1e9 - v[0];
    const broken = Math.max(0, used - 1) + Math.max(0, tooFast - 1);
    return broken > 0 ? -1e3 * broken : Math.log(found.i_us_per_deg) + 0.3 * v[0];
  };
  let best = score(x);
  let steps = [0.5, 0.006, 0.6];
  for (let round = 0; round < 70 && Math.max(steps[0], steps[2]) > 0.004; round++) {
    let improved = false;
    for (let k = 0; k < 3; k++) {
      for (const sign of [1, -1]) {
        const next = x.slice();
        next[k] += sign * steps[k];
        if (next[1] < 0) next[1] = 0;
        const value = score(next);
        if (value > best) {
          best = value;
          x = next;
          improved = true;
        }
      }
    }
    // Along the ridge: more of everything at once.
    for (const sign of [1, -1]) {
      const next = [x[0] + sign * steps[0], x[1] + sign * steps[1] * 0.5, x[2] + sign * steps[2] * 0.5].map(
        (v, k) => (k === 1 ? Math.max(0, v) : v),
      );
      const value = score(next);
      if (value > best) {
        best = value;
        x = next;
        improved = true;
      }
    }
    if (!improved) steps = steps.map((step) => step / 2);
  }
  if (best < 0 && best <= -1) {
    throw new RangeError(
      `no gains for ${task.axis} keep all limits; the loop is too slow or too noisy for this craft`,
    );
  }
  const found = rounded(gainsOf(x));
  const used = usage(task, found);
  const active = (Object.keys(used) as LimitName[]).reduce((a, b) => (used[b] > used[a] ? b : a));
  return { ...found, active: ACTIVE[active], loosenedBy: LOOSENED[active] };
}

function crossoverOf(loop: RateLoop): number {
  const nyquist = Math.PI / loop.tick_s;
  let omega = nyquist * 1e-3;
  let last = omega;
  for (let k = 0; k < 160; k++) {
    if (magnitude(openLoopAt(loop, omega)) > 1) last = omega;
    omega = nyquist * 1e-3 * 1000 ** ((k + 1) / 160);
  }
  return last;
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
