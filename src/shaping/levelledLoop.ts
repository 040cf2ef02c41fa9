/**
 * The self-levelling loop closed round the rate loop (roll or pitch): attitude from the integrated gyro, rate
 * setpoint κ·(wanted − attitude), once a tick. The accelerometer's slow pull on the estimate, well below the
 * loop's band, is left out.
 */
import { Matrix } from 'ml-matrix';
import { complex, magnitude, over, plus, scaled, times, type Complex } from './complex.ts';
import { narrowPlaces } from './analysis.ts';
import {
  disturbanceRejection,
  handlingBandwidth,
  type DisturbanceRejection,
  type HandlingBandwidth,
} from './handling.ts';
import { LoopRun } from './loopRun.ts';
import { marginsOf, type Margins } from './margins.ts';
import { polesOf, type Pole, type Poles } from './poles.ts';
import { linearTick, onCircle, partsAt, type Place, type RateLoop, type TickOutput } from './rateLoop.ts';
import { NO_STEP, stepInfo, type StepMetrics } from './stepInfo.ts';

export interface LevelledAnalysis {
  readonly stable: boolean;
  readonly polesMaxRadius: number;
  readonly poles: readonly Pole[];
  /** Broken at the command, with rate and attitude fed back: what more gain or delay in the craft costs. */
  readonly atMotors: Margins;
  /** Broken at the attitude error, with the rate loop closed. */
  readonly atAttitude: Margins;
  /** Attitude's answer to a step of the wanted attitude; null when unstable. */
  readonly attitude: { readonly t_s: Float64Array; readonly y: Float64Array } | null;
  readonly step: StepMetrics;
  /** Of attitude, against a disturbance. */
  readonly rejection: DisturbanceRejection;
  readonly handling: HandlingBandwidth;
}

/** T/(1 − 1/z): the attitude estimate's integral, this tick's sample in it. */
function integralAt(loop: RateLoop, at: Place): Complex {
  return scaled(over(at.z, at.w), loop.tick_s);
}

/** Loop transfer broken at the command. */
function motorsAt(loop: RateLoop, attitude_per_s: number, at: Place): Complex {
  const { plant, feedback, forward } = partsAt(loop, at);
  const outer = scaled(times(integralAt(loop, at), forward), attitude_per_s);
  return times(plant, plus(feedback, outer));
}

/** Loop transfer broken at the attitude error, rate loop closed. */
function attitudeAt(loop: RateLoop, attitude_per_s: number, at: Place): Complex {
  const { plant, feedback, forward } = partsAt(loop, at);
  const closed = over(times(plant, forward), plus(complex(1), times(plant, feedback)));
  return scaled(times(integralAt(loop, at), closed), attitude_per_s);
}

const LOW_SHARE = 2e-5;

export function analyseLevelled(loop: RateLoop, attitude_per_s: number): LevelledAnalysis {
  const found = levelledPoles(loop, attitude_per_s);
  const nyquist = Math.PI / loop.tick_s;
  const view = (transfer: (loop: RateLoop, attitude_per_s: number, at: Place) => Complex) => ({
    at: (omega: number) => transfer(loop, attitude_per_s, onCircle(omega * loop.tick_s)),
    low: nyquist * LOW_SHARE,
    high: nyquist,
    sampled: true,
    turns: loop.plant.wholeTicks / 2,
    narrow: narrowPlaces(loop, found.poles),
  });
  const outer = view(attitudeAt);
  const atAttitude = marginsOf(outer);
  const closed = (omega: number) => {
    const L = outer.at(omega);
    return over(L, plus(L, complex(1)));
  };
  const attitude = found.stable ? attitudeStep(loop, attitude_per_s, found.maxRadius) : null;
  return {
    stable: found.stable,
    polesMaxRadius: found.maxRadius,
    poles: found.poles,
    atMotors: marginsOf(view(motorsAt)),
    atAttitude,
    attitude,
    step: attitude === null ? NO_STEP : stepInfo(attitude.t_s, attitude.y, 1),
    rejection: disturbanceRejection(outer.at, outer.low, nyquist, {
      value: atAttitude.maxSensitivity,
      hertz: atAttitude.sensitivityPeak_Hz,
    }),
    handling: handlingBandwidth(closed, outer.low * 10, nyquist, 'attitude'),
  };
}

/** One tick of both loops; the attitude stands behind the rate loop's own states. */
function levelledTick(
  loop: RateLoop,
  attitude_per_s: number,
  state: Float64Array,
  wanted_deg: number,
  next: Float64Array,
  out: TickOutput,
): void {
  const { plant, layout } = loop;
  let rate = 0;
  for (let j = 0; j < plant.states; j++) rate += plant.C[j] * state[layout.plant + j];
  const attitude = state[layout.size] + loop.tick_s * rate;
  linearTick(loop, state, attitude_per_s * (wanted_deg - attitude), 0, next, out);
  next[layout.size] = attitude;
}

function levelledPoles(loop: RateLoop, attitude_per_s: number): Poles {
  const n = loop.layout.size + 1;
  return polesOf({
    size: n,
    transition: () => {
      const A = Matrix.zeros(n, n);
      const state = new Float64Array(n);
      const next = new Float64Array(n);
      const out: TickOutput = { y: 0, u: 0 };
      for (let j = 0; j < n; j++) {
        state.fill(0);
        state[j] = 1;
        levelledTick(loop, attitude_per_s, state, 0, next, out);
        for (let i = 0; i < n; i++) A.set(i, j, next[i]);
      }
      return A;
    },
    openLoop: (at) => motorsAt(loop, attitude_per_s, at),
    wholeTicks: loop.plant.wholeTicks,
    unheld: attitude_per_s === 0 || magnitude(complex(loop.p, loop.i)) === 0,
  });
}

const LONGEST_STEP_S = 20;
const MOST_TICKS = 100_000;

function attitudeStep(
  loop: RateLoop,
  attitude_per_s: number,
  maxRadius: number,
): { t_s: Float64Array; y: Float64Array } {
  const slow_s = -loop.tick_s / Math.log(Math.max(1e-9, maxRadius));
  const length_s = Math.min(LONGEST_STEP_S, 9 * slow_s + 60 * loop.tick_s);
  const count = Math.min(MOST_TICKS, Math.ceil(length_s / loop.tick_s) + 1);
  const run = new LoopRun(loop);
  const y = new Float64Array(count);
  let attitude = 0;
  for (let k = 0; k < count; k++) {
    attitude += loop.tick_s * run.sensed_dps;
    y[k] = attitude;
    run.tick(attitude_per_s * (1 - attitude), 0);
  }
  return { t_s: Float64Array.from({ length: count }, (_, k) => k * loop.tick_s), y };
}
