/** Rise, overshoot and settling of a step response, from its samples. */
export interface StepMetrics {
  /** 10 to 90 % of the final value, s. */
  readonly rise_s: number | null;
  readonly overshoot_pct: number | null;
  /** Until it stays within 2 % of the final value, s. */
  readonly settle_s: number | null;
}

export const NO_STEP: StepMetrics = { rise_s: null, overshoot_pct: null, settle_s: null };

/** Samples `y` at `t_s` that go to `final`; between samples by straight lines. Null: not reached in the record. */
export function stepInfo(t_s: Float64Array, y: Float64Array, final: number): StepMetrics {
  const last = y.length - 1;
  if (!Number.isFinite(final) || final === 0) return NO_STEP;
  const firstAbove = (level: number): number | null => {
    for (let k = 1; k <= last; k++) {
      if (y[k] / final >= level) {
        const part = (level * final - y[k - 1]) / (y[k] - y[k - 1]);
        return t_s[k - 1] + part * (t_s[k] - t_s[k - 1]);
      }
    }
    return null;
  };
  const low = firstAbove(0.1);
  const high = firstAbove(0.9);
  let peak = 0;
  let outside = -1;
  for (let k = 0; k <= last; k++) {
    const share = y[k] / final;
    peak = Math.max(peak, share);
    if (Math.abs(share - 1) > 0.02) outside = k;
  }
  return {
    rise_s: low === null || high === null ? null : high - low,
    overshoot_pct: Math.max(0, (peak - 1) * 100),
    settle_s: outside >= last ? null : settleTime(t_s, y, final, outside),
  };
}

function settleTime(t_s: Float64Array, y: Float64Array, final: number, outside: number): number {
  if (outside < 0) return 0;
  const edge = final * (y[outside] / final > 1 ? 1.02 : 0.98);
  const part = (edge - y[outside]) / (y[outside + 1] - y[outside]);
  return t_s[outside] + Math.max(0, Math.min(1, part)) * (t_s[outside + 1] - t_s[outside]);
}
