/**
 * Maximum likelihood of the innovations by Fisher scoring with Levenberg's damping: the search behind fitAxis.
 * Plant and noise are fitted together; which of the optional plant terms are free is the caller's choice.
 */
import { EigenvalueDecomposition, Matrix } from 'ml-matrix';
import type { AxisPiece, PlantParameters } from './axisData.ts';
import { DisturbanceFilter, type FilterPlant, type NoiseParameters } from './disturbanceFilter.ts';
import { meanCommand_us, unitResponse, type PlantShape } from './plantResponse.ts';
import { autocovariance, whiten, whitenessScore, whiteningFilter, whiteningOrder } from './whitening.ts';

export interface Estimate {
  readonly value: number;
  /** Standard error; the 95 % interval is value ± 1.96 sigma. */
  readonly sigma: number;
}

export interface AxisFit {
  readonly gain_dps2_per_us: Estimate;
  readonly lag_s: Estimate;
  readonly delay_s: Estimate;
  /** Present when they were free in the fit. */
  readonly lead_s?: Estimate;
  readonly damping_per_s?: Estimate;
  /** Covariance of gain, lag, delay and then the terms present, lead before damping. */
  readonly covariance: readonly (readonly number[])[];
  readonly noise: NoiseParameters;
  /** Order of the autoregressive whitening that was needed; 0 when the noise model alone was enough. */
  readonly whiteningOrder: number;
  /** z-score of the Ljung–Box statistic of the prediction errors; above about 3 they are not white. */
  readonly whiteness: number;
  /** Minus twice the log likelihood less constants: lower is better among fits of the same rows. */
  readonly deviance: number;
  readonly rows: number;
  readonly converged: boolean;
}

/** A term of the plant that is free only where the log asks for it. */
export type OptionalTerm = 'lead_s' | 'damping_per_s';

/** Places in the parameter vector. */
const GAIN = 0;
const LAG = 1;
const DELAY = 2;
const LEAD = 3;
const DAMPING = 4;
const VARIANCE = 5;
const DRIVE = 6;
const DECAY = 7;
const SIZE = 8;

const WARM_UP_S = 0.3;
const MOST_ITERATIONS = 40;
const SCOUT_ITERATIONS = 12;
const SHORTEST_LAG_S = 2e-4;
const LONGEST_LAG_S = 2;
const LONGEST_DELAY_S = 0.25;
const SHORTEST_DELAY_S = -0.003;
const LARGEST_ORDER = 48;
const MOST_WHITENED_ITERATIONS = 12;
const WHITENESS_LAGS = 60;
/** Prediction errors that stay coloured: the intervals are widened by half; common practice, no source. */
const NOT_WHITE = 2;
const NOT_WHITE_FACTOR = 1.5;
/**
 * Weak prior of the disturbance's decay, ln λ ~ N(ln 1, 2²): keeps the search finite when there is no
 * disturbance to speak of; it says nothing about the plant.
 */
const DECAY_PRIOR = { mean: 0, sd: 2 };
const NOISE_STEP = 1e-4;
const LEAST_EIGENVALUE = 1e-13;
/** Steps of the central differences of delay, lead and damping. */
const PLANT_STEPS = [0, 0, 2e-5, 1e-4, 1e-3];

interface Evaluation {
  readonly gradient: Float64Array;
  readonly information: Matrix;
}

export class AxisFitter {
  /** Free parameters, by place. */
  private readonly active: readonly number[];
  private readonly filters: DisturbanceFilter[];
  /** With one noise parameter moved, for its derivative. */
  private readonly movedFilters: DisturbanceFilter[];
  private readonly trims: number[];
  private readonly unit: Float64Array[];
  private readonly residual: Float64Array[];
  private readonly innovation: Float64Array[];
  private readonly work: Float64Array[];
  private readonly lowWork: Float64Array[];
  /** Derivatives of the innovations, per parameter and piece. */
  private readonly slopes: Float64Array[][];
  /** Derivatives of ln(innovation variance), per noise parameter and piece. */
  private readonly varianceSlopes: Float64Array[][];
  /** First row of each piece that counts. */
  private readonly first: number[];
  private readonly rows: number;

