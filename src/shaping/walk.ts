/**
 * The manual way, guided: P, then I, then D, each tried on the nonlinear craft. A stage offers the next steps of
 * its gain, flies a rate step with each, and says in words what the response asks for. The order is common
 * practice, no source.
 */
import type { Build } from '../craft/build.ts';
import type { AxisName, Gains } from '../craft/gains.ts';
import { CALM } from '../craft/wind.ts';
import { NEUTRAL_STICKS, type Sticks } from '../flight/pilot.ts';
import { runFlight } from '../flight/run.ts';
import { stepInfo, type StepMetrics } from './stepInfo.ts';

export const WALK_STAGES = ['p', 'i', 'd'] as const;
export type WalkStage = (typeof WALK_STAGES)[number];

export interface WalkCandidate {
  readonly label: string;
  readonly gains: Gains;
}

export interface WalkResponse {
  readonly t_s: Float64Array;
  readonly setpoint_dps: Float64Array;
  readonly rate_dps: Float64Array;
  readonly command_us: Float64Array;
  readonly step: StepMetrics;
  /** Rate that is left at the end of the step, share of the setpoint. */
  readonly offset: number;
  /** Command's standard deviation in hover before the step, µs: what noise and vibration make of it. */
  readonly restless_us: number;
  /** The flight ended by itself: it diverged. */
  readonly diverged: boolean;
}

/** Factors tried on the present gain; the first stage starts from nothing but P. */
const FACTORS = [0.7, 1, 1.4, 2];
/** Where a gain is still zero: I as a share of P per second, D as a share of P in seconds. */
const FIRST_INTEGRAL_PER_S = 2;
const FIRST_DERIVATIVE_S = 0.006;

/** The next steps of a stage. In the P stage I and D are zero, in the I stage D is. */
export function walkCandidates(stage: WalkStage, gains: Gains, axis: AxisName): WalkCandidate[] {
  const own = gains.axes[axis];
  const p = own.p_us_per_dps;
  const withOwn = (change: Partial<typeof own>): Gains => ({
    ...gains,
    axes: { ...gains.axes, [axis]: { ...own, ...change } },
  });
  const rounded = (value: number) => Number(value.toPrecision(3));
  return FACTORS.map((factor) => {
    const of = (present: number, first: number) => rounded(factor * (present === 0 ? first : present));
    if (stage === 'p') {
      const value = of(p, 1);
      return {
        label: `P ${value}`,
        gains: withOwn({ p_us_per_dps: value, i_us_per_deg: 0, d_us_per_dps2: 0 }),
      };
    }
    if (stage === 'i') {
      const value = of(own.i_us_per_deg, FIRST_INTEGRAL_PER_S * p);
      return { label: `I ${value}`, gains: withOwn({ i_us_per_deg: value, d_us_per_dps2: 0 }) };
    }
    const value = of(own.d_us_per_dps2, FIRST_DERIVATIVE_S * p);
    return { label: `D ${value}`, gains: withOwn({ d_us_per_dps2: value }) };
  });
}

const HOVER_S = 0.6;
const STEP_S = 0.5;
const HEIGHT_M = 60;
/** Small enough that no motor comes to its limits. */
const STEP_DPS = 40;

/** Flies a rate step from hover in calm air, pure rate control, with the craft's own noise and limits. */
export function walkResponse(build: Build, gains: Gains, axis: AxisName, seed = 1): WalkResponse {
  const sticks: Sticks = { ...NEUTRAL_STICKS, armed: true, heightHold: true, throttle: 0.5 };
  const stick = Math.min(1, STEP_DPS / gains.maxRate_dps[axis]);
  const names = ['t_s', `sp_${axis}_dps`, `rate_${axis}_dps`, `u_${axis}_us`];
  const { record, stopped } = runFlight(
    { build, gains, wind: CALM, seed, start: { kind: 'hover', height_m: HEIGHT_M } },
    HOVER_S + STEP_S,
    (time_s) => {
      sticks[axis] = time_s >= HOVER_S - 1e-9 ? stick : 0;
      return sticks;
    },
    names,
  );
  const [time_s, setpoint, rate, command] = names.map((name) => record.column(name));
  const from = setpoint.findIndex((value) => value !== 0);
  const start = from === -1 ? record.length : from;
  const final = stick * gains.maxRate_dps[axis];
  const t_s = time_s.slice(start).map((t) => t - time_s[start]);
  const rate_dps = rate.slice(start);
  return {
    t_s,
    setpoint_dps: setpoint.slice(start),
    rate_dps,
    command_us: command.slice(start),
    step: stepInfo(t_s, rate_dps, final),
    offset: rate_dps.length === 0 ? 0 : 1 - meanOfLast(rate_dps) / final,
    restless_us: deviationOf(command.subarray(Math.floor(start / 2), start)),
    diverged: stopped !== null,
  };
}

/** Mean of the last fifth. */
function meanOfLast(values: Float64Array): number {
  const from = Math.floor(0.8 * values.length);
  return values.subarray(from).reduce((sum, value) => sum + value, 0) / (values.length - from);
}

function deviationOf(values: Float64Array): number {
  if (values.length === 0) return 0;
  const mean = values.reduce((sum, value) => sum + value, 0) / values.length;
  return Math.sqrt(values.reduce((sum, value) => sum + (value - mean) ** 2, 0) / values.length);
}

/** Overshoot that P alone may show; D takes it off again later. */
const P_OVERSHOOT_PCT = 15;
const I_OVERSHOOT_PCT = 25;
const D_OVERSHOOT_PCT = 8;
const OFFSET = 0.05;
const RESTLESS_US = 6;

/** What the response asks for next. Thresholds: common practice, no source. */
export function walkAdvice(stage: WalkStage, response: WalkResponse): string {
  const overshoot = response.step.overshoot_pct ?? 0;
  if (response.diverged) return 'it departed: go back to the last gain that held';
  if (response.step.settle_s === null && overshoot > 60)
    return stage === 'd'
      ? 'it rings: less D, or a higher cutoff'
      : 'it rings: go back to the last gain that did not';
  if (stage === 'p') {
    if (overshoot > P_OVERSHOOT_PCT) return 'overshoots: a little less P, then go on to I';
    return response.step.rise_s === null || response.step.rise_s > 0.06
      ? 'slow: more P'
      : 'quick, with little overshoot: go on to I';
  }
  if (stage === 'i') {
    if (overshoot > I_OVERSHOOT_PCT) return 'swings past and returns slowly: less I';
    return Math.abs(response.offset) > OFFSET
      ? 'the rate does not reach its setpoint: more I'
      : 'reaches its setpoint: go on to D';
  }
  if (response.restless_us > RESTLESS_US) return 'noise drives the motors: less D, or a lower cutoff';
  return overshoot > D_OVERSHOOT_PCT
    ? 'still overshoots: more D'
    : 'settles cleanly: done; look at the margins';
}
