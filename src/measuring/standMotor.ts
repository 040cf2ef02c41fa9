/**
 * What else a thrust stand tells: dead zone, command to speed, efficiency, and the motor's constants from
 * u V = R i + K_e Ω with i = I/u (steady, lossless ESC), K_t = K_e = 60/(2π KV), I₀ = i − Q/K_t.
 */
import { mean } from 'simple-statistics';
import { quantified, smallSampleFactor, stepSigma, type Quantified } from './estimate.ts';
import { extent, leastSquares, OUTLIER_Z, robustScale } from './regression.ts';
import type { StandRow, StandRows } from './standRows.ts';

const RPM = 30 / Math.PI;
const GRAMS_PER_NEWTON = 1000 / 9.80665;
/** Below this duty I/u says little of the winding's current. */
const LEAST_DUTY = 0.15;
const LEAST_CURRENT_A = 0.05;
/** A gap this wide between sorted voltages parts two packs. */
const VOLTAGE_GAP_SHARE = 0.05;
const VOLTAGE_GAP_V = 0.8;

export interface EscRange {
  readonly min_us: number;
  readonly max_us: number;
}

export interface VoltageGroup {
  readonly file: string;
  readonly rows: number;
  readonly lowest_V: number;
  readonly highest_V: number;
  readonly topSpeed_rpm: number;
  readonly topThrust_N: number | null;
}

interface CommandPoint {
  readonly command: number;
  readonly speed_rpm: number;
  readonly voltage_V: number | null;
  readonly rows: number;
}

export interface CommandMap {
  readonly points: readonly CommandPoint[];
  /** Largest distance from a straight line, of the top speed; null for fewer than three points. */
  readonly straightLine_pct: number | null;
}

export interface EfficiencyPoint {
  readonly thrust_N: number;
  readonly efficiency_gPerW: number;
  readonly voltage_V: number | null;
}

export interface MotorFit {
  readonly kv: Quantified;
  readonly resistance: Quantified;
  readonly noLoadCurrent: Quantified | null;
  /** Rows used, and rms of u V − R i − K_e Ω, V. */
  readonly rows: number;
  readonly residual_V: number;
  readonly residuals: readonly { readonly row: number; readonly file: string; readonly residual_V: number }[];
}

export function voltageGroups(rows: readonly StandRow[]): VoltageGroup[] {
  const files = [...new Set(rows.map((row) => row.file))];
  return files.flatMap((file) => {
    const own = rows.filter((row) => row.file === file && row.voltage_V !== null && row.voltage_V > 0);
    const sorted = own.sort((a, b) => (a.voltage_V ?? 0) - (b.voltage_V ?? 0));
    const groups: StandRow[][] = [];
    for (const row of sorted) {
      const last = groups[groups.length - 1]?.at(-1)?.voltage_V ?? -Infinity;
      const gap = (row.voltage_V ?? 0) - last;
      if (gap > Math.max(VOLTAGE_GAP_V, VOLTAGE_GAP_SHARE * last)) groups.push([row]);
      else groups[groups.length - 1].push(row);
    }
    return groups.map((group) => ({
      file,
      rows: group.length,
      lowest_V: group[0].voltage_V ?? 0,
      highest_V: group[group.length - 1].voltage_V ?? 0,
      topSpeed_rpm: RPM * extent(group.map((row) => row.speed_radps))[1],
      topThrust_N: group.some((row) => row.thrust_N !== null)
        ? extent(group.map((row) => row.thrust_N ?? -Infinity))[1]
        : null,
    }));
  });
}

