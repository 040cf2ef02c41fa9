/**
 * Response of the plant to the logged command, exact for a command that is held between rows: lag, damping and
 * integration are solved in closed form from event to event, so that the delay is a continuous number and
 * jittered or lost rows need no resampling.
 */
import type { AxisPiece } from './axisData.ts';

/** Steps equal within this share a cached exponential. */
const SAME_STEP_S = 1e-10;
/** Damping below this is none: the closed form divides by it. */
const LEAST_DAMPING_PER_S = 1e-6;

/** The plant less its gain. */
export interface PlantShape {
  readonly lag_s: number;
  /** May be below 0: the fit looks on both sides of zero. */
  readonly delay_s: number;
  readonly lead_s: number;
  readonly damping_per_s: number;
}

/**
 * Rate response at the piece's instants for unit gain, from rest, to the command less `trim_us`, deg/s per
 * (deg/s² per µs). The command of row j acts from t_j + delay; before the first it is the first.
 */
export function unitResponse(piece: AxisPiece, shape: PlantShape, trim_us: number, out: Float64Array): void {
  const { t_s, u_us } = piece;
  const { lag_s, delay_s, lead_s, damping_per_s } = shape;
  const damped = Math.abs(damping_per_s) > LEAST_DAMPING_PER_S;
  // (damping − 1/τ) of the closed form; equal rates are moved apart by a hair.
  const apart = damping_per_s - 1 / lag_s;
  const perApart = 1 / (Math.abs(apart) < 1e-6 ? 1e-6 : apart);
  const n = t_s.length;
  let active = 0;
  while (active + 1 < n && t_s[active + 1] + delay_s <= t_s[0]) active++;
  let input = u_us[active] - trim_us;
  let acceleration = input;
  let rate = 0;
  let now = t_s[0];
  let stepA = -1;
  let lagA = 0;
  let keepA = 1;
  let stepB = -1;
  let lagB = 0;
  let keepB = 1;
  out[0] = 0;
  for (let k = 1; k < n; k++) {
    const end = t_s[k];
    while (now < end) {
      const event = active + 1 < n ? t_s[active + 1] + delay_s : Infinity;
      const stop = event < end ? event : end;
      const h = stop - now;
      if (Math.abs(h - stepA) >= SAME_STEP_S) {
        // The other of the two steps that alternate, or a new one.
        const [oldStep, oldLag, oldKeep] = [stepA, lagA, keepA];
        if (Math.abs(h - stepB) < SAME_STEP_S) {
          stepA = stepB;
          lagA = lagB;
          keepA = keepB;
        } else {
          stepA = h;
          lagA = Math.exp(-h / lag_s);
          keepA = damped ? Math.exp(-damping_per_s * h) : 1;
        }
        stepB = oldStep;
        lagB = oldLag;
        keepB = oldKeep;
      }
      const excess = acceleration - input;
      if (damped) {
        rate = rate * keepA + (input * (1 - keepA)) / damping_per_s + excess * (lagA - keepA) * perApart;
      } else {
        rate += input * h + excess * lag_s * (1 - lagA);
      }
      acceleration = input + excess * lagA;
      now = stop;
      if (event <= end) {
        active++;
        input = u_us[active] - trim_us;
      }
    }
    // (1 + lead s): the rate and lead times its derivative, which is the lagged command less the damping.
    out[k] = rate + lead_s * (acceleration - damping_per_s * rate);
  }
}

/** Mean command of a piece, µs: taken out before the response, so that it starts near rest. */
export function meanCommand_us(piece: AxisPiece): number {
  let sum = 0;
  for (const value of piece.u_us) sum += value;
  return sum / piece.u_us.length;
}
