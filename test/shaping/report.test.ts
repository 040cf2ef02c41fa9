/** The report on plants and builds: bad input, reasons for nulls, the linear model, noise and heat as flown. */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { Build } from '../../src/craft/build.ts';
import { compileCraft } from '../../src/craft/compile.ts';
import { CALM } from '../../src/craft/wind.ts';
import { NEUTRAL_STICKS } from '../../src/flight/pilot.ts';
import { runFlight } from '../../src/flight/run.ts';
import { axisModels, responseAt } from '../../src/shaping/axisModel.ts';
import { magnitude } from '../../src/shaping/complex.ts';
import { noiseHeat_W } from '../../src/shaping/heat.ts';
import { gyroNoise, noiseAtMotor } from '../../src/shaping/noise.ts';
import { rateLoop } from '../../src/shaping/rateLoop.ts';
import { reportForBuild, reportForPlant, type AxisReport } from '../../src/shaping/report.ts';
import { plantGainRange, STARTING_LIMITS, startingGains } from '../../src/shaping/startingGains.ts';
import { plantSystem } from '../../src/shaping/continuous.ts';
import { sweepMeasure } from '../../src/shaping/sweepCheck.ts';
import { demoBuild, demoGains } from '../physics/builds.ts';
import { gainsOf, plantOf } from './plants.ts';

/** Paths of numbers that are not finite. */
function notFinite(value: unknown, path = ''): string[] {
  if (typeof value === 'number') return Number.isFinite(value) ? [] : [`${path} = ${value}`];
  if (typeof value !== 'object' || value === null) return [];
  return Object.entries(value).flatMap(([key, one]) => notFinite(one, `${path}.${key}`));
}

function expectAnswered(report: AxisReport): void {
  expect(notFinite(report)).toEqual([]);
  expect(report.statement.length).toBeGreaterThan(10);
  for (const [key, value] of Object.entries(report)) {
    if (value === null) expect(report.reasons[key], key).toMatch(/\w{3}/);
  }
}

describe('bad input: a number or a plain statement, never NaN, never an endless search', () => {
  const usual = plantOf(30, 0.02, 0.002);

  it.each([
    ['all zero', gainsOf(400, 0, 0, 0), usual, false, /P and I are both zero/],
    ['D alone', gainsOf(400, 0, 0, 0.02), usual, false, /P and I are both zero/],
    ['I alone', gainsOf(400, 0, 1, 0), usual, false, /unstable: a disturbance doubles every/],
    ['negative P', gainsOf(400, -1, 0, 0), usual, false, /unstable/],
    [
      'negative P on a plant wired the other way',
      gainsOf(400, -1, 0, 0),
      plantOf(-30, 0.02, 0.002),
      true,
      /ring/,
    ],
    ['a P that hardly is one', gainsOf(400, 1e-9, 0, 0), usual, false, /on the edge/],
    [
      'a lag and a D near the least number',
      gainsOf(250, 7e-149, 0, 1e-323),
      plantOf(30, 2e-28, 1e-174),
      false,
      /edge/,
    ],
    ['absurd gains', gainsOf(8000, 1000, 1e5, 100), plantOf(1e6, 0, 0), false, /unstable/],
    [
      'a delay of exactly a tick, twice',
      gainsOf(250, 1, 1, 0.01, { computeDelay_s: 0.004 }),
      plantOf(30, 0.02, 0.004),
      true,
      /ring/,
    ],
    ['a delay of many ticks', gainsOf(8000, 0.1, 0.01, 0), plantOf(30, 0, 0.1), true, /ring/],
    [
      'a first-order cutoff above Nyquist',
      gainsOf(50, 1, 1, 0.01, { gyroLowPass_Hz: 20_000 }),
      plantOf(3, 0.01, 0),
      true,
      /ring/,
    ],
  ])(
    '%s',
    (_name, gains, plant, stable, statement) => {
      const { roll, yaw } = reportForPlant(plant, gains);
      expect(roll.stable).toBe(stable);
      expect(roll.statement).toMatch(statement);
      expectAnswered(roll);
      expectAnswered(yaw);
    },
    30_000,
  );

  it('a notch above Nyquist is refused with the place, the value and what is allowed', () => {
    expect(() => gainsOf(400, 1, 1, 0, { notches: [{ centre_Hz: 220, q: 3 }] })).toThrow(
      /notches\[0\]\.centre_Hz: 220; allowed: below half the loop rate, 200 Hz/,
    );
  });

  it('holds for any gains and plant (fast-check)', () => {
    const wide = fc.oneof(fc.constant(0), fc.double({ min: -50, max: 50, noNaN: true }));
    fc.assert(
      fc.property(
        fc.constantFrom(50, 250, 1000, 8000),
        wide,
        wide,
        fc.double({ min: -0.5, max: 0.5, noNaN: true }),
        fc.double({ min: 0, max: 0.2, noNaN: true }),
        fc.double({ min: 0, max: 0.01, noNaN: true }),
        (loop_Hz, p, i, d, lag_s, delay_s) => {
          expectAnswered(reportForPlant(plantOf(30, lag_s, delay_s), gainsOf(loop_Hz, p, i, d)).roll);
        },
      ),
      { numRuns: 40 },
    );
  }, 60_000);

  it('an unstable loop has the change of gain to the edge, and no step, noise or delay margin', () => {
    const { roll } = reportForPlant(usual, gainsOf(400, 20, 0, 0));
    expect(roll.stable).toBe(false);
    expect(roll.gainMargin_dB).toBeLessThan(0);
    expect(roll).toMatchObject({ delayMargin_ms: null, noiseAtMotor_us_rms: null });
    expect(roll.reasons).toMatchObject({
      delayMargin_ms: 'the loop is unstable',
      'step.rise_s': 'the loop is unstable',
    });
  });
});

