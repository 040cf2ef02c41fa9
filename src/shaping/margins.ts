/**
 * Margins of a loop from its frequency response: all crossings are found, not only the first.
 *
 * Gain margin: 1/|L| where L is real and negative. Phase margin: 180° + arg L where |L| = 1. Delay margin:
 * phase lag left until −180°, over ω. Ms: largest |1/(1+L)|. (Åström & Murray, Feedback Systems, ch. 10;
 * Skogestad & Postlethwaite, ch. 2.)
 */
import { argument, complex, magnitude, over, plus, type Complex } from './complex.ts';

export interface GainCrossing {
  readonly omega: number;
  /** In (−180, 180]. */
  readonly phaseMargin_deg: number;
  /** Delay that brings this crossing to −180°, ms. */
  readonly delayMargin_ms: number;
}

export interface PhaseCrossing {
  readonly omega: number;
  /** 1/|L|: above 1 the gain may rise by it, below 1 it may fall to it. */
  readonly factor: number;
}

export interface Margins {
  readonly gainCrossings: readonly GainCrossing[];
  readonly phaseCrossings: readonly PhaseCrossing[];
  /** Smallest room for more gain, dB; null: none is needed at any frequency. */
  readonly gainMargin_dB: number | null;
  /** Smallest room for less gain, dB (negative); null: the gain may fall to nothing. */
  readonly gainReduction_dB: number | null;
  readonly phaseMargin_deg: number | null;
  readonly delayMargin_ms: number | null;
  readonly crossover_Hz: number | null;
  readonly maxSensitivity: number;
  readonly sensitivityPeak_Hz: number;
  readonly maxComplementary: number;
  readonly complementaryPeak_Hz: number;
}

/** Loop transfer as a function of ω, looked at over [low, high] rad/s. */
export interface Response {
  readonly at: (omega: number) => Complex;
  readonly low: number;
  readonly high: number;
  /** The high end is the Nyquist frequency, where L is real: it counts as a phase crossing. */
  readonly sampled: boolean;
  /** A quarter of the points: for searches. */
  readonly coarse?: boolean;
  /** Turns of phase that delay makes up to `high`: a long delay crosses −180° often, and each is looked for. */
  readonly turns?: number;
  /** Frequencies where something narrow stands (a notch, a lightly damped pole), rad/s. */
  readonly narrow?: readonly number[];
}

const POINTS = 360;
const LINEAR_POINTS = 240;
const REFINE = 46;
const POINTS_A_TURN = 10;
const MOST_LINEAR_POINTS = 12_000;

export function marginsOf(response: Response): Margins {
  const omegas = grid(response);
  const values = omegas.map((omega) => response.at(omega));
  const gainCrossings = findGainCrossings(response, omegas, values);
  const phaseCrossings = findPhaseCrossings(response, omegas, values);
  const sensitivity = peak(response, omegas, values, (L) => 1 / magnitude(plus(L, complex(1))));
  const complementary = peak(response, omegas, values, (L) => magnitude(over(L, plus(L, complex(1)))));
  const up = phaseCrossings.filter((one) => one.factor > 1).map((one) => one.factor);
  const down = phaseCrossings.filter((one) => one.factor <= 1).map((one) => one.factor);
  // A loop past its limit has no room upward at that crossing: the nearest one is told with its sign.
  const upward = up.length > 0 ? Math.min(...up) : null;
  const downward = down.length > 0 ? Math.max(...down) : null;
  const phase = gainCrossings.reduce<GainCrossing | null>(
    (least, one) =>
      least === null || Math.abs(one.phaseMargin_deg) < Math.abs(least.phaseMargin_deg) ? one : least,
    null,
  );
  const delays = gainCrossings.map((one) => one.delayMargin_ms);
  return {
    gainCrossings,
    phaseCrossings,
    gainMargin_dB: upward === null || !Number.isFinite(upward) ? null : 20 * Math.log10(upward),
    gainReduction_dB: downward === null ? null : 20 * Math.log10(downward),
    phaseMargin_deg: phase === null ? null : phase.phaseMargin_deg,
    delayMargin_ms: delays.length === 0 ? null : Math.min(...delays),
    crossover_Hz: phase === null ? null : phase.omega / (2 * Math.PI),
    maxSensitivity: sensitivity.value,
    sensitivityPeak_Hz: sensitivity.omega / (2 * Math.PI),
    maxComplementary: complementary.value,
    complementaryPeak_Hz: complementary.omega / (2 * Math.PI),
  };
}

