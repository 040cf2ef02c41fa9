/**
 * The discrete rate loop of one axis: exact sampled plant, the gyro's own filters and the PID exactly as
 * control/ratePid.ts computes them. One description serves the frequency response (each factor evaluated at
 * z = e^{jωT}), the poles (transition matrix found by running the linear loop on unit states), the step and
 * the noise.
 */
import { Matrix } from 'ml-matrix';
import { biquadNotch, lowPass, type BiquadCoefficients } from '../control/filters.ts';
import type { AxisGains, AxisName, Gains } from '../craft/gains.ts';
import { complex, over, plus, polynomialAt, scaled, times, unit, type Complex } from './complex.ts';
import { sampled, type ContinuousSystem, type SampledSystem } from './continuous.ts';

export interface RateLoop {
  readonly tick_s: number;
  readonly plant: SampledSystem;
  readonly p: number;
  readonly i: number;
  readonly d: number;
  readonly ff: number;
  readonly setpointWeight: number;
  readonly derivativeOnError: boolean;
  readonly gyroFilters: readonly BiquadCoefficients[];
  readonly derivativeFilters: readonly BiquadCoefficients[];
  /** Where each state of the closed loop stands. */
  readonly layout: Layout;
}

interface Layout {
  readonly size: number;
  readonly plant: number;
  readonly pastCommands: number;
  readonly pastCommandCount: number;
  readonly integral: number;
  readonly lastError: number;
  readonly lastDerivativeInput: number;
  readonly gyroFilters: number;
  readonly derivativeFilters: number;
}

/**
 * The loop of `axis` around `system` (rate or gyro, deg/s, from axis command, µs). The gains' compute delay is
 * added to the system's own.
 */
export function rateLoop(system: ContinuousSystem, gains: Gains, axis: AxisName): RateLoop {
  const tick_s = 1 / gains.loop_Hz;
  const delay_s = system.delay_s + gains.computeDelay_s + frameDelay_s(system.commandUpdate_Hz, gains);
  const plant = sampled({ ...system, delay_s }, tick_s);
  const gyroLow = lowPass(gains.gyroLowPass_Hz, gains.gyroLowPassKind ?? 'first-order', gains.loop_Hz);
  const notches = gains.notches.map((one) => biquadNotch(one.centre_Hz, one.q, gains.loop_Hz));
  const derivativeLow = lowPass(
    gains.derivativeLowPass_Hz,
    gains.derivativeLowPassKind ?? 'first-order',
    gains.loop_Hz,
  );
  const one = gains.axes[axis];
  const loop = {
    tick_s,
    plant,
    p: one.p_us_per_dps,
    i: one.i_us_per_deg,
    d: one.d_us_per_dps2,
    ff: one.feedforward_us_per_dps,
    setpointWeight: one.setpointWeight ?? 1,
    derivativeOnError: gains.derivativeOn === 'error',
    gyroFilters: gyroLow === null ? notches : [gyroLow, ...notches],
    derivativeFilters: derivativeLow === null ? [] : [derivativeLow],
  };
  return { ...loop, layout: layoutOf(loop) };
}

/** The same loop with other gains: the sampled plant and the filters are kept, which is what costs time. */
export function withGainsOf(
  loop: RateLoop,
  gains: Pick<AxisGains, 'p_us_per_dps' | 'i_us_per_deg' | 'd_us_per_dps2'>,
): RateLoop {
  return { ...loop, p: gains.p_us_per_dps, i: gains.i_us_per_deg, d: gains.d_us_per_dps2 };
}

/** Frames over which the wait for the ESC is averaged. */
const FRAMES = 2000;

/**
 * Mean delay that an ESC slower than the loop adds: the newest command waits for the next frame and is then held
 * over the longer frame. (Loop and frames drift through each other, so the true delay wanders about this.)
 */
function frameDelay_s(commandUpdate_Hz: number | undefined, gains: Gains): number {
  if (commandUpdate_Hz === undefined || commandUpdate_Hz >= gains.loop_Hz * 0.999) return 0;
  const tick_s = 1 / gains.loop_Hz;
  let age = 0;
  for (let k = 1; k <= FRAMES; k++) {
    const ticks = (k / commandUpdate_Hz - gains.computeDelay_s) / tick_s;
    age += (ticks - Math.floor(ticks + 1e-6)) * tick_s;
  }
  return age / FRAMES + (1 / commandUpdate_Hz - tick_s) / 2;
}

function layoutOf(loop: Omit<RateLoop, 'layout'>): Layout {
  const plant = 0;
  const pastCommands = loop.plant.states;
  const pastCommandCount = loop.plant.wholeTicks + 1;
  const integral = pastCommands + pastCommandCount;
  const gyroFilters = integral + 3;
  const derivativeFilters = gyroFilters + 2 * loop.gyroFilters.length;
  return {
    size: derivativeFilters + 2 * loop.derivativeFilters.length,
    plant,
    pastCommands,
    pastCommandCount,
    integral,
    lastError: integral + 1,
    lastDerivativeInput: integral + 2,
    gyroFilters,
    derivativeFilters,
  };
}

