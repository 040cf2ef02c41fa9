/**
 * Starting gains: the most gust rejection that the limits leave. For a range of plant gain (mass, voltage and
 * thrust are known only so well) the integral gain is maximised (Åström & Hägglund: for a load disturbance the
 * integrated error is 1/k_i) subject to maximum sensitivity, phase and delay margin and noise at the motors.
 * Published rules stand beside it for comparison.
 */
import { AXES, type AxisName, type Gains } from '../craft/gains.ts';
import type { ContinuousSystem, Plant } from './continuous.ts';
import { GridLoop, type PidGains } from './gridLoop.ts';
import { LoopRun } from './loopRun.ts';
import type { GyroNoise } from './noise.ts';
import { closedLoopPoles } from './poles.ts';
import { rateLoop, withGainsOf, type RateLoop } from './rateLoop.ts';

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
  /** Of a rate step at the nominal plant gain, with the gains' own setpoint weight. */
  readonly overshoot_pct: number;
}

export const STARTING_LIMITS: StartingLimits = {
  maxSensitivity: 1.6,
  phaseMargin_deg: 45,
  delayMargin_ms: 4,
  noiseAtMotor_us_rms: 4,
  uncertainty: { mass: 0.05, voltage: 0.1, thrust: 0.1 },
  leastIntegralTime_crossovers: 6,
  overshoot_pct: 18,
};

/** Lowest and highest plant gain over the nominal one: thrust and voltage raise it, inertia lowers it. */
export function plantGainRange(uncertainty: Uncertainty): readonly [number, number] {
  const { mass, voltage, thrust } = uncertainty;
  return [((1 - voltage) * (1 - thrust)) / (1 + mass), ((1 + voltage) * (1 + thrust)) / (1 - mass)];
}

export type AxisGainsFound = PidGains;

export interface StartingAxis extends AxisGainsFound {
  /** The limits that stop more gain (the optimum often lies where two meet), and what would loosen them. */
  readonly active: string;
  readonly loosenedBy: string;
  /** Each limit's use, 1 = all of it. */
  readonly used: Readonly<Record<LimitName, number>>;
  /** What each change of the bench would make of the integral gain, %; the best first. */
  readonly loosening: readonly Loosening[];
}

export interface Loosening {
  readonly change: string;
  readonly gain_pct: number;
}

interface AxisTask {
  readonly system: ContinuousSystem;
  readonly gains: Gains;
  readonly axis: AxisName;
  readonly noise: GyroNoise;
  readonly limits: StartingLimits;
}

export type LimitName =
  'maxSensitivity' | 'phaseMargin' | 'delayMargin' | 'noise' | 'integralTime' | 'overshoot';

const LOOSENED: Readonly<Record<LimitName, string>> = {
  maxSensitivity:
    'less delay in the loop: a faster loop, a higher D cutoff, or a propeller and motor with less lag',
  phaseMargin: 'less lag: a faster loop, a higher gyro and D cutoff, or a propeller and motor with less lag',
  delayMargin: 'less delay in the loop: a faster loop or a shorter compute delay',
  noise: 'a quieter gyro or mount, or a lower D cutoff',
  integralTime: 'a higher crossover: less delay and lag, so that P can rise',
  overshoot: 'a setpoint weight below 1, or less delay and lag in the loop',
};
/** Limits used within this share of the most used one stop the gains together with it. */
const AS_ACTIVE = 0.01;
const ACTIVE: Readonly<Record<LimitName, string>> = {
  maxSensitivity: 'maximum sensitivity',
  phaseMargin: 'phase margin',
  delayMargin: 'delay margin',
  noise: 'noise at the motors',
  integralTime: 'integral time against crossover',
  overshoot: 'overshoot of a rate step',
};

/** The loops of a task at the lowest, nominal and highest plant gain; gains are put in for each trial. */
class Candidates {
  private readonly grid: GridLoop;
  private readonly loops: readonly RateLoop[];
  private readonly scales: readonly number[];