describe('linear model of a build', () => {
  it('roll acceleration per µs in closed form for rotors with constant coefficients and a lag', () => {
    const base = demoBuild('sandpiper');
    const { staticTable: _none, ...propeller } = base.propeller;
    const build: Build = {
      ...base,
      propeller: { ...propeller, inPlaneDrag: 0 },
      motor: { lag_s: 0.04, maxSpeed_rpm: 8500 },
      battery: { ...base.battery, resistance_ohm: 1e-6 },
    };
    const { A, B } = axisModels(build).roll.craft;
    const craft = compileCraft(build);
    // Steady in rotor speed and inflow, body held: A₁₁…(−A₂₂⁻¹ B₂), by Cramer's rule.
    const det = A.get(1, 1) * A.get(2, 2) - A.get(1, 2) * A.get(2, 1);
    const speed = -(A.get(2, 2) * B.get(1, 0)) / det;
    const inflow = (A.get(2, 1) * B.get(1, 0)) / det;
    const found = A.get(0, 1) * speed + A.get(0, 2) * inflow;
    // T = C_T ρ n² D⁴ with T = mg/4 in hover; four rotors, each 0.16 m off the axis.
    const perSquare = (build.propeller.thrustCoefficient * 1.225 * 0.254 ** 4) / (4 * Math.PI ** 2);
    const hover = Math.sqrt((build.airframe.mass_kg * 9.80665) / 4 / perSquare);
    const speedPerUs = (8500 * Math.PI) / 30 / 1000;
    const closed = (4 * 0.16 * 2 * perSquare * hover * speedPerUs) / craft.inertia[0];
    expect(found / closed).toBeCloseTo(1, 2);
    expect(A.get(1, 1)).toBeCloseTo(-1 / 0.04, 6);
  });

  it('a lower battery lowers the plant gain; a dropped payload raises it', () => {
    const build = demoBuild('sandpiper');
    const gain = (choice: object) => axisModels(build, choice).roll.plant.gain_dps2_per_us;
    expect(gain({ charge: 0.15 })).toBeLessThan(gain({}));
    expect(gain({ payloadReleased: true })).toBeGreaterThan(gain({}));
  });

  it('forward flight and climb have models of their own; no trim is said plainly', () => {
    const build = demoBuild('sandpiper');
    for (const choice of [{ forward_mps: 8 }, { climb_mps: 3 }]) {
      const { pitch } = axisModels(build, choice);
      expect(magnitude(responseAt(pitch.measured, 20))).toBeGreaterThan(0);
      expect(notFinite([pitch.plant, pitch.fitError_dB, pitch.gust_dps2_per_mps])).toEqual([]);
    }
    expect(() => axisModels(build, { climb_mps: 60 })).toThrow(/no trim/);
  });

  it('agrees with the flight of a low battery too, and an ESC slower than the loop adds its wait', () => {
    const base = demoBuild('sandpiper');
    const low = sweepMeasure(base, demoGains('sandpiper'), 'pitch', { charge: 0.2 });
    expect(low.statement).toMatch(/agrees/);
    const slow = { ...base, esc: { ...base.esc, update_Hz: 170 } };
    const check = sweepMeasure(slow, demoGains('sandpiper'), 'yaw');
    expect(check.worst_dB).toBeLessThan(0.5);
    expect(check.worst_deg).toBeLessThan(3);
  }, 60_000);

  it('unstable gains: the sweep says that nothing was measured, and gives no difference', () => {
    const gains = demoGains('sandpiper');
    const roll = { ...gains.axes.roll, p_us_per_dps: -6, i_us_per_deg: 0 };
    const { statement, worst_dB } = sweepMeasure(
      demoBuild('sandpiper'),
      { ...gains, outputLimit_us: 400, axes: { ...gains.axes, roll } },
      'roll',
    );
    expect(statement).toMatch(/nothing measured/);
    expect(worst_dB).toBe(0);
  }, 30_000);
});