// --- Frequency response ---------------------------------------------------------------------------------

function filterAt(filters: readonly BiquadCoefficients[], z: Complex): Complex {
  let value = complex(1);
  for (const f of filters) {
    value = times(value, over(polynomialAt([f.b0, f.b1, f.b2], z), polynomialAt([1, f.a1, f.a2], z)));
  }
  return value;
}

/** A place z = e^{ln r + jθ} with w = z − 1, which does not cancel near 1. */
export interface Place {
  readonly logRadius: number;
  readonly theta: number;
  readonly z: Complex;
  readonly w: Complex;
}

export function onCircle(theta: number): Place {
  const half = Math.sin(theta / 2);
  return { logRadius: 0, theta, z: unit(theta), w: complex(-2 * half * half, Math.sin(theta)) };
}

/** z^{−n}. */
function delayed(at: Place, n: number): Complex {
  const turned = unit(-at.theta * n);
  return at.logRadius === 0 ? turned : scaled(turned, Math.exp(-at.logRadius * n));
}

/** Coefficients lowest power first at `w`. */
function risingAt(coefficients: Float64Array, w: Complex): Complex {
  let re = 0;
  let im = 0;
  for (let k = coefficients.length - 1; k >= 0; k--) {
    const next = re * w.re - im * w.im + coefficients[k];
    im = re * w.im + im * w.re;
    re = next;
  }
  return complex(re, im);
}

/** Plant output over command: (n0(w) + n1(w)/z) z^{−m} / d(w). */
function plantAt(plant: SampledSystem, at: Place): Complex {
  const now = risingAt(plant.numeratorNow, at.w);
  const before = times(risingAt(plant.numeratorBefore, at.w), delayed(at, 1));
  const ratio = over(plus(now, before), risingAt(plant.denominator, at.w));
  return plant.wholeTicks === 0 ? ratio : times(ratio, delayed(at, plant.wholeTicks));
}

/** Transfer of the controller from filtered rate to −u: P + I (T/2)(z+1)/(z−1) + D (z−1)/(zT) · low-pass. */
function controllerAt(loop: RateLoop, at: Place): Complex {
  const proportional = plus(complex(loop.p), derivativeAt(loop, at));
  if (loop.i === 0) return proportional;
  const integral = scaled(over(plus(at.z, complex(1)), at.w), (loop.i * loop.tick_s) / 2);
  return plus(proportional, integral);
}

function derivativeAt(loop: RateLoop, at: Place): Complex {
  if (loop.d === 0) return complex(0);
  const difference = scaled(times(at.w, delayed(at, 1)), loop.d / loop.tick_s);
  return times(difference, filterAt(loop.derivativeFilters, at.z));
}

/** Loop transfer L at `omega` rad/s, 0 < ω ≤ π/T. */
export function openLoopAt(loop: RateLoop, omega: number): Complex {
  const at = onCircle(omega * loop.tick_s);
  return times(plantAt(loop.plant, at), times(filterAt(loop.gyroFilters, at.z), controllerAt(loop, at)));
}

/** Any z = e^{ln r + jθ}: for poles. */
export function placeAt(logRadius: number, theta: number): Place {
  const half = Math.sin(theta / 2);
  const grown = Math.expm1(logRadius);
  const w = complex(grown * Math.cos(theta) - 2 * half * half, (1 + grown) * Math.sin(theta));
  return { logRadius, theta, z: complex(1 + w.re, w.im), w };
}

/** The loop's parts at one place: u to measured rate, measured rate to −u, setpoint to u. */
export interface Parts {
  readonly plant: Complex;
  readonly feedback: Complex;
  readonly forward: Complex;
}

export function partsAt(loop: RateLoop, at: Place): Parts {
  return {
    plant: plantAt(loop.plant, at),
    feedback: times(filterAt(loop.gyroFilters, at.z), controllerAt(loop, at)),
    forward: forwardAt(loop, at),
  };
}

/** Measured rate to −u: gyro filters and controller. */
export function feedbackAt(loop: RateLoop, omega: number): Complex {
  const at = onCircle(omega * loop.tick_s);
  return times(filterAt(loop.gyroFilters, at.z), controllerAt(loop, at));
}

/** Setpoint to plant output at `omega`. */
export function closedLoopAt(loop: RateLoop, omega: number): Complex {
  const { plant, feedback, forward } = partsAt(loop, onCircle(omega * loop.tick_s));
  return over(times(plant, forward), plus(complex(1), times(plant, feedback)));
}

