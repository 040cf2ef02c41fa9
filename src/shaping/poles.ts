/**
 * Closed-loop poles. Loops of ordinary size: eigenvalues of the transition matrix. A delay of many ticks makes
 * that matrix large without making the loop hard: then the poles that matter are found by Newton's method on
 * 1 + L = 0 from the frequency axis, and stability by counting the turns of 1 + L about 0 (Nyquist).
 */
import { EigenvalueDecomposition, type Matrix } from 'ml-matrix';
import { argument, complex, magnitude, over, plus, times, type Complex } from './complex.ts';
import { closedLoopMatrices, partsAt, placeAt, type Place, type RateLoop } from './rateLoop.ts';

export interface Pole {
  readonly re: number;
  readonly im: number;
}

export interface Poles {
  /** All of them, or of a large loop the slow and the ringing ones. */
  readonly poles: readonly Pole[];
  readonly maxRadius: number;
  readonly stable: boolean;
}

/** Poles within this of the unit circle count as on it. */
const ON_CIRCLE = 1e-9;
const LARGEST_MATRIX = 64;

/** What poles are found from: the transition matrix, or L where that would be too large. */
export interface PoleSource {
  readonly size: number;
  readonly transition: () => Matrix;
  readonly openLoop: (at: Place) => Complex;
  readonly wholeTicks: number;
  /** Nothing feeds the plant's integrator back: its pole at 1 stays, unseen by L. */
  readonly unheld: boolean;
}

export function closedLoopPoles(loop: RateLoop): Poles {
  return polesOf(sourceOf(loop));
}

/** The rate loop by itself. */
export function sourceOf(loop: RateLoop): PoleSource {
  return {
    size: loop.layout.size,
    transition: () => closedLoopMatrices(loop).A,
    openLoop: (at) => {
      const { plant, feedback } = partsAt(loop, at);
      return times(plant, feedback);
    },
    wholeTicks: loop.plant.wholeTicks,
    unheld: loop.p === 0 && loop.i === 0,
  };
}

export function polesOf(source: PoleSource): Poles {
  if (source.size > LARGEST_MATRIX) return polesOfLongLoop(source);
  const poles = eigenvalues(source.transition());
  const maxRadius = largestRadius(poles);
  return { poles, maxRadius, stable: maxRadius < 1 - ON_CIRCLE };
}

/** Outside the unit circle: every pole of a loop that is not far beyond its limit moves to a positive real part. */
const SHIFT = 2;

/**
 * Eigenvalues of A + 2, less 2. The library's iteration asks of each element below the diagonal whether it is
 * negligible beside its neighbours on it; a delay's zeros on the diagonal would make it ask that for ever.
 */
function eigenvalues(A: Matrix): Pole[] {
  const shifted = A.clone();
  for (let k = 0; k < A.rows; k++) shifted.set(k, k, A.get(k, k) + SHIFT);
  const { realEigenvalues, imaginaryEigenvalues } = new EigenvalueDecomposition(shifted);
  return realEigenvalues.map((re, i) => ({ re: re - SHIFT, im: imaginaryEigenvalues[i] }));
}

function largestRadius(poles: readonly Pole[]): number {
  return poles.reduce((most, pole) => Math.max(most, Math.hypot(pole.re, pole.im)), 0);
}

const STARTS = 120;
const NEWTON_STEPS = 40;

/** For loops whose delay is many ticks; also what the small ones are checked against. */
export function polesOfLongLoop(source: PoleSource): Poles {
  const found: Complex[] = [];
  const keep = (start: Complex) => {
    const s = newton(source, start);
    if (s !== null && !found.some((one) => distance(one, s) < 1e-7 * magnitude(s) + 1e-12)) found.push(s);
  };
  for (let k = 0; k < STARTS; k++) {
    const theta = Math.PI * 1e-6 ** (1 - (k + 1) / STARTS);
    keep(complex(0, theta));
    keep(complex(-theta, 0));
  }
  const poles = found.flatMap((s) => {
    const radius = Math.exp(s.re);
    const pole = { re: radius * Math.cos(s.im), im: radius * Math.sin(s.im) };
    return Math.abs(pole.im) < 1e-12 ? [{ re: pole.re, im: 0 }] : [pole, { re: pole.re, im: -pole.im }];
  });
  // Without proportional and integral action the plant's own integrator stays, cancelled in L.
  const unheld = source.unheld ? [{ re: 1, im: 0 }] : [];
  const all = [...poles, ...unheld];
  const maxRadius = largestRadius(all);
  return {
    poles: all,
    maxRadius,
    stable: unheld.length === 0 && unstablePoles(source) === 0 && maxRadius < 1 - ON_CIRCLE,
  };
}