  constructor(
    private readonly pieces: readonly AxisPiece[],
    private readonly start: PlantParameters,
    free: readonly OptionalTerm[],
    private readonly startNoise?: NoiseParameters,
  ) {
    this.active = [
      GAIN,
      LAG,
      DELAY,
      ...(free.includes('lead_s') ? [LEAD] : []),
      ...(free.includes('damping_per_s') ? [DAMPING] : []),
      VARIANCE,
      DRIVE,
      DECAY,
    ];
    const columns = () => pieces.map((piece) => new Float64Array(piece.t_s.length));
    this.filters = pieces.map((piece) => new DisturbanceFilter(piece));
    this.movedFilters = pieces.map((piece) => new DisturbanceFilter(piece));
    this.trims = pieces.map(meanCommand_us);
    this.unit = columns();
    this.residual = columns();
    this.innovation = columns();
    this.work = columns();
    this.lowWork = columns();
    this.slopes = Array.from({ length: SIZE }, columns);
    this.varianceSlopes = Array.from({ length: SIZE - VARIANCE }, columns);
    const warmUp_s = Math.max(WARM_UP_S, 5 * start.lag_s);
    this.first = pieces.map((piece) => {
      const row = piece.t_s.findIndex((t) => t >= piece.t_s[0] + warmUp_s);
      return row === -1 ? piece.t_s.length : row;
    });
    let rows = 0;
    pieces.forEach((piece, i) => {
      for (let k = this.first[i]; k < piece.t_s.length; k++) if (!Number.isNaN(piece.y_dps[k])) rows++;
    });
    this.rows = rows;
  }

  /** Searches and, if the prediction errors are coloured, goes on with a whitening filter. */
  run(): AxisFit {
    const { p, last, cost, converged } = this.search(MOST_ITERATIONS);
    return this.whitened(p, last, cost, converged);
  }

  /** The search alone: the plant it ends at and minus its log likelihood, to compare places to begin. */
  scout(): { plant: PlantParameters; cost: number } {
    const { p, cost } = this.search(SCOUT_ITERATIONS);
    return { plant: { gain_dps2_per_us: p[GAIN], lag_s: p[LAG], delay_s: p[DELAY] }, cost };
  }

  private search(most: number) {
    let p = this.startVector();
    let cost = this.cost(p);
    let damping = 1e-3;
    let converged = false;
    let last = this.derivatives(p);
    for (let iteration = 0; iteration < most; iteration++) {
      const step = dampedStep(last, damping);
      const trial = this.bounded(p, step);
      const trialCost = this.cost(trial);
      if (trialCost < cost) {
        const gained = cost - trialCost;
        p = trial;
        cost = trialCost;
        damping = Math.max(1e-9, damping / 8);
        last = this.derivatives(p);
        if (gained < 1e-3 && damping < 1e-2) {
          converged = true;
          break;
        }
      } else {
        // No better point nearby: the gradient step is below what the cost resolves.
        if (Math.abs(predictedGain(last, step)) < 1e-4) {
          converged = true;
          break;
        }
        damping *= 8;
        if (damping > 1e12) break;
      }
    }
    this.cost(p);
    return { p, last, cost, converged };
  }

  private startVector(): Float64Array {
    const p = new Float64Array(SIZE);
    p[GAIN] = this.start.gain_dps2_per_us;
    p[LAG] = this.start.lag_s;
    p[DELAY] = this.start.delay_s;
    p[LEAD] = this.start.lead_s ?? 0;
    if (this.active.includes(LEAD)) p[DELAY] = Math.max(p[DELAY], 1e-4);
    p[DAMPING] = this.start.damping_per_s ?? 0;
    const { gyroVariance, drive, decay_per_s } = this.startNoise ?? this.guessNoise(p);
    p[VARIANCE] = Math.log(gyroVariance);
    p[DRIVE] = Math.log(drive);
    p[DECAY] = Math.log(decay_per_s);
    return p;
  }

