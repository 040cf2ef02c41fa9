/**
 * Response of the plant to the logged command, exact for a command that is held between rows: the lag and the
 * two integrations are solved in closed form from event to event, so that the delay is a continuous number and
 * jittered or lost rows need no resampling.
 */
import type { AxisPiece } from './axisData.ts';

/** Steps equal within this share a cached exponential. */
const SAME_STEP_S = 1e-10;

/**
 * Rate response at the piece's instants for unit gain, from rest, to the command less `trim_us`, deg/s per
 * (deg/s² per µs). The command of row j acts from t_j + delay_s; before the first it is the first.
 * @param delay_s may be below 0 (the fit looks on both sides of zero)
 */
export function unitResponse(
  piece: AxisPiece,
  lag_s: number,
  delay_s: number,
  trim_us: number,
  out: Float64Array,
): void {
  const { t_s, u_us } = piece;
  const n = t_s.length;
  let active = 0;
  while (active + 1 < n && t_s[active + 1] + delay_s <= t_s[0]) active++;
  let input = u_us[active] - trim_us;
  let acceleration = input;
  let rate = 0;
  let now = t_s[0];
  let cachedStepA = -1;
  let cachedDecayA = 0;
  let cachedStepB = -1;
  let cachedDecayB = 0;
  out[0] = 0;
  for (let k = 1; k < n; k++) {
    const end = t_s[k];
    while (now < end) {
      const event = active + 1 < n ? t_s[active + 1] + delay_s : Infinity;
      const stop = event < end ? event : end;
      const h = stop - now;
      let decay: number;
      if (Math.abs(h - cachedStepA) < SAME_STEP_S) decay = cachedDecayA;
      else if (Math.abs(h - cachedStepB) < SAME_STEP_S) decay = cachedDecayB;
      else {
        decay = Math.exp(-h / lag_s);
        cachedStepB = cachedStepA;
        cachedDecayB = cachedDecayA;
        cachedStepA = h;
        cachedDecayA = decay;
      }
      const excess = acceleration - input;
      rate += input * h + excess * lag_s * (1 - decay);
      acceleration = input + excess * decay;
      now = stop;
      if (event <= end) {
        active++;
        input = u_us[active] - trim_us;
      }
    }
    out[k] = rate;
  }
}

/** Mean command of a piece, µs: taken out before the response, so that it starts near rest. */
export function meanCommand_us(piece: AxisPiece): number {
  let sum = 0;
  for (const value of piece.u_us) sum += value;
  return sum / piece.u_us.length;
}
