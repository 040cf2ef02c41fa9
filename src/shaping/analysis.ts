/** Everything that is asked of one axis: stability, margins, step, noise; numbers or null, never NaN. */
import { magnitude } from './complex.ts';
import { LoopRun } from './loopRun.ts';
import { marginsOf, type Margins } from './margins.ts';
import { noiseAtMotor } from './noise.ts';
import { closedLoopPoles, type Pole } from './poles.ts';
import { openLoopAt, type RateLoop } from './rateLoop.ts';
import { NO_STEP, stepInfo, type StepMetrics } from './stepInfo.ts';

export interface StepResponse {
  readonly t_s: Float64Array;
  readonly y: Float64Array;
  readonly u_us: Float64Array;
}

export interface AxisAnalysis {
  readonly stable: boolean;
  /** A lower margin as well: less gain would also lose it. */
  readonly conditionallyStable: boolean;
  readonly poles: readonly Pole[];
  readonly polesMaxRadius: number;
  /** Of an unstable loop the gain margin is the change of gain, up or down, to the nearest crossing. */
  readonly margins: Margins;
  /** Null: unstable, or not asked for. */
  readonly stepResponse: StepResponse | null;
  readonly step: StepMetrics;
  readonly noiseAtMotor_us_rms: number | null;
  /** The margin that is used up first, in words. */
  readonly statement: string;
}

/** Lowest frequency looked at, as a share of the Nyquist frequency. */
const LOW_SHARE = 2e-5;
/** How far below that a crossing of very low gains is sought. */
const LOWEST_SHARE = 1e-11;
/** A pole whose ringing outlasts this share of its own angle gets frequencies of its own. */
const NARROW = 0.2;

/**
 * @param noise_dps standard deviation of the gyro's noise at a sample, deg/s
 * @param noiseCorrelation of neighbouring samples (first-order), 0 for white
 * @param coarse a quarter of the frequencies and no step: for maps
 */
export function analyse(
  loop: RateLoop,
  noise_dps: number,
  noiseCorrelation = 0,
  coarse = false,
): AxisAnalysis {
  const { poles, maxRadius, stable } = closedLoopPoles(loop);
  const found = marginsOfLoop(loop, poles, coarse);
  const margins = stable ? found : { ...found, gainMargin_dB: nearestCrossing(found) };
  const conditionallyStable = stable && margins.gainReduction_dB !== null;
  const response = stable && !coarse ? stepResponse(loop, maxRadius) : null;
  return {
    stable,
    conditionallyStable,
    poles,
    polesMaxRadius: maxRadius,
    margins,
    stepResponse: response,
    step: response === null ? NO_STEP : stepInfo(response.t_s, response.y, finalRate(loop, response)),
    noiseAtMotor_us_rms: stable
      ? noiseAtMotor(loop, { sigma_dps: noise_dps, correlation: noiseCorrelation })
      : null,
    statement: statementOf(loop, stable, conditionallyStable, maxRadius, margins),
  };
}

/** Margins of the loop's own open loop; `poles` tell where something narrow stands. */
export function marginsOfLoop(loop: RateLoop, poles: readonly Pole[], coarse = false): Margins {
  const nyquist = Math.PI / loop.tick_s;
  let low = nyquist * LOW_SHARE;
  while (low > nyquist * LOWEST_SHARE && magnitude(openLoopAt(loop, low)) < 1) low /= 30;
  return marginsOf({
    at: (omega) => openLoopAt(loop, omega),
    low,
    high: nyquist,
    sampled: true,
    coarse,
    turns: loop.plant.wholeTicks / 2,
    narrow: narrowPlaces(loop, poles),
  });
}

/** Frequencies about lightly damped poles and about the notches, rad/s. */
export function narrowPlaces(loop: RateLoop, poles: readonly Pole[]): number[] {
  const ringing = poles.flatMap((pole) => {
    const angle = Math.atan2(pole.im, pole.re);
    const width = Math.abs(Math.log(Math.hypot(pole.re, pole.im)));
    return angle > 0 && width < NARROW * angle ? around(angle, width) : [];
  });
  const notches = loop.gyroFilters.flatMap((f) => {
    // Zeros on the circle at cos θ = −b1/(2 b0); width of the poles' real part.
    if (f.b2 === 0 || Math.abs(f.b0 - f.b2) > 1e-12 || Math.abs(f.b1) >= 2 * f.b0) return [];
    return around(Math.acos(-f.b1 / (2 * f.b0)), 0.5 * Math.abs(Math.log(Math.abs(f.a2))));
  });
  return [...ringing, ...notches].map((theta) => theta / loop.tick_s);
}