  /** Gyro variance from third differences, disturbance from the acceleration the start model leaves over. */
  private guessNoise(p: Float64Array): NoiseParameters {
    this.simulate(p);
    let third = 0;
    let count = 0;
    let acceleration = 0;
    let spans = 0;
    this.pieces.forEach((piece, i) => {
      const r = this.residual[i];
      for (let k = 3; k < r.length; k++) {
        const value = r[k] - 3 * r[k - 1] + 3 * r[k - 2] - r[k - 3];
        if (Number.isNaN(value)) continue;
        third += value * value;
        count++;
      }
      const hop = Math.max(1, Math.round(0.1 / (piece.t_s[1] - piece.t_s[0])));
      let before = NaN;
      for (let k = hop; k < r.length; k += hop) {
        const slope = (r[k] - r[k - hop]) / (piece.t_s[k] - piece.t_s[k - hop]);
        if (!Number.isNaN(slope - before)) {
          acceleration += (slope - before) ** 2;
          spans++;
        }
        before = slope;
      }
    });
    const variance = Math.max(1e-10, third / Math.max(1, count) / 20);
    const perSpan = acceleration / Math.max(1, spans);
    // The change of a random-walk acceleration's mean over neighbouring spans of 0.1 s has variance 2/3 q h.
    const drive = Math.max(1e-6, (perSpan - (6 * variance) / 0.01) / 0.067, perSpan / 0.67);
    return { gyroVariance: variance, drive, decay_per_s: 1 };
  }

  private simulate(p: Float64Array): void {
    this.pieces.forEach((piece, i) => {
      const unit = this.unit[i];
      const r = this.residual[i];
      unitResponse(piece, shapeOf(p), this.trims[i], unit);
      for (let k = 0; k < r.length; k++) r[k] = piece.y_dps[k] - p[GAIN] * unit[k];
    });
  }

  /** Minus log likelihood (and prior) less constants; leaves residuals, gains and innovations behind. */
  private cost(p: Float64Array): number {
    this.simulate(p);
    const noise = noiseOf(p);
    const plant = filterPlant(p);
    let cost = priorCost(p);
    for (let i = 0; i < this.pieces.length; i++) {
      const filter = this.filters[i];
      const e = this.innovation[i];
      filter.prepare(noise, plant);
      filter.innovations(this.residual[i], e);
      const S = filter.variance;
      for (let k = this.first[i]; k < e.length; k++) {
        if (S[k] > 0) cost += 0.5 * (Math.log(S[k]) + (e[k] * e[k]) / S[k]);
      }
    }
    return Number.isFinite(cost) ? cost : Infinity;
  }

  /** Gradient and Fisher information at `p`, which `cost` must have been asked for last. */
  private derivatives(p: Float64Array): Evaluation {
    this.plantSlopes(p);
    this.noiseSlopes(p);
    const { active } = this;
    const size = active.length;
    const gradient = new Float64Array(size);
    const sums = new Float64Array(size * size);
    const row = new Float64Array(size);
    const logRow = new Float64Array(size);
    for (let i = 0; i < this.pieces.length; i++) {
      const e = this.innovation[i];
      const S = this.filters[i].variance;
      const slopes = active.map((place) => this.slopes[place][i]);
      const logs = active.map((place) =>
        place < VARIANCE ? null : this.varianceSlopes[place - VARIANCE][i],
      );
      for (let k = this.first[i]; k < e.length; k++) {
        if (S[k] === 0) continue;
        const per = 1 / S[k];
        const normalised = 1 - e[k] * e[k] * per;
        for (let a = 0; a < size; a++) {
          row[a] = slopes[a][k];
          const log = logs[a];
          logRow[a] = log === null ? 0 : log[k];
          gradient[a] += row[a] * e[k] * per + 0.5 * logRow[a] * normalised;
          for (let b = 0; b <= a; b++) {
            sums[a * size + b] += row[a] * row[b] * per + 0.5 * logRow[a] * logRow[b];
          }
        }
      }
    }
    const information = symmetric(sums, size, 1);
    addPrior(p, active, gradient, information);
    return { gradient, information };
  }

