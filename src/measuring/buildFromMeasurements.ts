/** Puts what was measured into a build, and says for each field where its value comes from. */
import { parseBuild, isElectric, type Build } from '../craft/build.ts';
import { staticCoefficients, staticThrustAtSpeed_N } from '../craft/propellerTable.ts';
import { refuse } from '../craft/problem.ts';
import { GRAVITY_MPS2, RAD_PER_S_PER_RPM } from '../math/angles.ts';
import type { BalanceResult } from './balance.ts';
import type { Estimate } from './estimate.ts';
import type { PartsResult } from './parts.ts';
import type { SpinupResult } from './spinup.ts';
import type { StandResult } from './stand.ts';
import type { StillResult } from './still.ts';
import type { SwingResult } from './swing.ts';

export type Measurement =
  SwingResult | PartsResult | BalanceResult | StandResult | SpinupResult | StillResult;

export interface Provenance {
  /** Field of the build. */
  readonly path: string;
  readonly value: number;
  /** Standard uncertainty; null where it was not told. */
  readonly sigma: number | null;
  /** "swing test", "thrust stand", …, and how, where it was not read off directly. */
  readonly from: string;
}

export interface MeasuredBuild {
  readonly build: Build;
  readonly provenance: readonly Provenance[];
}

const SEA_LEVEL_DENSITY = 1.225;
/** Idle is set above the dead zone by this share of the ESC's range; common practice, no source. */
const IDLE_CLEARANCE = 0.02;

/**
 * A build with the measurements in place of the base's values. A later measurement of the same kind overrides
 * an earlier one; a swing test overrides an estimate from parts.
 * @throws InputError when the measured values make no plausible craft, or a gyro's unit is in doubt.
 */
export function buildFromMeasurements(
  base: Build,
  results: readonly Measurement[],
  file = 'measured build',
): MeasuredBuild {
  const work = new Work(base);
  const of = <K extends Measurement['measurement']>(kind: K) =>
    results.filter((one): one is Extract<Measurement, { measurement: K }> => one.measurement === kind);
  for (const parts of of('parts')) takeParts(work, parts);
  for (const balance of of('balance')) takeBalance(work, balance);
  for (const swing of of('swing')) takeSwing(work, swing);
  for (const stand of of('stand')) takeStand(work, stand);
  for (const spinup of of('spinup')) takeSpinup(work, spinup);
  for (const still of of('still')) takeStill(work, still, file);
  const provenance = work.sources();
  const build = parseBuild({ ...work.build, note: noteOf(base, provenance) }, file);
  return { build, provenance };
}

/** The build while it is being put together. */
class Work {
  build: Build;
  private readonly from = new Map<string, Provenance>();

  constructor(base: Build) {
    this.build = structuredClone(base);
  }

  tell(path: string, estimate: Pick<Estimate, 'value'> & { sigma?: number }, from: string): void {
    this.from.set(path, { path, value: estimate.value, sigma: estimate.sigma ?? null, from });
  }

  sources(): Provenance[] {
    return [...this.from.values()];
  }
}

function takeParts(work: Work, parts: PartsResult): void {
  const inertia = work.build.airframe.inertia_kgm2;
  for (const key of ['xx', 'yy', 'zz', 'xy', 'xz', 'yz'] as const) {
    const estimate = parts.quantities[`inertia_${key}_kgm2`];
    inertia[key] = estimate.value;
    work.tell(`airframe.inertia_kgm2.${key}`, estimate, 'estimate from parts');
  }
  const [x, y, z] = parts.centreOfMass_m;
  work.build.airframe.centreOfMass_m = [x.value, y.value, z.value];
  parts.centreOfMass_m.forEach((one, i) =>
    work.tell(`airframe.centreOfMass_m[${i}]`, one, 'estimate from parts'),
  );
  work.build.airframe.mass_kg = parts.mass_kg.value;
  work.tell('airframe.mass_kg', parts.mass_kg, 'sum of parts');
}

function takeBalance(work: Work, balance: BalanceResult): void {
  const axis = 'xyz'.indexOf(balance.axis);
  work.build.airframe.centreOfMass_m[axis] = balance.centre.value;
  work.tell(`airframe.centreOfMass_m[${axis}]`, balance.centre, 'balance');
  if (balance.mass_kg !== null) {
    work.build.airframe.mass_kg = balance.mass_kg;
    work.tell('airframe.mass_kg', { value: balance.mass_kg }, 'weighing');
  }
}

function takeSwing(work: Work, swing: SwingResult): void {
  for (const key of ['xx', 'yy', 'zz'] as const) {
    const estimate = swing.quantities[`inertia_${key}_kgm2`];
    if (estimate === undefined) continue;
    work.build.airframe.inertia_kgm2[key] = estimate.value;
    work.tell(`airframe.inertia_kgm2.${key}`, estimate, 'swing test');
  }
}

