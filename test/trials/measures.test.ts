/** Scores against closed forms. */
import { describe, expect, it } from 'vitest';
import { Recorder } from '../../src/flight/record.ts';
import { SIGNAL_NAMES, signalIndex } from '../../src/flight/signals.ts';
import { RandomStream } from '../../src/math/random.ts';
import {
  motorActivity_us,
  peakDrift_m,
  peakTilt_deg,
  power_W,
  rateError_dps,
  rowsBetween,
  saturation_pct,
  stepScores,
  timeToTouch_s,
  TRIAL_SIGNALS,
  windingHeat_W,
} from '../../src/trials/measures.ts';

/** A response sampled at `rate_Hz` from one second before the step. */
function sampled(of: (t_s: number) => number, end_s: number, rate_Hz = 10_000) {
  const count = Math.round((end_s + 1) * rate_Hz);
  const t = Float64Array.from({ length: count }, (_, k) => k / rate_Hz);
  return { t, y: t.map((time) => (time < 1 ? 0 : of(time - 1))) };
}

/** Step response of ω²/(s² + 2ζωs + ω²), ω = 1, closed form. */
const secondOrder = (zeta: number) => (t: number) => {
  const root = Math.sqrt(1 - zeta * zeta);
  return 1 - Math.exp(-zeta * t) * (Math.cos(root * t) + (zeta / root) * Math.sin(root * t));
};

describe('step metrics', () => {
  // exp(−πζ/√(1−ζ²)), closed form
  it.each([
    [0.3, 37.2326],
    [0.5, 16.3034],
    [0.7, 4.5988],
  ])('second order, damping %f: overshoot %f %', (zeta, overshoot_pct) => {
    const { t, y } = sampled(secondOrder(zeta), 60, 1000);
    expect(stepScores(t, y, 1, 61, 1).overshoot_pct).toBeCloseTo(overshoot_pct, 3);
  });

  it('first-order lag: rise ln 9 · τ, settling to 5 % ln 20 · τ, no overshoot', () => {
    const { t, y } = sampled((time) => 1 - Math.exp(-time / 0.2), 4);
    const scores = stepScores(t, y, 1, 5, 1);
    expect(scores.rise_s).toBeCloseTo(0.2 * Math.log(9), 4);
    expect(scores.settle_s).toBeCloseTo(0.2 * Math.log(20), 3);
    expect(scores.overshoot_pct).toBe(0);
    expect(scores.steadyError_pct).toBeLessThan(0.01);
  });

  it('(1−s)/(s²+s+1): rise 1.256, settling to 2 % 9.071, overshoot 20.85 % (step example of python-control)', () => {
    // Closed form of the step response: e^(−t/2) (−cos bt − (3/(2b)) sin bt) + 1 with b = √3/2.
    const b = Math.sqrt(3) / 2;
    const { t, y } = sampled(
      (time) => 1 - Math.exp(-time / 2) * (Math.cos(b * time) + (3 / (2 * b)) * Math.sin(b * time)),
      30,
      1000,
    );
    const scores = stepScores(t, y, 1, 31, 1, 0.02);
    // Its own times stand on a coarse grid: it claims 2 %.
    expect(Math.abs(scores.rise_s / 1.256 - 1)).toBeLessThan(0.02);
    expect(Math.abs(scores.settle_s / 9.071 - 1)).toBeLessThan(0.02);
    expect(scores.overshoot_pct).toBeCloseTo(20.85, 1);
  });

  it('a step down gives what a step up gives', () => {
    const { t, y } = sampled(secondOrder(0.4), 30, 1000);
    const up = stepScores(t, y, 1, 31, 1);
    const down = stepScores(
      t,
      y.map((value) => -50 * value),
      1,
      31,
      -50,
    );
    expect(down.rise_s).toBeCloseTo(up.rise_s, 9);
    expect(down.overshoot_pct).toBeCloseTo(up.overshoot_pct, 9);
    expect(down.settle_s).toBe(up.settle_s);
  });

  it('levels that are never reached are NaN, also before and without a step', () => {
    const { t, y } = sampled((time) => 0.5 * (1 - Math.exp(-time)), 5, 1000);
    const low = stepScores(t, y, 1, 6, 1);
    expect(low.rise_s).toBeNaN();
    expect(low.settle_s).toBeNaN();
    // Mean of what is left of e^(−t) over the last second, closed form.
    expect(low.steadyError_pct).toBeCloseTo(50 + 50 * (Math.exp(-4) - Math.exp(-5)), 1);
    expect(stepScores(t, y, 99, 100, 1).rise_s).toBeNaN();
  });
});

