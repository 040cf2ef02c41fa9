import { describe, expect, it } from 'vitest';
import { compileCraft } from '../../src/craft/compile.ts';
import { RAD_PER_DEG } from '../../src/math/angles.ts';
import { SnapshotReader, SnapshotWriter } from '../../src/math/snapshot.ts';
import { RATES, ROTOR_SPEED, STATE_SIZE } from '../../src/physics/state.ts';
import { Accelerometer } from '../../src/sensing/accelerometer.ts';
import { Gyro } from '../../src/sensing/gyro.ts';
import { demoBuild } from '../physics/builds.ts';

const HOVER_RADPS = 470;

function craftWith(change: Partial<ReturnType<typeof demoBuild>['gyro']>) {
  const build = demoBuild('sandpiper');
  return compileCraft({
    ...build,
    gyro: {
      ...build.gyro,
      resolution_dps: 0,
      delay_s: 0,
      bias_dps: [0, 0, 0],
      vibration_dps: [0, 0, 0],
      drift_dps_per_rts: 0,
      misalignment_deg: [0, 0, 0],
      ...change,
    },
  });
}

function variance(values: Float64Array): number {
  const mean = values.reduce((sum, value) => sum + value, 0) / values.length;
  return values.reduce((sum, value) => sum + (value - mean) ** 2, 0) / values.length;
}

function still(craft: ReturnType<typeof compileCraft>, sample_s: number, count: number): Float64Array {
  const gyro = new Gyro(craft, 0.0005, sample_s, HOVER_RADPS, 7);
  const state = new Float64Array(STATE_SIZE);
  const phase = new Float64Array(4);
  return Float64Array.from({ length: count }, () => {
    gyro.sample(phase, state, ROTOR_SPEED);
    return gyro.sample_dps[0];
  });
}

describe('gyro noise', () => {
  it('without a bandwidth is white with σ = N √(f_s/2) (closed form), within 2 %', () => {
    const samples = still(craftWith({ noise_dps_per_rtHz: 0.01, bandwidth_Hz: 0 }), 1 / 400, 60_000);
    expect(Math.sqrt(variance(samples)) / (0.01 * Math.sqrt(200))).toBeCloseTo(1, 1.7);
  });

  it.each([50, 150, 400])(
    'through a %d Hz first-order bandwidth has variance N² (π/2) f_b, its equivalent noise bandwidth, within 3 %',
    (bandwidth_Hz) => {
      const samples = still(craftWith({ noise_dps_per_rtHz: 0.01, bandwidth_Hz }), 1 / 1000, 120_000);
      const expected = 0.01 ** 2 * (Math.PI / 2) * bandwidth_Hz;
      expect(Math.abs(variance(samples) / expected - 1)).toBeLessThan(0.03);
    },
  );
});

describe('gyro vibration', () => {
  it('appears at the folded frequency: a 130 Hz rotor sampled at 200 Hz shows a 70 Hz line (sampling theorem)', () => {
    const craft = craftWith({ noise_dps_per_rtHz: 0, bandwidth_Hz: 0, vibration_dps: [2, 0, 0] });
    const gyro = new Gyro(craft, 0.0005, 1 / 200, HOVER_RADPS, 1);
    gyro.imbalance.set([1, 0, 0, 0]);
    const state = new Float64Array(STATE_SIZE);
    const speed = 2 * Math.PI * 130;
    state[ROTOR_SPEED] = speed;
    const phase = new Float64Array(4);
    const count = 2000;
    const samples = Float64Array.from({ length: count }, (_, k) => {
      phase[0] = (speed * k) / 200;
      gyro.sample(phase, state, ROTOR_SPEED);
      return gyro.sample_dps[0];
    });
    const amplitudeAt = (f_Hz: number) => {
      let re = 0;
      let im = 0;
      samples.forEach((value, k) => {
        re += value * Math.cos((2 * Math.PI * f_Hz * k) / 200);
        im += value * Math.sin((2 * Math.PI * f_Hz * k) / 200);
      });
      return (2 * Math.hypot(re, im)) / count;
    };
    const expected = 2 * (speed / HOVER_RADPS) ** 2;
    expect(amplitudeAt(70) / expected).toBeCloseTo(1, 2);
    // Blade pass at 260 Hz folds to 60 Hz; nothing stands elsewhere.
    expect(amplitudeAt(60)).toBeGreaterThan(0.3 * expected);
    expect(amplitudeAt(45)).toBeLessThan(0.02 * expected);
  });
});