function takeStand(work: Work, stand: StandResult): void {
  const { propeller } = work.build;
  const measured = stand.propeller;
  if (Math.abs(measured.diameter_m / propeller.diameter_m - 1) > 0.01) {
    // Another propeller: what was measured in an air flow belongs to the old one.
    delete propeller.advanceTable;
    delete propeller.inPlaneDrag;
    delete propeller.name;
  }
  const baseCp = propeller.powerCoefficient;
  propeller.diameter_m = measured.diameter_m;
  propeller.thrustCoefficient = measured.thrustCoefficient;
  propeller.powerCoefficient = measured.powerCoefficient ?? baseCp;
  work.tell('propeller.diameter_m', { value: measured.diameter_m }, 'as given');
  work.tell('propeller.thrustCoefficient', stand.quantities.thrustCoefficient, 'thrust stand');
  if (measured.powerCoefficient !== undefined) {
    work.tell('propeller.powerCoefficient', stand.quantities.powerCoefficient, 'thrust stand');
  }
  if (measured.staticTable === undefined) delete propeller.staticTable;
  else {
    const ratio = propeller.powerCoefficient / propeller.thrustCoefficient;
    propeller.staticTable = measured.staticTable.map((row) => ({
      rpm: row.rpm,
      ct: row.ct,
      cp: row.cp ?? ratio * row.ct,
    }));
    work.tell(
      'propeller.staticTable',
      { value: measured.staticTable.length },
      measured.powerCoefficient === undefined
        ? 'thrust stand; cp not measured, from the base in step with ct'
        : 'thrust stand',
    );
  }
  takeMotor(work, stand);
  takeDeadZone(work, stand);
}

function takeMotor(work: Work, stand: StandResult): void {
  const { motor } = stand;
  if (motor === null) return;
  const old = work.build.motor;
  const noLoad = motor.noLoadCurrent?.value ?? (isElectric(old) ? old.noLoadCurrent_A : 0);
  work.build.motor = {
    ...(isElectric(old) ? old : {}),
    kv_rpm_per_V: motor.kv.value,
    resistance_ohm: motor.resistance.value,
    noLoadCurrent_A: noLoad,
  };
  work.tell('motor.kv_rpm_per_V', motor.kv, 'thrust stand');
  work.tell('motor.resistance_ohm', motor.resistance, 'thrust stand, ESC included');
  if (motor.noLoadCurrent !== null) work.tell('motor.noLoadCurrent_A', motor.noLoadCurrent, 'thrust stand');
}

function takeDeadZone(work: Work, stand: StandResult): void {
  const dead = stand.quantities.deadZone;
  const { esc } = work.build;
  if (dead === undefined) return;
  const span = esc.max_us - esc.min_us;
  const end = dead.value + Math.sqrt(3) * dead.sigma;
  const end_us = dead.unit === 'µs' ? end : esc.min_us + end * span;
  const idle = Math.ceil(end_us + IDLE_CLEARANCE * span);
  if (idle <= esc.idle_us || idle >= esc.max_us) return;
  esc.idle_us = idle;
  work.tell('esc.idle_us', { value: idle }, 'raised above the dead zone on the thrust stand');
}

/**
 * An electric motor's lag is J/(K_t²/R + dQ/dΩ), with dQ/dΩ = 2Q/Ω of a square-law propeller: the measured lag
 * gives the inertia of propeller and bell. A lagged motor takes the lags as they are.
 */
function takeSpinup(work: Work, spinup: SpinupResult): void {
  const { lag_s: lag, lagDown_s: lagDown } = spinup.quantities;
  const { build } = work;
  if (isElectric(build.motor)) {
    const up = spinup.steps.filter((step) => step.direction === 'up');
    if (lag === undefined || up.length === 0) return;
    const mean_rpm = up.reduce((sum, step) => sum + (step.from_rpm + step.to_rpm) / 2, 0) / up.length;
    const speed = mean_rpm * RAD_PER_S_PER_RPM;
    const torqueConstant = 60 / (2 * Math.PI * build.motor.kv_rpm_per_V);
    const n = speed / (2 * Math.PI);
    const { cp } = staticCoefficients(build.propeller, speed);
    const torque = (cp / (2 * Math.PI)) * SEA_LEVEL_DENSITY * n * n * build.propeller.diameter_m ** 5;
    const inertia = lag.value * (torqueConstant ** 2 / build.motor.resistance_ohm + (2 * torque) / speed);
    build.propeller.inertia_kgm2 = inertia;
    work.tell(
      'propeller.inertia_kgm2',
      { value: inertia, sigma: (inertia * lag.sigma) / lag.value },
      'spin-up lag with KV and R; sigma of the lag alone',
    );
    return;
  }
  if (lag !== undefined) {
    build.motor.lag_s = lag.value;
    work.tell('motor.lag_s', lag, 'spin-up recording');
  }
  if (lagDown !== undefined) {
    build.motor.lagDown_s = lagDown.value;
    work.tell('motor.lagDown_s', lagDown, 'spin-up recording');
  }
  if (spinup.motor.maxSpeed_rpm > build.motor.maxSpeed_rpm) {
    build.motor.maxSpeed_rpm = spinup.motor.maxSpeed_rpm;
    work.tell(
      'motor.maxSpeed_rpm',
      { value: spinup.motor.maxSpeed_rpm },
      'spin-up recording, a speed above the base’s',
    );
  }
}