  /** ∂(innovation)/∂(plant parameter), with the filter's gains as prepared. */
  private plantSlopes(p: Float64Array): void {
    for (const place of this.active) {
      if (place >= VARIANCE) break;
      const step = place === LAG ? Math.max(1e-6, 2e-3 * p[LAG]) : PLANT_STEPS[place];
      this.pieces.forEach((piece, i) => {
        const high = this.work[i];
        if (place === GAIN) {
          const unit = this.unit[i];
          for (let k = 0; k < unit.length; k++) high[k] = -unit[k];
        } else {
          const low = this.lowWork[i];
          const moved = p.slice();
          moved[place] = p[place] + step;
          unitResponse(piece, shapeOf(moved), this.trims[i], high);
          moved[place] = p[place] - step;
          unitResponse(piece, shapeOf(moved), this.trims[i], low);
          for (let k = 0; k < high.length; k++) high[k] = (-p[GAIN] * (high[k] - low[k])) / (2 * step);
        }
        this.filters[i].innovations(high, this.slopes[place][i]);
      });
    }
  }

  /** ∂(innovation)/∂(noise parameter) and ∂ ln S/∂(noise parameter), by a small step each. */
  private noiseSlopes(p: Float64Array): void {
    for (let a = VARIANCE; a < SIZE; a++) {
      const moved = p.slice();
      moved[a] += NOISE_STEP;
      const noise = noiseOf(moved);
      this.pieces.forEach((piece, i) => {
        const filter = this.movedFilters[i];
        const out = this.slopes[a][i];
        const logs = this.varianceSlopes[a - VARIANCE][i];
        const e = this.innovation[i];
        const S = this.filters[i].variance;
        filter.prepare(noise, filterPlant(p));
        filter.innovations(this.residual[i], out);
        const moving = filter.variance;
        for (let k = 0; k < piece.t_s.length; k++) {
          out[k] = (out[k] - e[k]) / NOISE_STEP;
          logs[k] = S[k] > 0 ? Math.log(moving[k] / S[k]) / NOISE_STEP : 0;
        }
      });
    }
  }

  private bounded(p: Float64Array, step: Float64Array): Float64Array {
    const trial = p.slice();
    this.active.forEach((place, a) => {
      trial[place] += step[a];
    });
    // A step out of the range stops half-way to its border, so the search stays inside without sticking.
    const inside = (a: number, low: number, high: number) => {
      if (trial[a] <= low) trial[a] = (p[a] + low) / 2;
      else if (trial[a] >= high) trial[a] = (p[a] + high) / 2;
    };
    inside(LAG, SHORTEST_LAG_S, LONGEST_LAG_S);
    // Below zero the model would see commands that were computed from the very sample it foretells: through a
    // lead that is a leak; without one it is harmless for a little way and keeps the estimate unbiased.
    inside(DELAY, this.active.includes(LEAD) ? 0 : SHORTEST_DELAY_S, LONGEST_DELAY_S);
    inside(LEAD, -0.2, 2);
    inside(DAMPING, -2, 60);
    inside(DECAY, -7, 7);
    inside(DRIVE, p[DRIVE] - 3, p[DRIVE] + 3);
    inside(VARIANCE, p[VARIANCE] - 3, p[VARIANCE] + 3);
    return trial;
  }

  /** Normalised innovations that count, one gapless sequence per piece. */
  private normalised(source: readonly Float64Array[]): Float64Array[] {
    return source.map((e, i) => {
      const S = this.filters[i].variance;
      const out = new Float64Array(e.length - this.first[i]);
      let n = 0;
      for (let k = this.first[i]; k < e.length; k++) if (S[k] > 0) out[n++] = e[k] / Math.sqrt(S[k]);
      return out.subarray(0, n);
    });
  }