describe('noise and heat, closed form against the flight', () => {
  const base = demoBuild('sandpiper');
  const build = (noise_dps_per_rtHz: number): Build => ({
    ...base,
    esc: { ...base.esc, resolution_us: 0 },
    gyro: {
      ...base.gyro,
      noise_dps_per_rtHz,
      resolution_dps: 0,
      bias_dps: [0, 0, 0],
      vibration_dps: [0, 0, 0],
      drift_dps_per_rts: 0,
    },
    accelerometer: { ...base.accelerometer, noise_mps2_per_rtHz: 0 },
  });
  const gains = demoGains('sandpiper');
  /** Columns of a moored hover, the first second left out. */
  const hover = (one: Build, names: string[]) => {
    const { record } = runFlight(
      { build: one, gains, wind: CALM, seed: 3, start: { kind: 'hover', height_m: 30 } },
      21,
      () => ({ ...NEUTRAL_STICKS, armed: true, moored: true }),
      names,
    );
    return names.map((name) => record.column(name).subarray(400));
  };
  const mean = (x: Float64Array) => x.reduce((sum, value) => sum + value, 0) / x.length;

  it('noise at the motors within 5 % of 20 s of hover', () => {
    const noisy = build(0.02);
    const models = axisModels(noisy);
    const noise = gyroNoise(0.02, noisy.gyro.bandwidth_Hz, gains.loop_Hz);
    const columns = hover(noisy, ['u_roll_us', 'u_pitch_us', 'u_yaw_us']);
    (['roll', 'pitch', 'yaw'] as const).forEach((axis, k) => {
      const closed = noiseAtMotor(rateLoop(models[axis].measured, gains, axis), noise) ?? NaN;
      const middle = mean(columns[k]);
      const flown = Math.sqrt(mean(columns[k].map((value) => (value - middle) ** 2)));
      expect(flown / closed, axis).toBeGreaterThan(0.95);
      expect(flown / closed, axis).toBeLessThan(1.05);
    });
  }, 60_000);

  it('winding heat that noise adds: the closed form is above a hover’s, with noise less without, by at most 15 %', () => {
    const names = ['heat_FL_W', 'heat_FR_W', 'heat_RL_W', 'heat_RR_W'];
    const loud = 0.15;
    const heat = (one: Build) => mean(Float64Array.from(hover(one, names).map(mean)));
    const flown = heat(build(loud)) - heat(build(0));
    const models = axisModels(build(loud));
    const noise = gyroNoise(loud, base.gyro.bandwidth_Hz, gains.loop_Hz);
    let closed = 0;
    for (const axis of ['roll', 'pitch', 'yaw'] as const) {
      const { current, measured } = models[axis];
      if (current === null) throw new Error('the Sandpiper has electric motors');
      closed += noiseHeat_W(rateLoop(measured, gains, axis), noise, current) ?? NaN;
    }
    // Thrust goes with speed squared, so a noisy rotor holds the craft at a slightly lower mean speed and current:
    // a second-order saving that the linear closed form leaves out.
    expect(flown / closed).toBeGreaterThan(0.85);
    expect(flown / closed).toBeLessThan(1.02);
  }, 60_000);
});

