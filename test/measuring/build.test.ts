import { describe, expect, it } from 'vitest';
import { isElectric, parseBuild } from '../../src/craft/build.ts';
import { OPEN_FIELD } from '../../src/craft/scene.ts';
import { CALM } from '../../src/craft/wind.ts';
import type { FlightSetup } from '../../src/flight/flight.ts';
import { NEUTRAL_STICKS } from '../../src/flight/pilot.ts';
import { recordCsv } from '../../src/flight/record.ts';
import { runFlight } from '../../src/flight/run.ts';
import { RECORD_SIGNALS } from '../../src/flight/signals.ts';
import { centreFromScales } from '../../src/measuring/balance.ts';
import { buildFromMeasurements } from '../../src/measuring/buildFromMeasurements.ts';
import { readTable } from '../../src/measuring/columns.ts';
import { analyseSpinup } from '../../src/measuring/spinup.ts';
import { analyseStand } from '../../src/measuring/stand.ts';
import { analyseStill } from '../../src/measuring/still.ts';
import { analyseSwing } from '../../src/measuring/swing.ts';
import { parseSwing } from '../../src/measuring/swingFile.ts';
import { WORKSHEETS } from '../../src/measuring/worksheets.ts';
import { RandomStream } from '../../src/math/random.ts';
import { demoBuild, demoGains } from '../physics/builds.ts';
import { refusal, uiucStatic } from './support.ts';

const base = demoBuild('sandpiper');
const swing = (period: number) =>
  analyseSwing(
    parseSwing({
      format: 'gustbench.swing/1',
      mass_kg: 1.35,
      tests: [
        {
          axis: 'roll',
          method: 'bifilar',
          wireDistance_m: 0.3,
          wireLength_m: 1.2,
          timings: [{ swings: 20, time_s: 20 * period }],
        },
      ],
    }),
  );
const stand = () => analyseStand([readTable(uiucStatic(), 'uiuc')], { diameter_m: 0.254 });

/** Speed of the base's own motor after a step of duty, by its differential equation, Heun's method. */
function motorStep(inertia_kgm2: number): string {
  if (!isElectric(base.motor)) throw new Error('the base has no electric motor');
  const ke = 60 / (2 * Math.PI * base.motor.kv_rpm_per_V);
  const { resistance_ohm: R, noLoadCurrent_A: i0 } = base.motor;
  const { diameter_m: D } = base.propeller;
  // The base's C_P at the middle of the step, held constant, so that the torque is a square law.
  const cp = 0.0475;
  const rate = (speed: number, volts: number) =>
    (ke * ((volts - ke * speed) / R - i0) -
      (cp / (2 * Math.PI)) * 1.225 * (speed / (2 * Math.PI)) ** 2 * D ** 5) /
    inertia_kgm2;
  let speed = 460;
  const h = 1e-4;
  const lines = ['t_s,esc_us,speed_rad/s'];
  for (let i = 0; i < 20_000; i++) {
    const volts = i < 10_000 ? 9.2 : 9.6;
    if (i >= 8000 && i % 10 === 0)
      lines.push(`${(i * h).toFixed(4)},${i < 10_000 ? 1500 : 1540},${speed.toFixed(5)}`);
    const first = rate(speed, volts);
    speed += (h / 2) * (first + rate(speed + h * first, volts));
  }
  return lines.join('\n');
}