function distance(a: Complex, b: Complex): number {
  return Math.hypot(a.re - b.re, Math.abs(a.im) - Math.abs(b.im));
}

/** Root of 1 + L at z = e^s near `start`; null when there is none to be reached. */
function newton(source: PoleSource, start: Complex): Complex | null {
  const f = (s: Complex) => plus(source.openLoop(placeAt(s.re, s.im)), complex(1));
  let s = start;
  for (let k = 0; k < NEWTON_STEPS; k++) {
    const size = magnitude(s);
    const h = 1e-6 * size;
    const value = f(s);
    const high = f(complex(s.re + h, s.im));
    const low = f(complex(s.re - h, s.im));
    const step = over(value, complex((high.re - low.re) / (2 * h), (high.im - low.im) / (2 * h)));
    const length = magnitude(step);
    if (!Number.isFinite(length)) return null;
    const share = Math.min(1, (0.4 * size) / length);
    s = complex(s.re - share * step.re, s.im - share * step.im);
    if (s.re > 3 || s.re < -3 || Math.abs(s.im) > 3.3) return null;
    if (length < 1e-11 * size) return magnitude(f(s)) < 1e-5 ? s : null;
  }
  return null;
}

const ARC = 1e-9;
const FIRST_POINTS = 600;
const MOST_HALVINGS = 40;
/** Above what the circle itself takes: noise in the argument would otherwise be halved without end. */
const MOST_EVALUATIONS = 300_000;

/**
 * Closed-loop poles outside the unit circle, by the argument of 1 + L along its upper half. NaN, and so not
 * stable, where 1 + L is so close to zero on the circle that rounding decides its argument.
 */
function unstablePoles(source: PoleSource): number {
  let evaluations = 0;
  const at = (s: Complex) => {
    evaluations++;
    return plus(source.openLoop(placeAt(s.re, s.im)), complex(1));
  };
  const turned = (from: Complex, to: Complex, a: Complex, b: Complex, depth: number): number => {
    const step = argument(over(b, a));
    if (!Number.isFinite(step) || evaluations > MOST_EVALUATIONS) return NaN;
    if (depth === 0 || (Math.abs(step) < 0.5 && depth < MOST_HALVINGS)) return step;
    const middle = complex((from.re + to.re) / 2, (from.im + to.im) / 2);
    const value = at(middle);
    return turned(from, middle, a, value, depth - 1) + turned(middle, to, value, b, depth - 1);
  };
  // Round z = 1 on the outside, where L has its integrators, then along the circle.
  const path: Complex[] = [];
  for (let k = 0; k <= 16; k++) {
    const angle = (Math.PI / 2) * (k / 16);
    path.push(complex(ARC * Math.cos(angle), ARC * Math.sin(angle)));
  }
  const linear = Math.min(80_000, 8 * (source.wholeTicks + 1));
  const thetas = [
    ...Array.from({ length: FIRST_POINTS }, (_, k) => ARC * (Math.PI / ARC) ** ((k + 1) / FIRST_POINTS)),
    ...Array.from({ length: linear }, (_, k) => (Math.PI * (k + 1)) / (linear + 1)),
  ].sort((a, b) => a - b);
  for (const theta of thetas) path.push(complex(0, theta));
  let sum = 0;
  let last = at(path[0]);
  for (let k = 1; k < path.length; k++) {
    const value = at(path[k]);
    sum += turned(path[k - 1], path[k], last, value, MOST_HALVINGS);
    last = value;
  }
  return Math.max(0, Math.round(-sum / Math.PI));
}