/** A record whose rows are filled by name. */
function record(
  rows: number,
  rate_Hz: number,
  fill: (t_s: number, set: (name: string, value: number) => void) => void,
) {
  const recorder = new Recorder(TRIAL_SIGNALS, rows);
  const signals = new Float64Array(SIGNAL_NAMES.length);
  for (let k = 0; k < rows; k++) {
    signals.fill(0);
    signals[signalIndex('t_s')] = k / rate_Hz;
    signals[signalIndex('qw')] = 1;
    fill(k / rate_Hz, (name, value) => {
      signals[signalIndex(name)] = value;
    });
    recorder.take(signals);
  }
  return recorder;
}

const CORNERS = ['FL', 'FR', 'RL', 'RR'];

describe('measures of a record', () => {
  it('white noise at the motors: σ √(2/(2−f)) (1−f), f the slow part’s share a tick', () => {
    // Residual of a first-order follower in white noise, closed form.
    const rate_Hz = 400;
    const stream = new RandomStream(7, 'test');
    const rows = 40_000;
    const noisy = record(rows, rate_Hz, (_t, set) => {
      for (const corner of CORNERS) set(`cmd_${corner}_us`, 1400 + 6 * stream.gaussian());
    });
    const f = 1 - Math.exp((-2 * Math.PI * 5) / rate_Hz);
    // Standard error of an rms over 160,000 samples: 0.2 %.
    expect(motorActivity_us(noisy, 0, rows) / (6 * (1 - f) * Math.sqrt(2 / (2 - f)))).toBeCloseTo(1, 2);
  });

  it('a slow change of the command is not activity, a fast one is', () => {
    const slow = record(8000, 400, (t, set) =>
      CORNERS.forEach((c) => set(`cmd_${c}_us`, 1400 + 50 * Math.sin(0.6 * t))),
    );
    expect(motorActivity_us(slow, 0, 8000)).toBeLessThan(1);
    const fast = record(8000, 1000, (t, set) =>
      CORNERS.forEach((c) => set(`cmd_${c}_us`, 1400 + 10 * Math.sin(2 * Math.PI * 100 * t))),
    );
    // |(1−f)(1−z⁻¹)/(1−(1−f)z⁻¹)| at a tenth of the rate, closed form.
    const keep = Math.exp((-2 * Math.PI * 5) / 1000);
    const w = 0.2 * Math.PI;
    const gain = (keep * 2 * Math.sin(w / 2)) / Math.hypot(1 - keep * Math.cos(w), keep * Math.sin(w));
    expect(motorActivity_us(fast, 0, 8000)).toBeCloseTo((10 / Math.SQRT2) * gain, 2);
  });

  it('tilt, drift, rate error, heat, power, saturation and touch are what they say', () => {
    const half = (25 * Math.PI) / 360;
    const made = record(1000, 100, (t, set) => {
      set('qw', Math.cos(half));
      set('qx', Math.sin(half));
      set('north_m', 3 * t);
      set('east_m', 4 * t);
      set('sp_pitch_dps', 10);
      set('rate_pitch_dps', 7);
      set('rate_yaw_dps', -4);
      for (const corner of CORNERS) set(`heat_${corner}_W`, 2);
      set('battery_V', 15);
      set('current_A', 8);
      if (t >= 7.5) {
        set('saturated_RL', 1);
        set('touching', 1);
      }
    });
    expect(peakTilt_deg(made, 0, 1000)).toBeCloseTo(25, 9);
    const [from, to] = rowsBetween(made, 1, 3);
    expect(peakDrift_m(made, from, to)).toBeCloseTo(10, 9);
    expect(rateError_dps(made, 0, 1000)).toBeCloseTo(5, 9);
    expect(windingHeat_W(made, 0, 1000)).toBeCloseTo(2, 9);
    expect(power_W(made, 0, 1000)).toBeCloseTo(120, 9);
    expect(saturation_pct(made, 0, 1000)).toBeCloseTo(25, 9);
    expect(timeToTouch_s(made, 0, 1000)).toBeCloseTo(7.5, 9);
    expect(timeToTouch_s(made, 0, 500)).toBeCloseTo(4.99, 9);
  });

  it('rows of a time that never came are none', () => {
    const made = record(10, 100, () => undefined);
    const [from, to] = rowsBetween(made, 5, 6);
    expect(to - from).toBe(0);
    expect(rateError_dps(made, from, to)).toBe(0);
  });
});