function takeStill(work: Work, still: StillResult, file: string): void {
  if (still.unitDoubt !== null) {
    const { stated, likely, why } = still.unitDoubt;
    throw refuse(
      file,
      'gyro',
      `columns in ${stated}`,
      `a settled unit: ${why}; give the columns ${likely} or confirm ${stated}`,
    );
  }
  const { gyro, accelerometer } = work.build;
  const record = still.gyro;
  if (record.noise_dps_per_rtHz > 0) {
    gyro.noise_dps_per_rtHz = record.noise_dps_per_rtHz;
    const sigmas = Object.values(still.axes).map((one) => one.noise.sigma);
    work.tell(
      'gyro.noise_dps_per_rtHz',
      { value: record.noise_dps_per_rtHz, sigma: Math.max(...sigmas) },
      'gyro at rest',
    );
  }
  // A flat spectrum only says that the bandwidth lies above what the record shows.
  if (record.bandwidth_Hz > 0 || gyro.bandwidth_Hz < 0.3 * still.sampling.rate_Hz) {
    gyro.bandwidth_Hz = record.bandwidth_Hz;
    work.tell('gyro.bandwidth_Hz', { value: record.bandwidth_Hz }, 'gyro at rest, shape of its noise');
  }
  gyro.bias_dps = [...record.bias_dps];
  record.bias_dps.forEach((value, i) => work.tell(`gyro.bias_dps[${i}]`, { value }, 'gyro at rest'));
  if (record.resolution_dps > 0) {
    gyro.resolution_dps = record.resolution_dps;
    work.tell('gyro.resolution_dps', { value: record.resolution_dps }, 'gyro at rest');
  }
  if (record.drift_dps_per_rts !== undefined) {
    gyro.drift_dps_per_rts = record.drift_dps_per_rts;
    work.tell('gyro.drift_dps_per_rts', { value: record.drift_dps_per_rts }, 'Allan deviation at rest');
  }
  if (record.vibration_dps !== undefined && still.rotor !== null) {
    // The build's amplitude is that of the body; the sensor's bandwidth has already weakened the record's.
    const { speed_Hz } = still.rotor;
    const passed = gyro.bandwidth_Hz === 0 ? 1 : 1 / Math.hypot(1, speed_Hz / gyro.bandwidth_Hz);
    const ratio = (hoverSpeed_Hz(work.build) / speed_Hz) ** 2 / passed;
    const [x, y, z] = record.vibration_dps.map((value) => ratio * value);
    gyro.vibration_dps = [x, y, z];
    [x, y, z].forEach((value, i) =>
      work.tell(
        `gyro.vibration_dps[${i}]`,
        { value },
        'gyro with rotors turning, scaled to hover speed by Ω²',
      ),
    );
  }
  if (still.accelerometer === null) return;
  accelerometer.noise_mps2_per_rtHz = still.accelerometer.noise_mps2_per_rtHz;
  accelerometer.resolution_mps2 = still.accelerometer.resolution_mps2;
  work.tell(
    'accelerometer.noise_mps2_per_rtHz',
    { value: accelerometer.noise_mps2_per_rtHz },
    'accelerometer at rest',
  );
  work.tell(
    'accelerometer.resolution_mps2',
    { value: accelerometer.resolution_mps2 },
    'accelerometer at rest',
  );
}

/** Rotor speed at which four rotors carry the craft at sea level, by bisection. */
function hoverSpeed_Hz(build: Build): number {
  const share_N = (build.airframe.mass_kg * GRAVITY_MPS2) / 4;
  let low = 0;
  let high = 20_000;
  for (let i = 0; i < 60; i++) {
    const speed = (low + high) / 2;
    if (staticThrustAtSpeed_N(build.propeller, speed).thrust_N < share_N) low = speed;
    else high = speed;
  }
  return high / (2 * Math.PI);
}

const LONGEST_NOTE = 4000;

function noteOf(base: Build, provenance: readonly Provenance[]): string | undefined {
  if (provenance.length === 0) return base.note;
  const lines = provenance.map(({ path, value, sigma, from }) => {
    const doubt = sigma === null ? '' : ` ± ${Number((1.96 * sigma).toPrecision(2))} (95 %)`;
    return `${path} ${Number(value.toPrecision(5))}${doubt}: ${from}`;
  });
  return `${base.note === undefined ? '' : `${base.note}\n`}Measured: ${lines.join('; ')}.`.slice(
    0,
    LONGEST_NOTE,
  );
}
