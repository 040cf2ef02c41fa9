/**
 * Fit of gain, lag and delay of one axis from closed-loop data: maximum likelihood of the innovations
 * (prediction errors) with the disturbance and the gyro noise estimated along with the plant, by Fisher
 * scoring with Levenberg's damping. Standard errors come from the joint information of plant and noise.
 *
 * Why this and not a plain output-error fit: the command carries the gyro's noise and answers the gusts, so a
 * fit that takes the noise as white is biased. Prediction errors with the right noise model are not (Ljung,
 * System Identification, 2nd ed., 13.4, direct method).
 */
import { CholeskyDecomposition, inverse, Matrix } from 'ml-matrix';
import type { AxisPiece, PlantParameters } from './axisData.ts';
import { DisturbanceFilter, type NoiseParameters } from './disturbanceFilter.ts';
import { meanCommand_us, unitResponse } from './plantResponse.ts';
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

/** Places in the parameter vector. */
const GAIN = 0;
const LAG = 1;
const DELAY = 2;
const VARIANCE = 3;
const DRIVE = 4;
const DECAY = 5;
const SIZE = 6;

const WARM_UP_S = 0.3;
const MOST_ITERATIONS = 40;
const SHORTEST_LAG_S = 2e-4;
const LONGEST_LAG_S = 2;
const LONGEST_DELAY_S = 0.25;
const LARGEST_ORDER = 32;
const WHITENESS_LAGS = 40;
/**
 * Weak prior of the disturbance's decay, ln λ ~ N(ln 1, 2²), and of the drive: keep the search finite when
 * there is no disturbance to speak of; they say nothing about the plant.
 */
const DECAY_PRIOR = { mean: 0, sd: 2 };
const NOISE_STEP = 1e-4;

/**
 * Fits the plant to all pieces together.
 * @param start where the search begins
 */
export function fitAxis(pieces: readonly AxisPiece[], start: PlantParameters): AxisFit {
  return new AxisFitter(pieces, start).run();
}

interface Evaluation {
  readonly gradient: Float64Array;
  readonly information: Matrix;
}