/** Command between the last that leaves the motor still and the first that turns it. */
export function deadZone(parts: readonly StandRows[]): Quantified | null {
  const unit = parts[0].commandUnit;
  if (unit === null) return null;
  const commands = (rows: readonly StandRow[]) =>
    rows.map((row) => row.command).filter((value) => value !== null);
  const turning = parts.flatMap((part) => commands(part.turning));
  const still = parts.flatMap((part) => commands(part.still));
  if (turning.length === 0) return null;
  const [first] = extent(turning);
  const below = still.filter((value) => value < first);
  if (below.length === 0) return null;
  const [, last] = extent(below);
  return quantified(
    { value: (first + last) / 2, sigma: stepSigma(first - last), unit: unit === 'µs' ? 'µs' : '1' },
    `The motor starts to turn between ${last} and ${first} ${unit}: set the idle command above it, or a rotor stops in flight and the axis loses its control for as long as it takes to start.`,
  );
}

/** Mean speed for each command, at most 60 points, and how far from a straight line they lie. */
export function commandMap(rows: readonly StandRow[]): CommandMap {
  const groups = new Map<number, StandRow[]>();
  const all = rows.filter((row) => row.command !== null);
  const largest = all.reduce((most, row) => Math.max(most, row.command ?? 0), 0);
  const distinct = new Set(all.map((row) => row.command)).size;
  // Few commands are kept as they are; many are gathered in steps of a fiftieth.
  const step = distinct <= 60 ? 0 : largest / 50;
  for (const row of all) {
    const command = row.command ?? 0;
    const key = step === 0 ? command : Math.round(command / step) * step;
    const group = groups.get(key);
    if (group === undefined) groups.set(key, [row]);
    else group.push(row);
  }
  const points = [...groups.values()]
    .map((group) => ({
      command: mean(group.map((row) => row.command ?? 0)),
      speed_rpm: RPM * mean(group.map((row) => row.speed_radps)),
      voltage_V: group.every((row) => row.voltage_V !== null)
        ? mean(group.map((row) => row.voltage_V ?? 0))
        : null,
      rows: group.length,
    }))
    .sort((a, b) => a.command - b.command);
  if (points.length < 3) return { points, straightLine_pct: null };
  const line = leastSquares(
    points.map((point) => [1, point.command]),
    points.map((point) => point.speed_rpm),
  );
  const top = Math.max(...points.map((point) => point.speed_rpm));
  const worst = line === null ? null : Math.max(...line.residuals.map(Math.abs));
  return { points, straightLine_pct: worst === null ? null : (100 * worst) / top };
}

export function efficiencyCurve(rows: readonly StandRow[]): EfficiencyPoint[] {
  return rows
    .filter((row) => row.power_W !== null && row.power_W > 0.1 && row.thrust_N !== null && row.thrust_N > 0)
    .map((row) => ({
      thrust_N: row.thrust_N ?? 0,
      efficiency_gPerW: ((row.thrust_N ?? 0) * GRAMS_PER_NEWTON) / (row.power_W ?? 1),
      voltage_V: row.voltage_V,
    }))
    .sort((a, b) => a.thrust_N - b.thrust_N);
}

interface Electrical {
  readonly row: StandRow;
  readonly duty: number;
  readonly voltage: number;
  readonly current: number;
}

/**
 * KV, R and I₀ from speed, voltage, current and command.
 * @returns null when the columns are not there or do not tell K_e from R.
 */
export function motorConstants(
  rows: readonly StandRow[],
  unit: 'µs' | 'share',
  esc: EscRange,
  notes: string[],
): MotorFit | null {
  const usable = rows.flatMap((row): Electrical[] => {
    if (row.command === null || row.voltage_V === null || row.current_A === null) return [];
    const duty = unit === 'share' ? row.command : (row.command - esc.min_us) / (esc.max_us - esc.min_us);
    if (duty < LEAST_DUTY || duty > 1.0001 || row.current_A < LEAST_CURRENT_A || row.voltage_V < 1) return [];
    return [{ row, duty, voltage: row.voltage_V, current: row.current_A }];
  });
  let kept = usable;
  let fit = fitMotor(kept);
  if (fit === null) return null;
  const scale = Math.max(robustScale(fit.residuals), 0.002 * extent(kept.map((one) => one.voltage))[1]);
  const limit = OUTLIER_Z * scale;
  const first = fit;
  const good = kept.filter((_, i) => Math.abs(first.residuals[i]) <= limit);
  if (good.length < kept.length && good.length >= 4) {
    notes.push(
      `${kept.length - good.length} rows do not fit u V = R i + K_e Ω and were left out of KV and R.`,
    );
    kept = good;
    fit = fitMotor(kept);
  }
  if (fit === null || !(fit.coefficients[0] > 0) || !(fit.coefficients[1] > 0)) {
    notes.push(
      'Voltage, current, speed and command do not give a motor: R or KV comes out below 0. Is the command range of the ESC right?',
    );
    return null;
  }
  return describeMotor(kept, fit, notes);
}

