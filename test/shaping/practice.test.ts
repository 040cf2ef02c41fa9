/** What every builder knows; common practice, no source. On linear loops and on the nonlinear craft. */
import { describe, expect, it } from 'vitest';
import { CALM } from '../../src/craft/wind.ts';
import { NEUTRAL_STICKS } from '../../src/flight/pilot.ts';
import { runFlight } from '../../src/flight/run.ts';
import { analyse } from '../../src/shaping/analysis.ts';
import { axisModels } from '../../src/shaping/axisModel.ts';
import { gustResponse } from '../../src/shaping/gust.ts';
import { gyroNoise } from '../../src/shaping/noise.ts';
import { startingGains } from '../../src/shaping/startingGains.ts';
import { WALK_STAGES, walkAdvice, walkCandidates, walkResponse } from '../../src/shaping/walk.ts';
import { demoBuild, demoGains } from '../physics/builds.ts';
import { gainsOf, loopOf, plantOf } from './plants.ts';

const plant = plantOf(30, 0.02, 0.003);
const stepOf = (p: number, i: number, d: number, cut = 0) =>
  analyse(loopOf(plant, gainsOf(400, p, i, d, { derivativeLowPass_Hz: cut })), 0.1);

describe('common practice', () => {
  it('raising P shortens the rise and raises the overshoot', () => {
    const [low, mid, high] = [1, 1.5, 2.2].map((p) => stepOf(p, 0, 0).step);
    expect(mid.rise_s).toBeLessThan(low.rise_s ?? 0);
    expect(high.rise_s).toBeLessThan(mid.rise_s ?? 0);
    expect(mid.overshoot_pct).toBeGreaterThan(low.overshoot_pct ?? 100);
    expect(high.overshoot_pct).toBeGreaterThan(mid.overshoot_pct ?? 100);
  });

  it('P alone leaves an offset under a constant torque, a/(K·p), and the integral removes it', () => {
    const last = (i: number) => {
      const { rate_dps } = gustResponse(loopOf(plant, gainsOf(400, 1.2, i, 0.01)), 100, 8);
      return rate_dps[rate_dps.length - 1];
    };
    expect(last(0)).toBeCloseTo(100 / (30 * 1.2), 6);
    expect(Math.abs(last(5))).toBeLessThan(1e-3);
  });

  it('derivative action lowers overshoot and settling, until delay spoils it', () => {
    const [none, some, much] = [0, 0.02, 0.16].map((d) => stepOf(1.8, 0, d));
    expect(some.step.overshoot_pct).toBeLessThan(none.step.overshoot_pct ?? 0);
    expect(some.step.settle_s).toBeLessThan(none.step.settle_s ?? 0);
    expect(much.margins.maxSensitivity).toBeGreaterThan(some.margins.maxSensitivity);
  });

  it('derivative action costs noise at the motors', () => {
    const [none, some] = [0, 0.02].map((d) => stepOf(1.8, 0, d).noiseAtMotor_us_rms ?? NaN);
    expect(some).toBeGreaterThan(2 * none);
  });

  it('a craft symmetric in roll and pitch wants equal roll and pitch gains', () => {
    const build = demoBuild('sandpiper');
    const { inertia_kgm2 } = build.airframe;
    const symmetric = {
      ...build,
      airframe: { ...build.airframe, inertia_kgm2: { ...inertia_kgm2, yy: inertia_kgm2.xx, xz: 0 } },
    };
    const { roll, pitch, yaw } = axisModels(symmetric);
    const found = startingGains(
      { roll: roll.measured, pitch: pitch.measured, yaw: yaw.measured },
      demoGains('sandpiper'),
      gyroNoise(build.gyro.noise_dps_per_rtHz, build.gyro.bandwidth_Hz, 400),
    );
    const { p_us_per_dps: p, i_us_per_deg: i, d_us_per_dps2: d } = found.axes.roll;
    expect(found.axes.pitch.p_us_per_dps / p).toBeCloseTo(1, 1);
    expect(found.axes.pitch.i_us_per_deg / i).toBeCloseTo(1, 1);
    expect(found.axes.pitch.d_us_per_dps2 / d).toBeCloseTo(1, 1);
  }, 30_000);

  it('the order is P, then I, then D; a stage leaves the later gains at zero', () => {
    expect(WALK_STAGES).toEqual(['p', 'i', 'd']);
    const gains = demoGains('sandpiper');
    for (const { gains: one } of walkCandidates('p', gains, 'roll')) {
      expect(one.axes.roll).toMatchObject({ i_us_per_deg: 0, d_us_per_dps2: 0 });
      expect(one.axes.pitch).toEqual(gains.axes.pitch);
    }
    for (const { gains: one } of walkCandidates('i', gains, 'roll')) {
      expect(one.axes.roll.i_us_per_deg).toBeGreaterThan(0);
      expect(one.axes.roll.d_us_per_dps2).toBe(0);
    }
  });

  it('one period of a 250 Hz loop is 4 ms, and all four motors get a new command in each', () => {
    const build = demoBuild('sandpiper');
    const gains = { ...demoGains('sandpiper'), loop_Hz: 250 };
    const names = ['t_s', 'cmd_FL_us', 'cmd_FR_us', 'cmd_RL_us', 'cmd_RR_us'];
    const { record } = runFlight(
      {
        build: { ...build, esc: { ...build.esc, resolution_us: 0 } },
        gains,
        wind: CALM,
        seed: 1,
        start: { kind: 'hover', height_m: 30 },
      },
      0.4,
      () => ({ ...NEUTRAL_STICKS, armed: true, moored: true }),
      names,
    );
    const [t, ...commands] = names.map((name) => record.column(name));
    for (let k = 1; k < t.length; k++) {
      expect(t[k] - t[k - 1]).toBeCloseTo(0.004, 12);
      for (const command of commands) expect(command[k]).not.toBe(command[k - 1]);
    }
  });
});

describe('the guided walk on the nonlinear craft', () => {
  const build = demoBuild('sandpiper');

  it('more P: quicker and with more overshoot; the advice follows', () => {
    const responses = walkCandidates('p', demoGains('sandpiper'), 'roll').map((one) =>
      walkResponse(build, one.gains, 'roll'),
    );
    for (let k = 1; k < responses.length; k++) {
      expect(responses[k].step.rise_s).toBeLessThan(responses[k - 1].step.rise_s ?? 0);
      expect(responses[k].step.overshoot_pct).toBeGreaterThan(responses[k - 1].step.overshoot_pct ?? 100);
      expect(responses[k].restless_us).toBeGreaterThan(responses[k - 1].restless_us);
    }
    expect(walkAdvice('p', responses[3])).toMatch(/less P/);
  }, 30_000);

  it('a walk can begin with a D of zero, and says when noise drives the motors', () => {
    const gains = demoGains('sandpiper');
    const bare = {
      ...gains,
      axes: { ...gains.axes, roll: { ...gains.axes.roll, d_us_per_dps2: 0 } },
    };
    const [least, , , most] = walkCandidates('d', bare, 'roll');
    expect(least.gains.axes.roll.d_us_per_dps2).toBeGreaterThan(0);
    const loud = { ...most.gains.axes.roll, d_us_per_dps2: 8 * most.gains.axes.roll.d_us_per_dps2 };
    const noisy = walkResponse(build, { ...most.gains, axes: { ...most.gains.axes, roll: loud } }, 'roll');
    expect(walkAdvice('d', noisy)).toMatch(/less D/);
  }, 30_000);
});