  constructor(private readonly task: AxisTask) {
    const { system, gains, axis, noise, limits } = task;
    this.scales = [1, ...plantGainRange(limits.uncertainty)];
    this.loops = this.scales.map((scale) =>
      rateLoop({ ...system, B: system.B.clone().mul(scale) }, gains, axis),
    );
    this.grid = new GridLoop(this.loops[0], noise);
  }

  /** Each limit's use: above 1 it is broken. The overshoot is only looked at when the others hold. */
  usage(found: AxisGainsFound): Record<LimitName, number> {
    const { limits } = this.task;
    const used = {
      maxSensitivity: 0,
      phaseMargin: 0,
      delayMargin: 0,
      noise: 0,
      integralTime: 0,
      overshoot: 0,
    };
    const raise = (name: LimitName, share: number) => (used[name] = Math.max(used[name], share));
    this.scales.forEach((scale, index) => {
      const margins = this.grid.margins(found, scale);
      raise('maxSensitivity', (margins.maxSensitivity - 1) / (limits.maxSensitivity - 1));
      raise('phaseMargin', limits.phaseMargin_deg / Math.max(1e-6, margins.phaseMargin_deg));
      raise('delayMargin', limits.delayMargin_ms / Math.max(1e-6, margins.delayMargin_ms));
      if (index > 0) return;
      raise('noise', margins.noise_us / limits.noiseAtMotor_us_rms);
      const integralRate = found.i_us_per_deg / found.p_us_per_dps;
      const least = limits.leastIntegralTime_crossovers / Math.max(1e-9, margins.lastCrossover_radps);
      raise('integralTime', integralRate * least);
    });
    if (Math.max(...Object.values(used)) <= 1) raise('overshoot', this.overshootUse(found));
    return used;
  }

  /** Stable at all plant gains, by the poles themselves. */
  stable(found: AxisGainsFound): boolean {
    return this.loops.every((loop) => closedLoopPoles(withGainsOf(loop, found)).stable);
  }

  private overshootUse(found: AxisGainsFound): number {
    const loop = withGainsOf(this.loops[0], found);
    const count = Math.min(MOST_STEP_TICKS, Math.ceil(STEP_S / loop.tick_s));
    const run = new LoopRun(loop);
    let peak = 0;
    for (let k = 0; k < count; k++) {
      run.tick(1, 0);
      peak = Math.max(peak, run.out.y);
    }
    return Math.max(0, peak - 1) / (this.task.limits.overshoot_pct / 100);
  }

  /** Where the search starts: P alone at a modest bandwidth, by the plant's own scale. */
  firstPlace(): Place {
    const omega = Math.min(20, 0.2 / this.loops[0].tick_s);
    return [Math.log(this.grid.gainForCrossover(omega)), 0.004, Math.log(omega / 8)];
  }
}

/** How long a step is watched for its overshoot. */
const STEP_S = 0.6;
const MOST_STEP_TICKS = 2400;

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

const MOST_ROUNDS = 90;
const FIRST_STEPS: Place = [0.5, 0.006, 0.6];
const FINEST_STEP = 0.002;
/** Moves a round tries: each coordinate by itself, and pairs along the ridges between limits. */
const MOVES: readonly Place[] = [
  [1, 0, 0],
  [-1, 0, 0],
  [0, 1, 0],
  [0, -1, 0],
  [0, 0, 1],
  [0, 0, -1],
  [1, 0.5, 0.5],
  [-1, -0.5, -0.5],
  [1, 0, -1],
  [-1, 0, 1],
  [0, 1, 1],
  [0, -1, -1],
];

interface Found {
  readonly gains: AxisGainsFound;
  readonly candidates: Candidates;
}