  /**
   * If the innovations are coloured, goes on with an autoregressive filter behind the disturbance filter.
   * Plant, drive and decay are fitted together with it; the gyro variance stays, since the filter's own
   * scale takes its place.
   */
  private whitened(p: Float64Array, last: Evaluation, cost: number, converged: boolean): AxisFit {
    let e = this.normalised(this.innovation);
    const order = whiteningOrder(autocovariance(e, LARGEST_ORDER), this.rows);
    if (order === 0) {
      return this.result(p, safeInverse(last.information), e, 0, 2 * cost, converged);
    }
    let at = p;
    let deviance = this.devianceOf(at, e, order);
    let joint = this.whitenedStep(at, e, order);
    let share = 1;
    for (let iteration = 0; iteration < MOST_WHITENED_ITERATIONS; iteration++) {
      if (!joint.step.some((value, a) => Math.abs(value) * share > 0.01 * joint.sigma[a])) break;
      const trial = this.bounded(
        at,
        joint.step.map((value) => share * value),
      );
      this.cost(trial);
      const candidate = this.normalised(this.innovation);
      const trialDeviance = this.devianceOf(trial, candidate, order);
      if (trialDeviance < deviance) {
        at = trial;
        e = candidate;
        deviance = trialDeviance;
        this.plantSlopes(at);
        this.noiseSlopes(at);
        joint = this.whitenedStep(at, e, order);
        share = Math.min(1, 2 * share);
      } else {
        share /= 4;
      }
    }
    const f = this.whitenedSequences(e, whiteningFilter(autocovariance(e, order), order));
    return this.result(at, joint.covariance, f, order, deviance, converged);
  }

  private whitenedSequences(e: readonly Float64Array[], a: Float64Array): Float64Array[] {
    return e.map((sequence) => {
      const out = new Float64Array(sequence.length);
      whiten(sequence, a, out);
      return out;
    });
  }

  private devianceOf(p: Float64Array, e: readonly Float64Array[], order: number): number {
    const a = whiteningFilter(autocovariance(e, order), order);
    let sum = 0;
    for (const f of this.whitenedSequences(e, a)) for (const value of f) sum += value * value;
    let logs = 0;
    for (let i = 0; i < this.pieces.length; i++) {
      const S = this.filters[i].variance;
      for (let k = this.first[i]; k < S.length; k++) if (S[k] > 0) logs += Math.log(S[k]);
    }
    const deviance = logs + this.rows * (1 + Math.log(sum / this.rows)) + 2 * priorCost(p);
    return Number.isFinite(deviance) ? deviance : Infinity;
  }

