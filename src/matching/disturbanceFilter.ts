/**
 * What is left of the measured rate after the plant's response, as a process: the integral of a coloured
 * disturbance (Ornstein–Uhlenbeck angular acceleration, gusts) and of a constant one (trim), plus white gyro
 * noise. The Kalman filter turns it into white innovations, which makes the fit one of prediction errors and
 * therefore right in closed loop, where the command depends on the noise (Ljung, System Identification, 2nd
 * ed., 13.4; for the likelihood, Schweppe 1965).
 *
 * States: rate w, disturbance d, constant acceleration b, and a, the acceleration caused by the error of
 * commands that were put in for lost rows:  w' = −c w + d + b + a (c: damping),  d' = −λ d + noise q,  b' = 0,  a' = −a/τ.
 */
import type { AxisPiece } from './axisData.ts';

export interface NoiseParameters {
  /** Variance of the gyro noise per sample, (deg/s)². */
  readonly gyroVariance: number;
  /** Intensity q of the noise that drives the disturbance, (deg/s²)²/s. */
  readonly drive: number;
  /** λ, 1/s: how fast the disturbance forgets. */
  readonly decay_per_s: number;
}

/** What of the plant the filter needs: damping for all that acts on the rate, the rest for put-in commands. */
export interface FilterPlant {
  readonly gain: number;
  readonly lag_s: number;
  readonly delay_s: number;
  readonly damping_per_s: number;
}

const START_RATE_DPS = 1e4;
const START_TRIM_DPS2 = 1e4;
const SAME_STEP_S = 1e-10;
/** Below this λh the process covariance comes from its series. */
const SERIES_BELOW = 0.02;

/** Gains and innovation variances of one piece, and the filter that uses them. Reused, never shared. */
export class DisturbanceFilter {
  /** Innovation variance per row, (deg/s)²; 0 in a lost row. */
  readonly variance: Float64Array;
  private readonly gainW: Float64Array;
  private readonly gainD: Float64Array;
  private readonly gainB: Float64Array;
  private readonly gainA: Float64Array;
  private readonly keepW: Float64Array;
  private readonly throughB: Float64Array;
  private readonly throughD: Float64Array;
  private readonly keepD: Float64Array;
  private readonly throughA: Float64Array;
  private readonly keepA: Float64Array;
  /** Error of a put-in command, µs, at the row in which it is felt. */
  private readonly felt_us: Float64Array;

  constructor(private readonly piece: AxisPiece) {
    const n = piece.t_s.length;
    const column = () => new Float64Array(n);
    this.variance = column();
    this.gainW = column();
    this.gainD = column();
    this.gainB = column();
    this.gainA = column();
    this.keepW = column();
    this.throughB = column();
    this.throughD = column();
    this.keepD = column();
    this.throughA = column();
    this.keepA = column();
    this.felt_us = column();
  }

  /** Riccati recursion along the piece: fills gains and variances for these parameters. */
  prepare(noise: NoiseParameters, plant: FilterPlant): void {
    const { gain, lag_s, damping_per_s } = plant;
    this.placeErrors(plant.delay_s);
    const { t_s, y_dps } = this.piece;
    const felt_us = this.felt_us;
    const { gyroVariance: R, drive: q, decay_per_s: lambda } = noise;
    const n = t_s.length;
    let pww = START_RATE_DPS ** 2;
    let pwd = 0;
    let pwb = 0;
    let pwa = 0;
    let pdd = q / (2 * lambda);
    let pdb = 0;
    let pda = 0;
    let pbb = START_TRIM_DPS2 ** 2;
    let pba = 0;
    let paa = 0;
    let h = -1;
    let kept = 1;
    let through = 0;
    let c = 0;
    let e = 1;
    let ca = 0;
    let ea = 1;
    let qww = 0;
    let qwd = 0;
    let qdd = 0;
    for (let k = 0; k < n; k++) {
      if (k > 0) {
        const dt = t_s[k] - t_s[k - 1];
        if (Math.abs(dt - h) > SAME_STEP_S) {
          h = dt;
          const x = lambda * h;
          e = Math.exp(-x);
          c = x < 1e-5 ? h * (1 - x / 2) : (1 - e) / lambda;
          kept = Math.exp(-damping_per_s * h);
          through = h * (1 - (damping_per_s * h) / 2);
          ea = Math.exp(-h / lag_s);
          ca = lag_s * (1 - ea);
          if (x < SERIES_BELOW) {
            qww = q * h * h * h * (1 / 3 - x / 4 + (7 / 60) * x * x);
            qwd = q * h * h * (1 / 2 - x / 2 + (7 / 24) * x * x);
            qdd = q * h * (1 - x + (2 / 3) * x * x);
          } else {
            const squared = 1 - e * e;
            qww = (q / (lambda * lambda)) * (h - 2 * c + squared / (2 * lambda));
            qwd = (q / 2) * c * c;
            qdd = (q * squared) / (2 * lambda);
          }
        }
        // F P Fᵀ + Q with F: w = kept w + c d + through b + ca a, d *= e, a *= ea. Damping acts little within a
        // step: it is left out of c, ca and Q.
        const rw = kept * pww + c * pwd + through * pwb + ca * pwa;
        const rd = kept * pwd + c * pdd + through * pdb + ca * pda;
        const rb = kept * pwb + c * pdb + through * pbb + ca * pba;
        const ra = kept * pwa + c * pda + through * pba + ca * paa;
        pww = kept * rw + c * rd + through * rb + ca * ra + qww;
        pwd = e * rd + qwd;
        pwb = rb;
        pwa = ea * ra;
        pdd = e * e * pdd + qdd;
        pdb = e * pdb;
        pda = e * ea * pda;
        pba = ea * pba;
        paa = ea * ea * paa;
        // A command that was put in is wrong by uError: an impulse of acceleration, K·h/τ of it.
        const error = felt_us[k];
        if (error > 0) {
          const kick = gain * (1 - ea) * error;
          paa += kick * kick;
        }
      }
      this.keepW[k] = kept;
      this.throughB[k] = through;
      this.throughD[k] = c;
      this.keepD[k] = e;
      this.throughA[k] = ca;
      this.keepA[k] = ea;
      if (Number.isNaN(y_dps[k])) {
        this.variance[k] = 0;
        this.gainW[k] = this.gainD[k] = this.gainB[k] = this.gainA[k] = 0;
        continue;
      }
      const S = pww + R;
      const kw = pww / S;
      const kd = pwd / S;
      const kb = pwb / S;
      const ka = pwa / S;
      this.variance[k] = S;
      this.gainW[k] = kw;
      this.gainD[k] = kd;
      this.gainB[k] = kb;
      this.gainA[k] = ka;
      pdd -= kd * pwd;
      pdb -= kd * pwb;
      pda -= kd * pwa;
      pbb -= kb * pwb;
      pba -= kb * pwa;
      paa -= ka * pwa;
      // (1 − kw) = R/S, without the cancellation of a large start variance.
      const left = R / S;
      pww *= left;
      pwd *= left;
      pwb *= left;
      pwa *= left;
    }
  }