class AxisFitter {
  private readonly filters: DisturbanceFilter[];
  /** With one noise parameter moved, for its derivative. */
  private readonly movedFilters: DisturbanceFilter[];
  private readonly trims: number[];
  private readonly unit: Float64Array[];
  private readonly residual: Float64Array[];
  private readonly innovation: Float64Array[];
  private readonly work: Float64Array[];
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
  ) {
    const columns = () => pieces.map((piece) => new Float64Array(piece.t_s.length));
    this.filters = pieces.map((piece) => new DisturbanceFilter(piece));
    this.movedFilters = pieces.map((piece) => new DisturbanceFilter(piece));
    this.trims = pieces.map(meanCommand_us);
    this.unit = columns();
    this.residual = columns();
    this.innovation = columns();
    this.work = columns();
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

  run(): AxisFit {
    let p = this.startVector();
    let cost = this.cost(p);
    let damping = 1e-3;
    let converged = false;
    let last = this.derivatives(p);
    for (let iteration = 0; iteration < MOST_ITERATIONS; iteration++) {
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
    return this.whitened(p, last, cost, converged);
  }

  private startVector(): Float64Array {
    const p = new Float64Array(SIZE);
    p[GAIN] = this.start.gain_dps2_per_us;
    p[LAG] = this.start.lag_s;
    p[DELAY] = this.start.delay_s;
    p[DECAY] = 0;
    const { variance, drive } = this.guessNoise(p);
    p[VARIANCE] = Math.log(variance);
    p[DRIVE] = Math.log(drive);
    return p;
  }

  /** Gyro variance from third differences, disturbance from the acceleration the start model leaves over. */
  private guessNoise(p: Float64Array): { variance: number; drive: number } {
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
    return { variance, drive };
  }

  private simulate(p: Float64Array): void {
    this.pieces.forEach((piece, i) => {
      const unit = this.unit[i];
      const r = this.residual[i];
      unitResponse(piece, p[LAG], p[DELAY], this.trims[i], unit);
      for (let k = 0; k < r.length; k++) r[k] = piece.y_dps[k] - p[GAIN] * unit[k];
    });
  }

  /** Minus log likelihood (and prior) less constants; leaves residuals, gains and innovations behind. */
  private cost(p: Float64Array): number {
    this.simulate(p);
    const noise = noiseOf(p);
    let cost = priorCost(p);
    for (let i = 0; i < this.pieces.length; i++) {
      const filter = this.filters[i];
      const e = this.innovation[i];
      filter.prepare(noise, p[GAIN], p[LAG], p[DELAY]);
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
    const gradient = new Float64Array(SIZE);
    const information = Matrix.zeros(SIZE, SIZE);
    const row = new Float64Array(SIZE);
    const logRow = new Float64Array(SIZE);
    const sums = new Float64Array(SIZE * SIZE);
    for (let i = 0; i < this.pieces.length; i++) {
      const e = this.innovation[i];
      const S = this.filters[i].variance;
      const slopes = this.slopes.map((slope) => slope[i]);
      const logs = this.varianceSlopes.map((slope) => slope[i]);
      for (let k = this.first[i]; k < e.length; k++) {
        if (S[k] === 0) continue;
        const per = 1 / S[k];
        const normalised = 1 - e[k] * e[k] * per;
        for (let a = 0; a < SIZE; a++) {
          row[a] = slopes[a][k];
          logRow[a] = a >= VARIANCE ? logs[a - VARIANCE][k] : 0;
          gradient[a] += row[a] * e[k] * per + 0.5 * logRow[a] * normalised;
          for (let b = 0; b <= a; b++) sums[a * SIZE + b] += row[a] * row[b] * per + 0.5 * logRow[a] * logRow[b];
        }
      }
    }
    for (let a = 0; a < SIZE; a++) {
      for (let b = 0; b <= a; b++) {
        information.set(a, b, sums[a * SIZE + b]);
        information.set(b, a, sums[a * SIZE + b]);
      }
    }
    addPrior(p, gradient, information);
    return { gradient, information };
  }

  /** ∂(innovation)/∂(gain, lag, delay), with the filter's gains as prepared. */
  private plantSlopes(p: Float64Array): void {
    const lagStep = Math.max(1e-6, 2e-3 * p[LAG]);
    const delayStep = 2e-5;
    this.pieces.forEach((piece, i) => {
      const filter = this.filters[i];
      const high = this.work[i];
      const unit = this.unit[i];
      for (let k = 0; k < unit.length; k++) high[k] = -unit[k];
      filter.innovations(high, this.slopes[GAIN][i]);
      const difference = new Float64Array(unit.length);
      const through = (lagUp: number, delayUp: number, span: number, out: Float64Array) => {
        unitResponse(piece, p[LAG] + lagUp, p[DELAY] + delayUp, this.trims[i], high);
        unitResponse(piece, p[LAG] - lagUp, p[DELAY] - delayUp, this.trims[i], difference);
        for (let k = 0; k < high.length; k++) high[k] = (-p[GAIN] * (high[k] - difference[k])) / span;
        filter.innovations(high, out);
      };
      through(lagStep, 0, 2 * lagStep, this.slopes[LAG][i]);
      through(0, delayStep, 2 * delayStep, this.slopes[DELAY][i]);
    });
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
        filter.prepare(noise, p[GAIN], p[LAG], p[DELAY]);
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
    const trial = p.map((value, a) => value + step[a]);
    // A step out of the range stops half-way to its border, so the search stays inside without sticking.
    const inside = (a: number, low: number, high: number) => {
      if (trial[a] <= low) trial[a] = (p[a] + low) / 2;
      else if (trial[a] >= high) trial[a] = (p[a] + high) / 2;
    };
    inside(LAG, SHORTEST_LAG_S, LONGEST_LAG_S);
    inside(DELAY, -0.02, LONGEST_DELAY_S);
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
   * If the innovations are coloured, goes on with an autoregressive filter behind the disturbance filter
   * (which stays as it is), fitted together with the plant.
   */
  private whitened(p: Float64Array, last: Evaluation, cost: number, converged: boolean): AxisFit {
    let e = this.normalised(this.innovation);
    const order = whiteningOrder(autocovariance(e, LARGEST_ORDER), this.rows);
    if (order === 0) {
      const covariance = inverse(last.information);
      return this.result(p, covariance, e, 0, 2 * cost, converged);
    }
    let plant: Float64Array = p.slice();
    let information = Matrix.eye(1);
    let deviance = 2 * cost;
    for (let iteration = 0; iteration < 6; iteration++) {
      const joint = this.whitenedStep(e, order);
      information = joint.information;
      deviance = joint.deviance;
      const trial = this.bounded(plant, joint.step);
      const moved = joint.step.some((value, a) => Math.abs(value) > 0.02 * joint.sigma[a]);
      if (!moved) break;
      this.cost(trial);
      const candidate = this.normalised(this.innovation);
      const r = autocovariance(candidate, order);
      if (!(this.devianceOf(candidate, whiteningFilter(r, order)) <= deviance + 1e-6)) {
        this.cost(plant);
        break;
      }
      plant = trial;
      e = candidate;
      this.plantSlopes(plant);
    }
    const covariance = inverse(information);
    const f = this.whitenedSequences(e, whiteningFilter(autocovariance(e, order), order));
    return this.result(plant, covariance, f, order, deviance, converged);
  }

  private whitenedSequences(e: readonly Float64Array[], a: Float64Array): Float64Array[] {
    return e.map((sequence) => {
      const out = new Float64Array(sequence.length);
      whiten(sequence, a, out);
      return out;
    });
  }

  private devianceOf(e: readonly Float64Array[], a: Float64Array): number {
    let sum = 0;
    for (const f of this.whitenedSequences(e, a)) for (const value of f) sum += value * value;
    let logs = 0;
    for (let i = 0; i < this.pieces.length; i++) {
      const S = this.filters[i].variance;
      for (let k = this.first[i]; k < S.length; k++) if (S[k] > 0) logs += Math.log(S[k]);
    }
    return logs + this.rows * (1 + Math.log(sum / this.rows));
  }

  /** One scoring step of gain, lag, delay and the whitening coefficients together. */
  private whitenedStep(e: readonly Float64Array[], order: number) {
    const a = whiteningFilter(autocovariance(e, order), order);
    const slopes = [GAIN, LAG, DELAY].map((place) =>
      this.whitenedSequences(this.normalised(this.slopes[place]), a),
    );
    const f = this.whitenedSequences(e, a);
    const size = 3 + order;
    const sums = new Float64Array(size * size);
    const gradient = new Float64Array(size);
    const row = new Float64Array(size);
    let square = 0;
    for (let i = 0; i < f.length; i++) {
      for (let k = order; k < f[i].length; k++) {
        for (let j = 0; j < 3; j++) row[j] = slopes[j][i][k];
        for (let j = 0; j < order; j++) row[3 + j] = e[i][k - 1 - j];
        square += f[i][k] * f[i][k];
        for (let x = 0; x < size; x++) {
          gradient[x] += row[x] * f[i][k];
          for (let y = 0; y <= x; y++) sums[x * size + y] += row[x] * row[y];
        }
      }
    }
    const variance = square / this.rows;
    const information = Matrix.zeros(size, size);
    for (let x = 0; x < size; x++) {
      for (let y = 0; y <= x; y++) {
        information.set(x, y, sums[x * size + y] / variance);
        information.set(y, x, sums[x * size + y] / variance);
      }
    }
    const solved = new CholeskyDecomposition(information).solve(
      Matrix.columnVector(Array.from(gradient, (value) => value / variance)),
    );
    const covariance = inverse(information);
    const step = new Float64Array(SIZE);
    const sigma = new Float64Array(SIZE).fill(Infinity);
    for (let j = 0; j < 3; j++) {
      step[j] = -solved.get(j, 0);
      sigma[j] = Math.sqrt(covariance.get(j, j));
    }
    return { step, sigma, information, deviance: this.devianceOf(e, a) };
  }

  private result(
    p: Float64Array,
    covariance: Matrix,
    white: readonly Float64Array[],
    order: number,
    deviance: number,
    converged: boolean,
  ): AxisFit {
    const estimate = (place: number): Estimate => ({
      value: p[place],
      sigma: Math.sqrt(Math.max(0, covariance.get(place, place))),
    });
    return {
      gain_dps2_per_us: estimate(GAIN),
      lag_s: estimate(LAG),
      delay_s: estimate(DELAY),
      noise: noiseOf(p),
      whiteningOrder: order,
      whiteness: whitenessScore(white, WHITENESS_LAGS, order),
      deviance,
      rows: this.rows,
      converged,
    };
  }
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

function addPrior(p: Float64Array, gradient: Float64Array, information: Matrix): void {
  const per = 1 / DECAY_PRIOR.sd ** 2;
  gradient[DECAY] += (p[DECAY] - DECAY_PRIOR.mean) * per;
  information.set(DECAY, DECAY, information.get(DECAY, DECAY) + per);
  // Drive and variance: enough to keep the matrix regular when one of them vanishes.
  for (const a of [VARIANCE, DRIVE]) information.set(a, a, information.get(a, a) + 1e-6);
}

/** −(J + μ diag J)⁻¹ g. */
function dampedStep(at: Evaluation, damping: number): Float64Array {
  const damped = at.information.clone();
  for (let a = 0; a < SIZE; a++) damped.set(a, a, damped.get(a, a) * (1 + damping));
  const solved = new CholeskyDecomposition(damped).solve(Matrix.columnVector(Array.from(at.gradient)));
  return Float64Array.from({ length: SIZE }, (_, a) => -solved.get(a, 0));
}

function predictedGain(at: Evaluation, step: Float64Array): number {
  let sum = 0;
  for (let a = 0; a < SIZE; a++) sum += at.gradient[a] * step[a];
  return sum / 2;
}