  /** One scoring step of plant, drive, decay and the whitening coefficients together. */
  private whitenedStep(p: Float64Array, e: readonly Float64Array[], order: number) {
    const places = this.active.filter((place) => place !== VARIANCE);
    const a = whiteningFilter(autocovariance(e, order), order);
    const slopes = places.map((place) => this.whitenedSequences(this.normalisedSlopes(place), a));
    const f = this.whitenedSequences(e, a);
    const count = places.length;
    const size = count + order;
    const sums = new Float64Array(size * size);
    const gradient = new Float64Array(size);
    let square = 0;
    f.forEach((errors, i) => {
      for (const value of errors) square += value * value;
      for (let x = 0; x < count; x++) {
        const slope = slopes[x][i];
        gradient[x] += product(slope, errors, 0);
        for (let y = 0; y <= x; y++) sums[x * size + y] += product(slope, slopes[y][i], 0);
        for (let j = 0; j < order; j++) sums[(count + j) * size + x] += product(slope, e[i], j + 1);
      }
    });
    // The coefficients' own block is the autocovariance; their gradient is zero by the Yule–Walker equations.
    const covariances = autocovariance(e, order);
    for (let j = 0; j < order; j++) {
      for (let k = 0; k <= j; k++) sums[(count + j) * size + count + k] = covariances[j - k];
    }
    const variance = square / this.rows;
    const information = symmetric(sums, size, 1 / variance);
    // Half of d(Σ ln S) belongs to the gradient as well; the squares above hold the rest.
    const total = Array.from(gradient, (value, x) => value / variance + this.logSlope(places[x]) / 2);
    const decay = places.indexOf(DECAY);
    const per = 1 / DECAY_PRIOR.sd ** 2;
    total[decay] += (p[DECAY] - DECAY_PRIOR.mean) * per;
    information.set(decay, decay, information.get(decay, decay) + per);
    const drive = places.indexOf(DRIVE);
    information.set(drive, drive, information.get(drive, drive) + 1e-6);
    const covariance = safeInverse(information);
    const step = new Float64Array(this.active.length);
    const sigma = new Float64Array(this.active.length).fill(Infinity);
    const solved = covariance.mmul(Matrix.columnVector(total));
    places.forEach((place, x) => {
      const a = this.active.indexOf(place);
      step[a] = -solved.get(x, 0);
      sigma[a] = Math.sqrt(covariance.get(x, x));
    });
    return { step, sigma, covariance };
  }

  /** Σ ∂ ln S/∂(noise parameter) over the rows that count; 0 for plant and whitening parameters. */
  private logSlope(place: number | undefined): number {
    if (place === undefined || place < VARIANCE) return 0;
    let sum = 0;
    for (let i = 0; i < this.pieces.length; i++) {
      const logs = this.varianceSlopes[place - VARIANCE][i];
      for (let k = this.first[i]; k < logs.length; k++) sum += logs[k];
    }
    return sum;
  }

  /** ∂(normalised innovation)/∂parameter, one gapless sequence per piece. */
  private normalisedSlopes(place: number): Float64Array[] {
    return this.slopes[place].map((slope, i) => {
      const S = this.filters[i].variance;
      const e = this.innovation[i];
      const logs = place >= VARIANCE ? this.varianceSlopes[place - VARIANCE][i] : null;
      const out = new Float64Array(slope.length - this.first[i]);
      let n = 0;
      for (let k = this.first[i]; k < slope.length; k++) {
        if (S[k] === 0) continue;
        out[n++] = (slope[k] - (logs === null ? 0 : 0.5 * e[k] * logs[k])) / Math.sqrt(S[k]);
      }
      return out.subarray(0, n);
    });
  }

  private result(
    p: Float64Array,
    covariance: Matrix,
    white: readonly Float64Array[],
    order: number,
    deviance: number,
    converged: boolean,
  ): AxisFit {
    const whiteness = whitenessScore(white, WHITENESS_LAGS, order);
    const widened = whiteness > NOT_WHITE ? NOT_WHITE_FACTOR : 1;
    const plantPlaces = this.active.filter((place) => place < VARIANCE);
    // Plant parameters come first in the covariance, in the order of `active`, with and without whitening.
    const estimate = (place: number): Estimate => {
      const a = this.active.indexOf(place);
      return { value: p[place], sigma: widened * Math.sqrt(Math.max(0, covariance.get(a, a))) };
    };
    return {
      gain_dps2_per_us: estimate(GAIN),
      lag_s: estimate(LAG),
      delay_s: estimate(DELAY),
      ...(this.active.includes(LEAD) ? { lead_s: estimate(LEAD) } : {}),
      ...(this.active.includes(DAMPING) ? { damping_per_s: estimate(DAMPING) } : {}),
      covariance: plantPlaces.map((_, a) =>
        plantPlaces.map((_unused, b) => widened * widened * covariance.get(a, b)),
      ),
      noise: noiseOf(p),
      whiteningOrder: order,
      whiteness,
      deviance,
      rows: this.rows,
      converged,
    };
  }
}