function around(theta: number, width: number): number[] {
  return [-4, -2, -1, -0.5, -0.2, 0, 0.2, 0.5, 1, 2, 4].map((k) => theta + k * width);
}

function nearestCrossing(margins: Margins): number | null {
  const up = margins.gainMargin_dB;
  const down = margins.gainReduction_dB;
  if (up === null || down === null) return up ?? down;
  return up < -down ? up : down;
}

function statementOf(
  loop: RateLoop,
  stable: boolean,
  conditional: boolean,
  maxRadius: number,
  margins: Margins,
): string {
  if (loop.p === 0 && loop.i === 0)
    return 'P and I are both zero: nothing draws the rate to its setpoint, it drifts with every push';
  if (!stable) {
    const doubled_s = (loop.tick_s * Math.LN2) / Math.log(maxRadius);
    return doubled_s > 0 && doubled_s < 1000
      ? `unstable: a disturbance doubles every ${Number(doubled_s.toPrecision(2))} s with these gains`
      : 'on the edge: a disturbance never dies away with these gains';
  }
  const parts: string[] = [];
  if (conditional && margins.gainReduction_dB !== null) {
    parts.push(`conditionally stable: ${(-margins.gainReduction_dB).toFixed(1)} dB less gain loses it too`);
  }
  const delay = margins.delayMargin_ms;
  const gain = margins.gainMargin_dB;
  if (delay !== null && (gain === null || (margins.phaseMargin_deg ?? 180) / 60 <= gain / 8)) {
    parts.push(`${delay.toFixed(delay < 10 ? 1 : 0)} ms more delay and it starts to ring`);
  } else if (gain !== null) {
    parts.push(`${gain.toFixed(1)} dB more gain (× ${(10 ** (gain / 20)).toFixed(2)}) and it starts to ring`);
  } else parts.push('no crossing: neither gain nor delay limits it below half the loop rate');
  return parts.join('; ');
}

/** Shortest and longest record of a step, ticks; longest also in seconds. */
const LEAST_TICKS = 60;
const MOST_TICKS = 250_000;
const LONGEST_STEP_S = 30;
/** The record may end early once it has kept this close to its end for this many of the slowest pole's times. */
const SETTLED_SHARE = 1e-3;
const SETTLED_TIMES = 2;

/** Response of the plant's output to a unit step of the setpoint, sample by sample, from rest. */
export function stepResponse(loop: RateLoop, polesMaxRadius: number): StepResponse {
  const slow_s = polesMaxRadius >= 1 ? 1 : -loop.tick_s / Math.log(Math.max(1e-9, polesMaxRadius));
  const length_s = Math.min(LONGEST_STEP_S, 9 * slow_s + 20 * loop.tick_s);
  const count = Math.min(MOST_TICKS, Math.max(LEAST_TICKS, Math.ceil(length_s / loop.tick_s) + 1));
  const quiet = Math.max(LEAST_TICKS / 2, Math.ceil((SETTLED_TIMES * slow_s) / loop.tick_s));
  const final = loop.i !== 0 ? 1 : null;
  const y = new Float64Array(count);
  const u_us = new Float64Array(count);
  const run = new LoopRun(loop);
  let moved = 0;
  let length = count;
  for (let k = 0; k < count; k++) {
    run.tick(1, 0);
    y[k] = run.out.y;
    u_us[k] = run.out.u;
    if (final === null || Math.abs(y[k] - final) > SETTLED_SHARE) moved = k;
    else if (k - moved > quiet && k > LEAST_TICKS) {
      length = k + 1;
      break;
    }
  }
  const t_s = Float64Array.from({ length }, (_, k) => k * loop.tick_s);
  return { t_s, y: y.subarray(0, length), u_us: u_us.subarray(0, length) };
}

/** With I the setpoint; with P alone what weight and feed-forward make of it where the plant integrates. */
function finalRate(loop: RateLoop, response: StepResponse): number {
  if (loop.i !== 0) return 1;
  return closedLoopAtRest(loop) ?? response.y[response.y.length - 1];
}

/** Setpoint to rate at 0 Hz without an integral: through the plant's own gain there, infinite or not. */
function closedLoopAtRest(loop: RateLoop): number | null {
  const forward = loop.p * loop.setpointWeight + loop.ff;
  const { denominator, numeratorNow, numeratorBefore } = loop.plant;
  const numerator = numeratorNow[0] + numeratorBefore[0];
  const whole = denominator[0] + loop.p * numerator;
  return whole === 0 ? null : (forward * numerator) / whole;
}