const fitMotor = (rows: readonly Electrical[]) =>
  rows.length < 4
    ? null
    : leastSquares(
        rows.map((one) => [one.current / one.duty, one.row.speed_radps]),
        rows.map((one) => one.duty * one.voltage),
      );

function describeMotor(
  rows: readonly Electrical[],
  fit: NonNullable<ReturnType<typeof leastSquares>>,
  notes: string[],
): MotorFit {
  const [resistance, ke] = fit.coefficients;
  const widen = smallSampleFactor(fit.degrees);
  const kv = 60 / (2 * Math.PI * ke);
  const highest = extent(rows.map((one) => one.voltage))[1];
  if (fit.scatter > 0.03 * highest) {
    notes.push(
      `u V = R i + K_e Ω leaves ${fit.scatter.toFixed(2)} V: the ESC's command is perhaps no straight line in duty, so KV and R are rough.`,
    );
  }
  const noLoad = noLoadCurrent(rows, ke, notes);
  return {
    kv: quantified(
      { value: kv, sigma: (widen * kv * fit.sigmas[1]) / ke, unit: 'rev/min per V' },
      `Speed per µs, and so the plant gain of every axis, goes with KV: ${((196 * widen * fit.sigmas[1]) / ke).toFixed(1)} % (95 %) here is as much in the gains.`,
    ),
    resistance: quantified(
      { value: resistance, sigma: widen * fit.sigmas[0], unit: 'Ω' },
      'Motor and ESC together. A larger R makes the motor slower to follow (lag ∝ R) and sags more under load: less derivative gain, less reach at low battery.',
    ),
    noLoadCurrent: noLoad,
    rows: rows.length,
    residual_V: fit.scatter,
    residuals: rows.map((one, i) => ({ row: one.row.row, file: one.row.file, residual_V: fit.residuals[i] })),
  };
}

/** From torque where it was measured; otherwise from i = I₀ + c Ω², a propeller's torque being ∝ Ω². */
function noLoadCurrent(rows: readonly Electrical[], ke: number, notes: string[]): Quantified | null {
  const meaning = 'Friction and iron loss: it lowers efficiency, hardly the gains.';
  const withTorque = rows.filter((one) => one.row.torque_Nm !== null);
  if (withTorque.length >= 4) {
    const values = withTorque.map((one) => one.current / one.duty - (one.row.torque_Nm ?? 0) / ke);
    const value = mean(values);
    const spread = Math.sqrt(
      values.reduce((sum, one) => sum + (one - value) ** 2, 0) / (values.length - 1) / values.length,
    );
    if (value < 0) {
      notes.push('I₀ comes out below 0: torque or current is off by a factor; I₀ left out.');
      return null;
    }
    return quantified({ value, sigma: spread * smallSampleFactor(values.length - 1), unit: 'A' }, meaning);
  }
  const fit = leastSquares(
    rows.map((one) => [1, one.row.speed_radps ** 2]),
    rows.map((one) => one.current / one.duty),
  );
  if (fit === null || !(fit.coefficients[0] > 0)) return null;
  notes.push(
    'I₀ is read off the current at speed 0 of a propeller’s square law, for want of a torque column.',
  );
  return quantified(
    { value: fit.coefficients[0], sigma: fit.sigmas[0] * smallSampleFactor(fit.degrees), unit: 'A' },
    meaning,
  );
}