/** Setpoint to u with the feedback cut. */
function forwardAt(loop: RateLoop, at: Place): Complex {
  const onMeasurement = loop.derivativeOnError ? complex(0) : scaled(derivativeAt(loop, at), -1);
  return plus(
    plus(controllerAt(loop, at), onMeasurement),
    complex(loop.p * (loop.setpointWeight - 1) + loop.ff),
  );
}

// --- Time domain ------------------------------------------------------------------------------------------

/** Result of one linear tick besides the next state. */
export interface TickOutput {
  /** Plant output before the tick, deg/s. */
  y: number;
  /** Axis command, µs. */
  u: number;
}

/**
 * One tick of the unlimited loop: `state` to `next`, with setpoint and additive noise on the measured rate. The
 * commands on their way stand in the state; LoopRun keeps them apart, which long delays need.
 */
export function linearTick(
  loop: RateLoop,
  state: Float64Array,
  setpoint: number,
  noise: number,
  next: Float64Array,
  out: TickOutput,
): void {
  const { layout: at, plant } = loop;
  control(loop, state, setpoint, noise, next, out);
  // Past commands, newest first: u_{k−1}, u_{k−2}, …; the plant takes u_{k−m} and u_{k−m−1}.
  const m = plant.wholeTicks;
  const newer = m === 0 ? out.u : state[at.pastCommands + m - 1];
  movePlant(loop, state, newer, state[at.pastCommands + m], next);
  next.set(state.subarray(at.pastCommands, at.pastCommands + at.pastCommandCount - 1), at.pastCommands + 1);
  next[at.pastCommands] = out.u;
}

/** Sensor, filters and PID of one tick: all of `next` but the plant and the past commands; y and u into `out`. */
export function control(
  loop: RateLoop,
  state: Float64Array,
  setpoint: number,
  noise: number,
  next: Float64Array,
  out: TickOutput,
): void {
  const { layout: at, plant, tick_s } = loop;
  let y = 0;
  for (let j = 0; j < plant.states; j++) y += plant.C[j] * state[at.plant + j];
  const measured = runFilters(loop.gyroFilters, state, next, at.gyroFilters, y + noise);
  const error = setpoint - measured;
  const integral = state[at.integral] + loop.i * (tick_s / 2) * (error + state[at.lastError]);
  const input = loop.derivativeOnError ? error : -measured;
  const rawDerivative = (loop.d * (input - state[at.lastDerivativeInput])) / tick_s;
  const derivative = runFilters(loop.derivativeFilters, state, next, at.derivativeFilters, rawDerivative);
  // Without integral gain there is no integrator, and no pole of its own at z = 1.
  next[at.integral] = loop.i === 0 ? 0 : integral;
  next[at.lastError] = error;
  next[at.lastDerivativeInput] = input;
  out.y = y;
  out.u = loop.p * (loop.setpointWeight * setpoint - measured) + integral + derivative + loop.ff * setpoint;
}

/** The plant over one tick, in which the older command holds first and then the newer. */
export function movePlant(
  loop: RateLoop,
  state: Float64Array,
  newer: number,
  older: number,
  next: Float64Array,
): void {
  const { layout: at, plant } = loop;
  const n = plant.states;
  for (let i = 0; i < n; i++) {
    let sum = plant.now[i] * newer + plant.before[i] * older;
    for (let j = 0; j < n; j++) sum += plant.transition[i * n + j] * state[at.plant + j];
    next[at.plant + i] = sum;
  }
}

function runFilters(
  filters: readonly BiquadCoefficients[],
  state: Float64Array,
  next: Float64Array,
  at: number,
  input: number,
): number {
  let x = input;
  for (let k = 0; k < filters.length; k++) {
    const f = filters[k];
    const y = f.b0 * x + state[at + 2 * k];
    next[at + 2 * k] = f.b1 * x - f.a1 * y + state[at + 2 * k + 1];
    next[at + 2 * k + 1] = f.b2 * x - f.a2 * y;
    x = y;
  }
  return x;
}

/** Transition matrix of the closed loop, and its columns for noise: next state and command. */
export function closedLoopMatrices(loop: RateLoop): {
  A: Matrix;
  noiseIn: Matrix;
  commandOut: Matrix;
  noiseToCommand: number;
} {
  const n = loop.layout.size;
  const A = Matrix.zeros(n, n);
  const commandOut = Matrix.zeros(1, n);
  const state = new Float64Array(n);
  const next = new Float64Array(n);
  const out: TickOutput = { y: 0, u: 0 };
  for (let j = 0; j < n; j++) {
    state.fill(0);
    state[j] = 1;
    linearTick(loop, state, 0, 0, next, out);
    for (let i = 0; i < n; i++) A.set(i, j, next[i]);
    commandOut.set(0, j, out.u);
  }
  state.fill(0);
  linearTick(loop, state, 0, 1, next, out);
  return { A, noiseIn: Matrix.columnVector(Array.from(next)), commandOut, noiseToCommand: out.u };
}
