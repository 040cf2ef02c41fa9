/**
 * Any axis response told as the plant K e^(−sTd)/(s(τs+1)) over the band in which rate loops cross over, with
 * the weights of shaping's own reduction, so that a fit and a build's model are compared in one measure.
 */
import type { PlantParameters } from './axisData.ts';

const LOW_HZ = 2;
const HIGH_HZ = 25;
const POINTS = 40;
const ROUNDS = 26;
/** 1 dB counts as much as 7.57° (Tischler & Remple, ch. 11). */
const DEG_PER_DB = 7.57;

/** Magnitude (dB) and phase (rad) of rate/u at `omega`, rad/s. */
export type ResponseAt = (omega: number) => { readonly re: number; readonly im: number };

export interface ReducedPlant {
  readonly plant: PlantParameters;
  /** Largest error over the band. */
  readonly error_dB: number;
  readonly error_deg: number;
}

/** Response of a plant with its optional terms. */
export function responseOf(plant: PlantParameters): ResponseAt {
  const { gain_dps2_per_us: K, lag_s, delay_s, lead_s = 0, damping_per_s = 0 } = plant;
  return (omega) => {
    const magnitude =
      (K * Math.hypot(1, omega * lead_s)) / (Math.hypot(damping_per_s, omega) * Math.hypot(1, omega * lag_s));
    const phase =
      Math.atan(omega * lead_s) -
      Math.atan2(omega, damping_per_s) -
      Math.atan(omega * lag_s) -
      omega * delay_s;
    return { re: magnitude * Math.cos(phase), im: magnitude * Math.sin(phase) };
  };
}

/** Least squares in dB and degrees: lag and delay by a coarse-to-fine search, the gain in closed form. */
export function reducePlant(response: ResponseAt): ReducedPlant {
  const omegas = Float64Array.from(
    { length: POINTS },
    (_, i) => 2 * Math.PI * LOW_HZ * (HIGH_HZ / LOW_HZ) ** (i / (POINTS - 1)),
  );
  const dB = new Float64Array(POINTS);
  const rad = new Float64Array(POINTS);
  omegas.forEach((omega, i) => {
    const { re, im } = response(omega);
    // Against the integrator 1/s: what is left is gain, lag and delay.
    dB[i] = 20 * Math.log10(omega * Math.hypot(re, im));
    rad[i] = Math.atan2(re, -im);
  });
  // The sign of the gain is that of the response at the band's low end.
  const negative = Math.cos(rad[0]) < 0;
  if (negative) for (let i = 0; i < POINTS; i++) rad[i] += Math.PI;
  const left_dB = new Float64Array(POINTS);
  const trial = (lag_s: number, delay_s: number) => {
    let mean = 0;
    for (let i = 0; i < POINTS; i++) {
      left_dB[i] = dB[i] + 10 * Math.log10(1 + (omegas[i] * lag_s) ** 2);
      mean += left_dB[i] / POINTS;
    }
    let cost = 0;
    let error_dB = 0;
    let error_deg = 0;
    for (let i = 0; i < POINTS; i++) {
      const off = wrapped(rad[i] + Math.atan(omegas[i] * lag_s) + omegas[i] * delay_s) * (180 / Math.PI);
      const apart = Math.abs(left_dB[i] - mean);
      cost += apart * apart + (off / DEG_PER_DB) ** 2;
      if (apart > error_dB) error_dB = apart;
      if (Math.abs(off) > error_deg) error_deg = Math.abs(off);
    }
    return { lag_s, delay_s, cost, error_dB, error_deg, gain: 10 ** (mean / 20) };
  };
  let best = trial(0.03, 0.002);
  let lagSpan = 2.5;
  let delaySpan = 0.02;
  for (let round = 0; round < ROUNDS; round++) {
    const centre = best;
    for (let a = -4; a <= 4; a++) {
      for (let b = -4; b <= 4; b++) {
        const delay_s = Math.max(0, centre.delay_s + (delaySpan * b) / 4);
        const result = trial(centre.lag_s * Math.exp((lagSpan * a) / 4), delay_s);
        if (result.cost < best.cost) best = result;
      }
    }
    lagSpan *= 0.6;
    delaySpan *= 0.6;
  }
  const { lag_s, delay_s, error_dB, error_deg } = best;
  return {
    plant: { gain_dps2_per_us: negative ? -best.gain : best.gain, lag_s, delay_s },
    error_dB,
    error_deg,
  };
}

function wrapped(angle: number): number {
  return angle - 2 * Math.PI * Math.round(angle / (2 * Math.PI));
}