/** Pattern search from the plant's own scale; null when no gain at all is within the limits. */
function search(task: AxisTask): Found | null {
  const candidates = new Candidates(task);
  const score = (place: Place, toBeat: number): number => {
    const found = gainsAt(place);
    const used = Math.max(...Object.values(candidates.usage(found)));
    if (used > 1) return -1e3 * (used - 1);
    const value = Math.log(found.i_us_per_deg) + 0.3 * place[0];
    // The poles are only asked where it would be an improvement: a small Ms alone does not prove stability.
    return value <= toBeat || candidates.stable(found) ? value : -1e6;
  };
  let place = candidates.firstPlace();
  let best = score(place, -Infinity);
  let steps = FIRST_STEPS;
  for (let round = 0; round < MOST_ROUNDS && Math.max(steps[0], steps[2]) > FINEST_STEP; round++) {
    let improved = false;
    for (const move of MOVES) {
      const next: Place = [
        place[0] + move[0] * steps[0],
        Math.max(0, place[1] + move[1] * steps[1]),
        place[2] + move[2] * steps[2],
      ];
      const value = score(next, best);
      if (value > best) {
        best = value;
        place = next;
        improved = true;
      }
    }
    if (!improved) steps = [steps[0] / 2, steps[1] / 2, steps[2] / 2];
  }
  const gains = rounded(gainsAt(place));
  const held = Math.max(...Object.values(candidates.usage(gains))) <= 1.02 && candidates.stable(gains);
  return held ? { gains, candidates } : null;
}

/**
 * Starting gains of one axis.
 * @throws RangeError when no gain at all is within the limits.
 */
export function startingAxis(task: AxisTask): StartingAxis {
  const found = search(task);
  if (found === null) {
    throw new RangeError(
      `no gains for ${task.axis} keep all limits; the loop is too slow or too noisy for this craft`,
    );
  }
  const used = found.candidates.usage(found.gains);
  const names = Object.keys(used) as LimitName[];
  const most = Math.max(...names.map((name) => used[name]));
  const active = names.filter((name) => used[name] > most - AS_ACTIVE);
  return {
    ...found.gains,
    used,
    active: active.map((name) => ACTIVE[name]).join(' and '),
    loosenedBy: active.map((name) => LOOSENED[name]).join('; '),
    loosening: looseningOf(task, found.gains),
  };
}

/** The same search with one thing of the bench bettered. */
function looseningOf(task: AxisTask, found: AxisGainsFound): Loosening[] {
  const { gains, noise, system } = task;
  const changes: [string, AxisTask | null][] = [
    [
      'half the delay in loop and sensor',
      {
        ...task,
        system: { ...system, delay_s: system.delay_s / 2 },
        gains: { ...gains, computeDelay_s: gains.computeDelay_s / 2 },
      },
    ],
    [
      'a D cutoff half as high again',
      gains.derivativeLowPass_Hz === 0 || gains.derivativeLowPass_Hz * 1.5 >= gains.loop_Hz / 2
        ? null
        : { ...task, gains: { ...gains, derivativeLowPass_Hz: gains.derivativeLowPass_Hz * 1.5 } },
    ],
    ['half the gyro noise', { ...task, noise: { ...noise, sigma_dps: noise.sigma_dps / 2 } }],
    [
      'mass, voltage and thrust known twice as well',
      { ...task, limits: { ...task.limits, uncertainty: halved(task.limits.uncertainty) } },
    ],
  ];
  return changes
    .flatMap(([change, bettered]) => {
      const other = bettered === null ? null : search(bettered);
      if (other === null) return [];
      return [{ change, gain_pct: 100 * (other.gains.i_us_per_deg / found.i_us_per_deg - 1) }];
    })
    .sort((a, b) => b.gain_pct - a.gain_pct);
}

function halved(uncertainty: Uncertainty): Uncertainty {
  const { mass, voltage, thrust } = uncertainty;
  return { mass: mass / 2, voltage: voltage / 2, thrust: thrust / 2 };
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