describe('gyro signal path', () => {
  it('answers a step as 1 − exp(−2π f_b t), delayed by delay_s, to 1e-9', () => {
    const craft = craftWith({ noise_dps_per_rtHz: 0, bandwidth_Hz: 80, delay_s: 0.00175 });
    const step_s = 0.0005;
    const gyro = new Gyro(craft, step_s, 0.0025, HOVER_RADPS, 1);
    const state = new Float64Array(STATE_SIZE);
    gyro.reset(state, RATES);
    // A ramp in rate is reproduced exactly by the first-order hold; so is its delay by linear interpolation
    // up to the curvature over one step.
    const tau = 1 / (2 * Math.PI * 80);
    for (let k = 1; k <= 200; k++) {
      state[RATES] = k * step_s * 100 * RAD_PER_DEG;
      gyro.advance(state, RATES);
      gyro.sample(new Float64Array(4), state, ROTOR_SPEED);
      const t = k * step_s - 0.00175;
      if (k < 20) continue;
      const expected = 100 * (t - tau * (1 - Math.exp(-t / tau)));
      expect(Math.abs(gyro.sample_dps[0] - expected)).toBeLessThan(2e-3);
    }
  });

  it('stops at full scale and rounds to the resolution', () => {
    const gyro = new Gyro(
      craftWith({ noise_dps_per_rtHz: 0, fullScale_dps: 500, resolution_dps: 0.25 }),
      0.0005,
      0.0025,
      HOVER_RADPS,
      1,
    );
    const state = new Float64Array(STATE_SIZE);
    state[RATES] = 10;
    state[RATES + 1] = 1.03 * RAD_PER_DEG;
    gyro.reset(state, RATES);
    gyro.sample(new Float64Array(4), state, ROTOR_SPEED);
    expect(gyro.sample_dps[0]).toBe(500);
    expect(gyro.sample_dps[1]).toBe(1);
  });

  it('mounted 20° askew about z shows sin 20° of pitch as roll', () => {
    const gyro = new Gyro(
      craftWith({ noise_dps_per_rtHz: 0, misalignment_deg: [0, 0, 20] }),
      0.0005,
      0.0025,
      HOVER_RADPS,
      1,
    );
    const state = new Float64Array(STATE_SIZE);
    state[RATES + 1] = 1;
    gyro.reset(state, RATES);
    gyro.sample(new Float64Array(4), state, ROTOR_SPEED);
    expect(gyro.sample_dps[0] * RAD_PER_DEG).toBeCloseTo(Math.sin(20 * RAD_PER_DEG), 9);
  });

  it('continues bit for bit after save and load', () => {
    const craft = compileCraft(demoBuild('sandpiper'));
    const state = new Float64Array(STATE_SIZE);
    state.fill(HOVER_RADPS, ROTOR_SPEED, ROTOR_SPEED + 4);
    const run = (gyro: Gyro, count: number) => {
      const out: number[] = [];
      for (let k = 0; k < count; k++) {
        gyro.advance(state, RATES);
        gyro.sample(new Float64Array([k, 2 * k, 3 * k, 4 * k]), state, ROTOR_SPEED);
        out.push(...gyro.sample_dps);
      }
      return out;
    };
    const first = new Gyro(craft, 0.0005, 0.0025, HOVER_RADPS, 5);
    run(first, 37);
    const writer = new SnapshotWriter();
    first.save(writer);
    const second = new Gyro(craft, 0.0005, 0.0025, HOVER_RADPS, 99);
    second.load(new SnapshotReader(writer.finish()));
    expect(run(second, 50)).toEqual(run(first, 50));
  });
});

describe('accelerometer', () => {
  it('at rest on level ground shows 1 g upward with its bias and noise of the stated density', () => {
    const build = demoBuild('sandpiper');
    const craft = compileCraft({
      ...build,
      accelerometer: {
        ...build.accelerometer,
        noise_mps2_per_rtHz: 0.01,
        bandwidth_Hz: 100,
        resolution_mps2: 0,
      },
    });
    const accelerometer = new Accelerometer(craft, 0.0005, 0.0025, 3);
    accelerometer.reset(new Float64Array([0, 0, -9.80665]));
    const z = Float64Array.from({ length: 20_000 }, () => {
      accelerometer.sample();
      return accelerometer.sample_mps2[2];
    });
    const mean = z.reduce((sum, value) => sum + value, 0) / z.length;
    expect(mean).toBeCloseTo(-9.80665 + 0.08, 2);
    expect(variance(z) / (0.01 ** 2 * (Math.PI / 2) * 100)).toBeCloseTo(1, 1);
  });
});
