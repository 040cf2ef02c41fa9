/**
 * A loop on a fixed grid of frequencies with the parts that P, I and D multiply worked out once: a search over the
 * gains then costs a few multiplications a frequency. Good to about 0.1 %; what is found is checked exactly.
 */
import type { GyroNoise } from './noise.ts';
import { onCircle, partsAt, withGainsOf, type RateLoop } from './rateLoop.ts';

export interface PidGains {
  readonly p_us_per_dps: number;
  readonly i_us_per_deg: number;
  readonly d_us_per_dps2: number;
}

export interface GridMargins {
  readonly maxSensitivity: number;
  /** 180° where the gain does not cross 1. */
  readonly phaseMargin_deg: number;
  /** Infinity where the gain does not cross 1. */
  readonly delayMargin_ms: number;
  /** Highest crossing, rad/s; 0 when there is none. */
  readonly lastCrossover_radps: number;
  readonly noise_us: number;
}

const POINTS = 360;
const LOW_SHARE = 2e-4;

export class GridLoop {
  private readonly omegas = new Float64Array(POINTS);
  /** Plant, and the gyro filters times 1, the integrator and the derivative. */
  private readonly plantRe = new Float64Array(POINTS);
  private readonly plantIm = new Float64Array(POINTS);
  private readonly bases = Array.from({ length: 6 }, () => new Float64Array(POINTS));
  /** Share of the noise's power that falls to each frequency, deg²/s². */
  private readonly noisePower = new Float64Array(POINTS);

  constructor(loop: RateLoop, noise: GyroNoise) {
    const units = [
      { p_us_per_dps: 1, i_us_per_deg: 0, d_us_per_dps2: 0 },
      { p_us_per_dps: 0, i_us_per_deg: 1, d_us_per_dps2: 0 },
      { p_us_per_dps: 0, i_us_per_deg: 0, d_us_per_dps2: 1 },
    ].map((gains) => withGainsOf(loop, gains));
    const top = Math.PI / loop.tick_s;
    for (let k = 0; k < POINTS; k++) {
      const omega = top * LOW_SHARE ** (1 - k / (POINTS - 1));
      const at = onCircle(omega * loop.tick_s);
      this.omegas[k] = omega;
      units.forEach((unit, part) => {
        const { plant, feedback } = partsAt(unit, at);
        this.plantRe[k] = plant.re;
        this.plantIm[k] = plant.im;
        this.bases[2 * part][k] = feedback.re;
        this.bases[2 * part + 1][k] = feedback.im;
      });
    }
    this.spread(noise, loop.tick_s);
  }

  private spread(noise: GyroNoise, tick_s: number): void {
    const rho = noise.correlation;
    for (let k = 0; k < POINTS; k++) {
      const left = this.omegas[Math.max(0, k - 1)];
      const right = this.omegas[Math.min(POINTS - 1, k + 1)];
      const colour = (1 - rho * rho) / (1 + rho * rho - 2 * rho * Math.cos(this.omegas[k] * tick_s));
      this.noisePower[k] = (noise.sigma_dps ** 2 * colour * tick_s * (right - left)) / (2 * Math.PI);
    }
  }

  /** @param scale of the plant's gain */
  margins(gains: PidGains, scale: number): GridMargins {
    const { p_us_per_dps: p, i_us_per_deg: i, d_us_per_dps2: d } = gains;
    const [pRe, pIm, iRe, iIm, dRe, dIm] = this.bases;
    let leastReturn = Infinity;
    let phaseMargin = Math.PI;
    let delay_s = Infinity;
    let lastCrossover = 0;
    let noise = 0;
    let lastLog = 0;
    let lastLag = 0;
    for (let k = 0; k < POINTS; k++) {
      const fRe = p * pRe[k] + i * iRe[k] + d * dRe[k];
      const fIm = p * pIm[k] + i * iIm[k] + d * dIm[k];
      const re = scale * (this.plantRe[k] * fRe - this.plantIm[k] * fIm);
      const im = scale * (this.plantRe[k] * fIm + this.plantIm[k] * fRe);
      const back = (1 + re) * (1 + re) + im * im;
      leastReturn = Math.min(leastReturn, back);
      noise += (this.noisePower[k] * (fRe * fRe + fIm * fIm)) / back;
      const log = 0.5 * Math.log(re * re + im * im);
      // Room to −180°, 0 … 2π.
      const lag = Math.atan2(im, re) + Math.PI;
      if (k > 0 && lastLog > 0 !== log > 0) {
        const share = lastLog / (lastLog - log);
        const turned = lag - lastLag - 2 * Math.PI * Math.round((lag - lastLag) / (2 * Math.PI));
        const room = lastLag + share * turned;
        const omega = this.omegas[k - 1] * (this.omegas[k] / this.omegas[k - 1]) ** share;
        phaseMargin = Math.min(phaseMargin, Math.abs(room > Math.PI ? room - 2 * Math.PI : room));
        delay_s = Math.min(delay_s, (room <= 0 ? room + 2 * Math.PI : room) / omega);
        lastCrossover = omega;
      }
      lastLog = log;
      lastLag = lag;
    }
    return {
      maxSensitivity: 1 / Math.sqrt(leastReturn),
      phaseMargin_deg: (phaseMargin * 180) / Math.PI,
      delayMargin_ms: 1000 * delay_s,
      lastCrossover_radps: lastCrossover,
      noise_us: Math.sqrt(noise),
    };
  }

  /** P that brings the crossover of P alone to `omega`. */
  gainForCrossover(omega: number): number {
    let k = this.omegas.findIndex((one) => one >= omega);
    if (k === -1) k = POINTS - 1;
    const size =
      Math.hypot(this.plantRe[k], this.plantIm[k]) * Math.hypot(this.bases[0][k], this.bases[1][k]);
    return 1 / Math.max(1e-12, size);
  }
}