function shapeOf(p: Float64Array): PlantShape {
  return { lag_s: p[LAG], delay_s: p[DELAY], lead_s: p[LEAD], damping_per_s: p[DAMPING] };
}

function filterPlant(p: Float64Array): FilterPlant {
  return { gain: p[GAIN], lag_s: p[LAG], delay_s: p[DELAY], damping_per_s: p[DAMPING] };
}

/** Lower triangle, row by row, times `factor`, as a full matrix. */
function symmetric(sums: Float64Array, size: number, factor: number): Matrix {
  const matrix = Matrix.zeros(size, size);
  for (let a = 0; a < size; a++) {
    for (let b = 0; b <= a; b++) {
      matrix.set(a, b, sums[a * size + b] * factor);
      matrix.set(b, a, sums[a * size + b] * factor);
    }
  }
  return matrix;
}

function noiseOf(p: Float64Array): NoiseParameters {
  return {
    gyroVariance: Math.exp(p[VARIANCE]),
    drive: Math.exp(p[DRIVE]),
    decay_per_s: Math.exp(p[DECAY]),
  };
}

function priorCost(p: Float64Array): number {
  const off = (p[DECAY] - DECAY_PRIOR.mean) / DECAY_PRIOR.sd;
  return 0.5 * off * off;
}

function addPrior(
  p: Float64Array,
  active: readonly number[],
  gradient: Float64Array,
  information: Matrix,
): void {
  active.forEach((place, a) => {
    if (place === DECAY) {
      const per = 1 / DECAY_PRIOR.sd ** 2;
      gradient[a] += (p[DECAY] - DECAY_PRIOR.mean) * per;
      information.set(a, a, information.get(a, a) + per);
    } else if (place > DAMPING) {
      // Drive and variance: enough to keep the matrix regular when one of them vanishes.
      information.set(a, a, information.get(a, a) + 1e-6);
    }
  });
}

/** −(J + μ diag J)⁻¹ g. */
function dampedStep(at: Evaluation, damping: number): Float64Array {
  const size = at.gradient.length;
  const damped = at.information.clone();
  for (let a = 0; a < size; a++) damped.set(a, a, damped.get(a, a) * (1 + damping));
  const solved = safeInverse(damped).mmul(Matrix.columnVector(Array.from(at.gradient)));
  return Float64Array.from({ length: size }, (_, a) => -solved.get(a, 0));
}

/**
 * Inverse of an information matrix, scaled to a unit diagonal. Directions the data say nothing of get a very
 * large, not an infinite, variance.
 */
function safeInverse(information: Matrix): Matrix {
  const size = information.rows;
  const scale = Array.from(
    { length: size },
    (_, a) => 1 / Math.sqrt(Math.max(information.get(a, a), 1e-300)),
  );
  const unit = Matrix.zeros(size, size);
  for (let a = 0; a < size; a++) {
    for (let b = 0; b < size; b++) unit.set(a, b, information.get(a, b) * scale[a] * scale[b]);
  }
  const { eigenvectorMatrix: V, realEigenvalues } = new EigenvalueDecomposition(unit, {
    assumeSymmetric: true,
  });
  const out = Matrix.zeros(size, size);
  for (let a = 0; a < size; a++) {
    for (let b = 0; b <= a; b++) {
      let sum = 0;
      for (let k = 0; k < size; k++) {
        sum += (V.get(a, k) * V.get(b, k)) / Math.max(realEigenvalues[k], LEAST_EIGENVALUE);
      }
      out.set(a, b, sum * scale[a] * scale[b]);
      out.set(b, a, sum * scale[a] * scale[b]);
    }
  }
  return out;
}

/** Σ x_k y_{k−lag}. */
function product(x: Float64Array, y: Float64Array, lag: number): number {
  let sum = 0;
  for (let k = lag; k < x.length; k++) sum += x[k] * y[k - lag];
  return sum;
}

function predictedGain(at: Evaluation, step: Float64Array): number {
  return at.gradient.reduce((sum, value, a) => sum + value * step[a], 0) / 2;
}