describe('measured values into a build', () => {
  it('nothing measured leaves the build as it was', () => {
    expect(buildFromMeasurements(base, []).build).toEqual(base);
  });

  it('takes inertia, propeller and mass, says where each comes from, and parses', () => {
    const scales = [
      { position_m: 0.1, reading_kg: 0.7 },
      { position_m: -0.1, reading_kg: 0.7 },
    ];
    const balance = centreFromScales({ axis: 'x', scales, massStep_kg: 0.001, lengthStep_m: 0.001 });
    const { build, provenance } = buildFromMeasurements(base, [swing(1.5), stand(), balance]);
    expect(parseBuild(JSON.parse(JSON.stringify(build)))).toEqual(build);
    expect(build.airframe.inertia_kgm2.xx).toBe(swing(1.5).quantities.inertia_xx_kgm2?.value);
    expect(build.airframe.inertia_kgm2.yy).toBe(base.airframe.inertia_kgm2.yy);
    expect(build.airframe.mass_kg).toBeCloseTo(1.4, 12);
    expect(build.propeller.staticTable?.[15]).toEqual({ rpm: 6528, ct: 0.1299, cp: 0.0531 });
    expect(build.propeller.inertia_kgm2).toBe(base.propeller.inertia_kgm2);
    const sources = new Map(provenance.map((one) => [one.path, one]));
    expect(sources.get('airframe.inertia_kgm2.xx')?.from).toBe('swing test');
    expect(sources.get('airframe.inertia_kgm2.xx')?.sigma).toBeGreaterThan(0);
    expect(sources.has('airframe.inertia_kgm2.yy')).toBe(false);
    expect(build.note).toMatch(
      /^Invented for demonstration[\s\S]*Measured: .*inertia_kgm2.xx .* \(95 %\): swing test/,
    );
  });

  it('an inertia no body has is refused by name', () => {
    expect(refusal(() => buildFromMeasurements(base, [swing(4)]))).toMatch(
      /measured build: airframe.inertia_kgm2.*triangle inequality/,
    );
  });

  it('the lag of an electric motor gives the inertia of propeller and bell: J = τ (K_t²/R + dQ/dΩ)', () => {
    const truth = 5.5e-5;
    const spinup = analyseSpinup(readTable(motorStep(truth), 'f'));
    const { build } = buildFromMeasurements(
      { ...base, propeller: { ...base.propeller, powerCoefficient: 0.0475, staticTable: undefined } },
      [spinup],
    );
    expect(Math.abs(build.propeller.inertia_kgm2 / truth - 1)).toBeLessThan(0.03);
    expect(isElectric(build.motor)).toBe(true);
  });

  it('a lagged motor takes the lags', () => {
    const lagged = parseBuild({ ...base, motor: { lag_s: 0.05, maxSpeed_rpm: 9500 } });
    const { build } = buildFromMeasurements(lagged, [analyseSpinup(readTable(motorStep(5.5e-5), 'f'))]);
    expect('lag_s' in build.motor ? build.motor.lag_s : 0).toBeGreaterThan(0.005);
    expect('lag_s' in build.motor ? build.motor.maxSpeed_rpm : 0).toBe(9500);
  });

  it('gyro noise, bias and vibration, the latter scaled to hover speed by its square', () => {
    const random = new RandomStream(1, 'build');
    const rows = ['t_s,gyro_x (deg/s),gyro_y (deg/s),gyro_z (deg/s)'];
    for (let i = 0; i < 6000; i++) {
      const line = Math.sin((2 * Math.PI * 40 * i) / 500) + 0.3 * Math.sin((2 * Math.PI * 80 * i) / 500);
      rows.push([i / 500, ...[1, 2, 3].map((k) => k + line + 0.1 * random.gaussian())].join(','));
    }
    const still = analyseStill(readTable(rows.join('\n'), 'f'), { speed_rpm: 2400 });
    const { build } = buildFromMeasurements(base, [still]);
    build.gyro.bias_dps.forEach((value, i) => expect(value).toBeCloseTo(i + 1, 2));
    const ratio = (build.gyro.vibration_dps?.[0] ?? 0) / (still.gyro.vibration_dps?.[0] ?? 1);
    // Hover: T = mg/4 = C_T ρ n² D⁴ at the table's C_T.
    const hover_Hz = 40 * Math.sqrt(ratio);
    const ct = 0.1165;
    const expected = Math.sqrt((1.35 * 9.80665) / 4 / (ct * 1.225 * 0.254 ** 4));
    expect(Math.abs(hover_Hz / expected - 1)).toBeLessThan(0.03);
  });

  it('gives the gyro of a build back from a simulated hover of it', () => {
    const setup: FlightSetup = {
      build: base,
      gains: demoGains('sandpiper'),
      wind: CALM,
      scene: OPEN_FIELD,
      seed: 3,
      start: { kind: 'hover', height_m: 5 },
    };
    const sticks = { ...NEUTRAL_STICKS, armed: true, moored: true };
    const { record } = runFlight(setup, 40, () => sticks, RECORD_SIGNALS);
    const csv = [...recordCsv(record, { ...setup, scene: OPEN_FIELD, faults: [] })].join('');
    const still = analyseStill(readTable(csv, 'f'));
    const { gyro } = buildFromMeasurements(base, [still]).build;
    expect(still.rotor?.estimated).toBe(false);
    expect(gyro.resolution_dps).toBeCloseTo(base.gyro.resolution_dps, 6);
    for (const axis of [0, 1, 2]) {
      expect(Math.abs(gyro.bias_dps[axis] - base.gyro.bias_dps[axis])).toBeLessThan(0.03);
      const vibration = (gyro.vibration_dps?.[axis] ?? 0) / (base.gyro.vibration_dps?.[axis] ?? 1);
      expect(Math.abs(vibration - 1)).toBeLessThan(0.2);
    }
    // The loop moves the craft by its own noise, so the density in hover lies above the sensor's.
    expect(gyro.noise_dps_per_rtHz / base.gyro.noise_dps_per_rtHz).toBeGreaterThan(0.9);
    expect(gyro.noise_dps_per_rtHz / base.gyro.noise_dps_per_rtHz).toBeLessThan(1.5);
  });

  it('a gyro whose unit is in doubt is not taken over', () => {
    const random = new RandomStream(1, 'doubt');
    const rows = ['t_s,gyro_x (deg/s)'];
    for (let i = 0; i < 4000; i++) rows.push(`${i / 500},${(0.002 * random.gaussian()).toPrecision(9)}`);
    const still = analyseStill(readTable(rows.join('\n'), 'f'));
    expect(refusal(() => buildFromMeasurements(base, [still]))).toMatch(
      /gyro: "columns in deg\/s"; allowed: a settled unit/,
    );
  });
});

describe('worksheets', () => {
  it.each(WORKSHEETS)('$id has steps, fields, tools and cautions', (sheet) => {
    expect(sheet.steps.length).toBeGreaterThan(2);
    expect(sheet.fields.length).toBeGreaterThan(2);
    expect(sheet.tools.length).toBeGreaterThan(0);
    expect(sheet.cautions.length).toBeGreaterThan(0);
  });

  it('propellers are off wherever they can be; with them the guard, eyes and cut-off are named', () => {
    for (const sheet of WORKSHEETS) {
      const text = sheet.cautions.join(' ');
      if (['stand', 'spinup', 'still-idle'].includes(sheet.id)) {
        expect(text, sheet.id).toMatch(/Eye protection/);
        expect(text, sheet.id).toMatch(/cuts the power/);
        expect(text, sheet.id).toMatch(/guard|strapped/i);
      } else {
        expect(text, sheet.id).toMatch(/Propellers off/);
      }
      if (sheet.id.startsWith('swing')) expect(text).toMatch(/string, knots/);
    }
  });
});