  /** The command of row k acts from t_k + delay to t_(k+1) + delay: its error is put into the row after the middle. */
  private placeErrors(delay_s: number): void {
    const { t_s, uError_us } = this.piece;
    const felt = this.felt_us.fill(0);
    for (let k = 0; k + 1 < t_s.length; k++) {
      if (uError_us[k] === 0) continue;
      const middle = (t_s[k] + t_s[k + 1]) / 2 + delay_s;
      let row = Math.max(1, k);
      while (row < t_s.length && t_s[row] <= middle) row++;
      if (row < t_s.length) felt[row] = Math.hypot(felt[row], uError_us[k]);
    }
  }

  /**
   * Innovations of `residual` (measured rate less response) with the gains prepared; 0 in lost rows.
   * Linear in the residual, so derivatives of the residual go through it as well.
   */
  innovations(residual: Float64Array, out: Float64Array): void {
    const { gainW, gainD, gainB, gainA, variance } = this;
    const { keepW, throughB, throughD, keepD, throughA, keepA } = this;
    const n = residual.length;
    let w = 0;
    let d = 0;
    let b = 0;
    let a = 0;
    for (let k = 0; k < n; k++) {
      if (k > 0) {
        w = keepW[k] * w + throughD[k] * d + throughB[k] * b + throughA[k] * a;
        d *= keepD[k];
        a *= keepA[k];
      }
      if (variance[k] === 0) {
        out[k] = 0;
        continue;
      }
      const innovation = residual[k] - w;
      out[k] = innovation;
      w += gainW[k] * innovation;
      d += gainD[k] * innovation;
      b += gainB[k] * innovation;
      a += gainA[k] * innovation;
    }
  }

  /**
   * What the residual is expected to be, `horizon` rows at a time, from what is known at each horizon's start.
   * Rows before `first` are NaN.
   */
  forecast(residual: Float64Array, first: number, horizon: number, out: Float64Array): void {
    const { gainW, gainD, gainB, gainA, variance } = this;
    const { keepW, throughB, throughD, keepD, throughA, keepA } = this;
    const known = { w: 0, d: 0, b: 0, a: 0 };
    const ahead = { w: 0, d: 0, b: 0, a: 0 };
    const step = (s: typeof known, k: number) => {
      s.w = keepW[k] * s.w + throughD[k] * s.d + throughB[k] * s.b + throughA[k] * s.a;
      s.d *= keepD[k];
      s.a *= keepA[k];
    };
    for (let k = 0; k < residual.length; k++) {
      if (k > 0) {
        step(known, k);
        step(ahead, k);
      }
      if (k >= first && (k - first) % horizon === 0) Object.assign(ahead, known);
      out[k] = k >= first ? ahead.w : NaN;
      if (variance[k] === 0) continue;
      const innovation = residual[k] - known.w;
      known.w += gainW[k] * innovation;
      known.d += gainD[k] * innovation;
      known.b += gainB[k] * innovation;
      known.a += gainA[k] * innovation;
    }
  }
}