/** Logarithmic, with a linear part so that narrow notches near the top are not stepped over. */
function grid(response: Response): number[] {
  const { low, high } = response;
  const share = response.coarse === true ? 0.25 : 1;
  const points = POINTS * share;
  const forDelay = Math.min(MOST_LINEAR_POINTS, POINTS_A_TURN * (response.turns ?? 0));
  const linearPoints = Math.ceil(Math.max(LINEAR_POINTS, forDelay) * share);
  const all: number[] = [];
  for (let i = 0; i < points; i++) all.push(low * (high / low) ** (i / (points - 1)));
  for (let i = 1; i <= linearPoints; i++) all.push(low + ((high - low) * i) / (linearPoints + 1));
  for (const omega of response.narrow ?? []) if (omega > low && omega < high) all.push(omega);
  all.sort((a, b) => a - b);
  all[all.length - 1] = high;
  return all;
}

function findGainCrossings(response: Response, omegas: number[], values: Complex[]): GainCrossing[] {
  const found: GainCrossing[] = [];
  const logSize = (omega: number) => Math.log(magnitude(response.at(omega)));
  for (let i = 1; i < omegas.length; i++) {
    const a = magnitude(values[i - 1]) - 1;
    const b = magnitude(values[i]) - 1;
    if (a === 0 || a * b >= 0) continue;
    const omega = bisect(logSize, omegas[i - 1], omegas[i]);
    const angle = argument(response.at(omega));
    const phaseMargin = wrap(angle + Math.PI);
    const lagLeft = angle + Math.PI <= 0 ? angle + 3 * Math.PI : angle + Math.PI;
    found.push({
      omega,
      phaseMargin_deg: (phaseMargin * 180) / Math.PI,
      delayMargin_ms: (1000 * (lagLeft > 2 * Math.PI ? lagLeft - 2 * Math.PI : lagLeft)) / omega,
    });
  }
  return found;
}

function findPhaseCrossings(response: Response, omegas: number[], values: Complex[]): PhaseCrossing[] {
  const found: PhaseCrossing[] = [];
  const imaginary = (omega: number) => response.at(omega).im;
  for (let i = 1; i < omegas.length; i++) {
    if (values[i - 1].im * values[i].im >= 0 || values[i - 1].re + values[i].re >= 0) continue;
    const last = i === omegas.length - 1 && response.sampled;
    if (last) continue;
    const omega = bisect(imaginary, omegas[i - 1], omegas[i]);
    const L = response.at(omega);
    // A pole on the circle turns the sign of Im L as well; there L is huge, not real.
    if (L.re < 0 && Math.abs(L.im) < 1e-3 * Math.abs(L.re)) found.push({ omega, factor: -1 / L.re });
  }
  if (response.sampled) {
    const L = response.at(response.high);
    if (L.re < 0) found.push({ omega: response.high, factor: -1 / L.re });
  }
  return found;
}

function bisect(f: (x: number) => number, low: number, high: number): number {
  let a = low;
  let b = high;
  const fa = f(a);
  for (let k = 0; k < REFINE; k++) {
    const middle = (a + b) / 2;
    if (f(middle) * fa > 0) a = middle;
    else b = middle;
  }
  return (a + b) / 2;
}

function peak(
  response: Response,
  omegas: number[],
  values: Complex[],
  f: (L: Complex) => number,
): { omega: number; value: number } {
  let best = 0;
  let most = -Infinity;
  for (let i = 0; i < omegas.length; i++) {
    const value = f(values[i]);
    if (value > most) {
      most = value;
      best = i;
    }
  }
  let low = omegas[Math.max(0, best - 1)];
  let high = omegas[Math.min(omegas.length - 1, best + 1)];
  // Golden section between the neighbours, one new value a step.
  const share = (Math.sqrt(5) - 1) / 2;
  let left = high - share * (high - low);
  let right = low + share * (high - low);
  let atLeft = f(response.at(left));
  let atRight = f(response.at(right));
  for (let k = 0; k < 32; k++) {
    if (atLeft > atRight) {
      [high, right, atRight] = [right, left, atLeft];
      left = high - share * (high - low);
      atLeft = f(response.at(left));
    } else {
      [low, left, atLeft] = [left, right, atRight];
      right = low + share * (high - low);
      atRight = f(response.at(right));
    }
  }
  const [omega, value] = atLeft > atRight ? [left, atLeft] : [right, atRight];
  return value > most ? { omega, value } : { omega: omegas[best], value: most };
}

function wrap(angle: number): number {
  const turned = angle - 2 * Math.PI * Math.round(angle / (2 * Math.PI));
  return turned <= -Math.PI ? turned + 2 * Math.PI : turned;
}