describe('starting gains', () => {
  it('the plant gain’s range: thrust and voltage over inertia', () => {
    const [low, high] = plantGainRange({ mass: 0.05, voltage: 0.1, thrust: 0.1 });
    expect(low).toBeCloseTo(0.81 / 1.05, 12);
    expect(high).toBeCloseTo(1.21 / 0.95, 12);
  });

  it('keep every limit over that range by the exact analysis, name the active one and what loosens it', () => {
    const plant = plantOf(30, 0.03, 0.004);
    const gains = gainsOf(400, 1, 1, 0, { derivativeLowPass_Hz: 60 });
    const system = plantSystem(plant);
    const noise = gyroNoise(0.01, 0, 400);
    const found = startingGains({ roll: system, pitch: system, yaw: system }, gains, noise);
    for (const scale of [1, ...plantGainRange(STARTING_LIMITS.uncertainty)]) {
      const { roll } = reportForPlant({ ...plant, gain_dps2_per_us: 30 * scale }, found.gains);
      expect(roll.stable).toBe(true);
      expect(roll.maxSensitivity).toBeLessThan(STARTING_LIMITS.maxSensitivity * 1.01);
      expect(roll.phaseMargin_deg).toBeGreaterThan(STARTING_LIMITS.phaseMargin_deg * 0.99);
      expect(roll.delayMargin_ms).toBeGreaterThan(STARTING_LIMITS.delayMargin_ms);
      expect(roll.noiseAtMotor_us_rms).toBeLessThan(STARTING_LIMITS.noiseAtMotor_us_rms * 1.02);
    }
    expect(found.axes.roll.active.length).toBeGreaterThan(3);
    expect(found.axes.roll.loosenedBy.length).toBeGreaterThan(3);
    expect(found.axes.roll.loosening.length).toBeGreaterThan(1);
    expect(found.axes.roll.loosening[0].gain_pct).toBeGreaterThan(0);
  }, 30_000);

  it('a noisy gyro makes noise the active limit, and a quieter one the way out', () => {
    const system = plantSystem(plantOf(30, 0.03, 0.004));
    const gains = gainsOf(400, 1, 1, 0, { derivativeLowPass_Hz: 60 });
    const found = startingGains({ roll: system, pitch: system, yaw: system }, gains, gyroNoise(0.4, 0, 400));
    expect(found.axes.roll.active).toContain('noise at the motors');
    expect(found.axes.roll.loosening[0].change).toBe('half the gyro noise');
  }, 30_000);

  it('no gains within the limits are refused plainly', () => {
    const system = plantSystem(plantOf(30, 0.03, 0.004));
    const gains = gainsOf(400, 1, 1, 0);
    expect(() =>
      startingGains({ roll: system, pitch: system, yaw: system }, gains, gyroNoise(0.01, 0, 400), {
        ...STARTING_LIMITS,
        maxSensitivity: 1.0001,
      }),
    ).toThrow(/no gains for roll keep all limits/);
  }, 30_000);

  it('of the demo craft are stable with margins on the build they came from', () => {
    const build = demoBuild('wren');
    const models = axisModels(build);
    const { gains } = startingGains(
      { roll: models.roll.measured, pitch: models.pitch.measured, yaw: models.yaw.measured },
      demoGains('wren'),
      gyroNoise(build.gyro.noise_dps_per_rtHz, build.gyro.bandwidth_Hz, 1000),
    );
    const report = reportForBuild(build, gains);
    for (const axis of ['roll', 'pitch', 'yaw'] as const) {
      expect(report[axis].stable).toBe(true);
      expect(report[axis].maxSensitivity).toBeLessThan(1.62);
      expect(report[axis].step.overshoot_pct).toBeLessThan(20);
      expectAnswered(report[axis]);
    }
  }, 30_000);
});
