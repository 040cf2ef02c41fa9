/**
 * Thrust stand to propeller: C_T = T/(ρ n² D⁴) and C_P = P/(ρ n³ D⁵) against speed, n in rev/s, with outliers
 * shown, the static table for the build, and what a constant coefficient would cost.
 */
import { median } from 'simple-statistics';
import { InputError, refuse } from '../craft/problem.ts';
import { figureOfMerit } from '../craft/plausible.ts';
import { siteAir } from '../physics/atmosphere.ts';
import type { ColumnMapping, Table } from './columns.ts';
import {
  halfWidth95,
  loopGainSentence,
  percent,
  quantified,
  smallSampleFactor,
  type Quantified,
} from './estimate.ts';
import { leastSquares, OUTLIER_Z, robustLine, robustScale } from './regression.ts';
import {
  commandMap,
  deadZone,
  efficiencyCurve,
  motorConstants,
  voltageGroups,
  type CommandMap,
  type EfficiencyPoint,
  type EscRange,
  type MotorFit,
  type VoltageGroup,
} from './standMotor.ts';
import { standRows, type StandRow } from './standRows.ts';
import { doubtCt, doubtSentence, doubtTorque, POSSIBLE_CT, type UnitDoubt } from './standUnits.ts';

const RPM = 30 / Math.PI;
/** Rows closer than this in speed are one point of the table. */
const SAME_SPEED = 0.01;
/** More rows than this are gathered in bins. */
const MOST_SINGLE_ROWS = 40;
const BINS = 20;
/** Scatter a stand may have at least before a row is called an outlier: 1 % of full scale is a good stand. */
const LEAST_SCATTER = 0.01;
/** A point of the table with a sigma beyond this share says nothing. */
const WORST_POINT = 0.15;
/** Beyond these it is the unit that is wrong: no two units of torque lie closer. Between, a doubt is told. */
const IMPOSSIBLE_MERIT = [0.05, 3];

export interface StandOptions {
  readonly diameter_m: number;
  readonly density_kgpm3?: number;
  readonly elevation_m?: number;
  readonly temperature_K?: number;
  readonly pressure_Pa?: number;
  /** Magnet poles, for a column of electrical speed. */
  readonly poles?: number;
  readonly esc?: EscRange;
  /** Columns as the user corrected them, for every file. */
  readonly mapping?: ColumnMapping;
}

export interface TablePoint {
  readonly rpm: number;
  readonly ct: number;
  readonly ctSigma: number;
  readonly cp: number | null;
  readonly cpSigma: number | null;
  readonly rows: number;
}

export interface StandResidual {
  readonly file: string;
  readonly row: number;
  readonly speed_rpm: number;
  readonly thrust_N: number | null;
  readonly ct: number;
  readonly ctResidual_pct: number;
  readonly cp: number | null;
  readonly cpResidual_pct: number | null;
  /** Why the row was left out of the fit; null when it was used. */
  readonly outlier: string | null;
}

export interface ConstantCost {
  /** Largest coefficient over the smallest, less one. */
  readonly range_pct: number;
  /** Largest and root-mean-square error of the constant over the measured speeds. */
  readonly worst_pct: number;
  readonly rms_pct: number;
}

export interface StandResult {
  readonly measurement: 'stand';
  /** As the build file takes it; powerCoefficient and the table's cp only where torque was measured. */
  readonly propeller: {
    readonly diameter_m: number;
    readonly thrustCoefficient: number;
    readonly powerCoefficient?: number;
    readonly staticTable?: readonly { readonly rpm: number; readonly ct: number; readonly cp?: number }[];
  };
  readonly quantities: Readonly<Record<string, Quantified>>;
  readonly air: { readonly density_kgpm3: number; readonly source: string };
  readonly table: readonly TablePoint[];
  readonly constantCost: { readonly thrust: ConstantCost; readonly power: ConstantCost | null };
  readonly residuals: readonly StandResidual[];
  readonly outliers: readonly StandResidual[];
  readonly voltages: readonly VoltageGroup[];
  readonly commandMap: CommandMap;
  readonly efficiency: readonly EfficiencyPoint[];
  readonly motor: MotorFit | null;
  readonly doubts: readonly UnitDoubt[];
  readonly mappings: readonly { readonly file: string; readonly columns: ColumnMapping }[];
  readonly notes: readonly string[];
}

/**
 * Evaluates one or more tables of the same propeller (several voltages may be several files).
 * @throws InputError for columns that are missing, units that cannot be, speeds or values out of bounds.
 */
export function analyseStand(tables: readonly Table[], options: StandOptions): StandResult {
  const air = airOf(options);
  const parts = tables.map((table) =>
    standRows(table, options.diameter_m, air, options.mapping, options.poles),
  );
  const notes = parts.flatMap((part) => part.notes);
  if (air.assumed)
    notes.push(`Air: ${air.source}. Give the density or the day's air: 3 % in density is 3 % in C_T.`);
  const rows = parts.flatMap((part) => part.turning);
  const used = parts[0].mapping;
  const doubts = doubtsOf(rows, used, tables[0].file);
  const thrust = fitCoefficient(rows, (row) => row.ct);
  if (thrust === null) {
    throw refuse(
      tables[0].file,
      'thrust',
      `${rows.length} usable rows`,
      'at least 2 rows with thrust above 0 and the propeller turning',
    );
  }
  const power = fitCoefficient(rows, (row) => row.cp);
  const table = tableOf(rows, thrust, power, notes);
  const motor = motorOf(rows, parts[0].commandUnit, options.esc, notes);
  const residuals = residualsOf(rows, thrust, power);
  notes.push(...doubts.map(doubtSentence));
  if (power === null) notes.push('No torque column: the power coefficient was not measured.');
  return {
    measurement: 'stand',
    propeller: propellerOf(options.diameter_m, thrust, power, table),
    quantities: quantitiesOf(thrust, power, motor, deadZone(parts), rows),
    air: { density_kgpm3: air.density_kgpm3, source: air.source },
    table,
    constantCost: {
      thrust: costOf(
        table.map((point) => point.ct),
        thrust.constant,
      ),
      power:
        power === null
          ? null
          : costOf(
              table.map((point) => point.cp ?? NaN),
              power.constant,
            ),
    },
    residuals,
    outliers: residuals.filter((row) => row.outlier !== null),
    voltages: voltageGroups(rows),
    commandMap: commandMap(rows),
    efficiency: efficiencyCurve(rows),
    motor,
    doubts,
    mappings: parts.map((part) => ({ file: part.file, columns: part.mapping })),
    notes,
  };
}

function airOf(options: StandOptions): { density_kgpm3: number; source: string; assumed: boolean } {
  if (options.density_kgpm3 !== undefined) {
    return { density_kgpm3: options.density_kgpm3, source: 'density as given', assumed: false };
  }
  const { elevation_m, temperature_K, pressure_Pa } = options;
  if (elevation_m === undefined && temperature_K === undefined && pressure_Pa === undefined) {
    const air = siteAir({ elevation_m: 0 });
    return {
      density_kgpm3: air.density_kgpm3,
      source: 'ISO 2533 at sea level, for want of anything better',
      assumed: true,
    };
  }
  const air = siteAir({ elevation_m: elevation_m ?? 0, temperature_K, pressure_Pa });
  const given = [
    elevation_m === undefined ? '' : `elevation ${elevation_m} m`,
    temperature_K === undefined ? '' : `temperature ${temperature_K} K`,
    pressure_Pa === undefined ? '' : `pressure ${pressure_Pa} Pa`,
  ].filter((text) => text !== '');
  return { density_kgpm3: air.density_kgpm3, source: `ISO 2533 with ${given.join(', ')}`, assumed: false };
}

/** Doubts about units; impossible coefficients are refused with the unit that would fit. */
function doubtsOf(rows: readonly StandRow[], mapping: ColumnMapping, file: string): UnitDoubt[] {
  const positive = rows.filter((row) => row.ct !== null && row.ct > 0);
  if (positive.length === 0) return [];
  const ct = median(positive.map((row) => row.ct ?? 0));
  const doubt = doubtCt(ct, mapping.thrust?.unit ?? null, mapping.speed?.unit ?? null);
  if (doubt !== null && (ct < POSSIBLE_CT[0] || ct > POSSIBLE_CT[1])) {
    const head = mapping[doubt.column]?.column ?? doubt.column;
    throw refuse(
      file,
      `column ${head}`,
      `${doubt.stated} giving C_T ${Number(ct.toPrecision(3))}`,
      `units that give a C_T from ${POSSIBLE_CT[0]} to ${POSSIBLE_CT[1]}; ${doubtSentence(doubt)}`,
    );
  }
  const withTorque = positive.filter((row) => row.cp !== null && row.cp > 0);
  const merit = withTorque.map((row) => figureOfMerit(row.ct ?? 0, row.cp ?? 1));
  const torque = merit.length === 0 ? null : doubtTorque(median(merit), mapping.torque?.unit ?? null);
  if (torque !== null && (median(merit) > IMPOSSIBLE_MERIT[1] || median(merit) < IMPOSSIBLE_MERIT[0])) {
    throw new InputError(file, [
      {
        path: `column ${mapping.torque?.column ?? 'torque'}`,
        value: `${torque.stated} giving a figure of merit of ${Number(median(merit).toPrecision(3))}`,
        allowed: `units that give one below 1; ${doubtSentence(torque)}`,
      },
    ]);
  }
  return [doubt, torque].filter((one) => one !== null);
}

interface CoefficientFit {
  /** The coefficient of each row; null where the row has none. */
  readonly values: readonly (number | null)[];
  /** ln coefficient = a + exponent · ln speed, speed in rad/s. */
  readonly a: number;
  readonly exponent: number;
  readonly exponentSigma: number;
  readonly constant: number;
  readonly constantSigma: number;
  /** Weight of each row, up to 1: small forces carry larger relative errors. */
  readonly weights: readonly number[];
  readonly outlier: readonly (string | null)[];
  /** Relative scatter of a row of weight 1. */
  readonly scatter: number;
}

/**
 * Power law through the coefficient, robust first (Theil–Sen, outliers by the modified z-score of Iglewicz &
 * Hoaglin), then weighted least squares over the rest.
 */
function fitCoefficient(
  rows: readonly StandRow[],
  pick: (row: StandRow) => number | null,
): CoefficientFit | null {
  const values = rows.map(pick);
  const usable = rows.map((_, i) => i).filter((i) => (values[i] ?? 0) > 0);
  if (usable.length < 2) return null;
  const force = (i: number) => (values[i] ?? 0) * rows[i].speed_radps ** 2;
  const middle = median(usable.map(force));
  const weights = rows.map((_, i) => Math.max(0.02, Math.min(1, force(i) / middle)));
  const x = (i: number) => Math.log(rows[i].speed_radps);
  const y = (i: number) => Math.log(values[i] ?? 1);
  const line = robustLine(usable.map(x), usable.map(y));
  const off = new Map(usable.map((i) => [i, weights[i] * (y(i) - line.a - line.b * x(i))]));
  const scale = Math.max(robustScale([...off.values()]), LEAST_SCATTER);
  const outlier = rows.map((_, i) => {
    const value = values[i];
    if (value === null) return null;
    if (value <= 0) return 'not above 0';
    const z = (off.get(i) ?? 0) / scale;
    return Math.abs(z) > OUTLIER_Z
      ? `${Math.abs(z).toFixed(1)} times the usual scatter ${z > 0 ? 'above' : 'below'} the rest`
      : null;
  });
  const kept = usable.filter((i) => outlier[i] === null);
  return kept.length < 2 ? null : refine(values, kept, x, y, weights, outlier);
}

function refine(
  values: readonly (number | null)[],
  kept: readonly number[],
  x: (i: number) => number,
  y: (i: number) => number,
  weights: readonly number[],
  outlier: readonly (string | null)[],
): CoefficientFit {
  const w = kept.map((i) => weights[i]);
  const fit = leastSquares(
    kept.map((i) => [1, x(i)]),
    kept.map(y),
    w,
  );
  const squares = w.reduce((sum, one) => sum + one * one, 0);
  const constant = kept.reduce((sum, i, k) => sum + w[k] ** 2 * (values[i] ?? 0), 0) / squares;
  // One speed only: no slope to tell.
  const flat = fit ?? {
    coefficients: [Math.log(constant), 0],
    sigmas: [0, 0],
    scatter: Math.sqrt(
      kept.reduce((sum, i, k) => sum + (w[k] * ((values[i] ?? 0) / constant - 1)) ** 2, 0) /
        Math.max(1, kept.length - 1),
    ),
    degrees: kept.length - 1,
  };
  const widen = smallSampleFactor(Math.max(1, flat.degrees));
  return {
    values,
    a: flat.coefficients[0],
    exponent: flat.coefficients[1],
    exponentSigma: widen * flat.sigmas[1],
    constant,
    constantSigma: (widen * constant * flat.scatter) / Math.sqrt(squares),
    weights,
    outlier,
    scatter: flat.scatter,
  };
}

const lawAt = (fit: CoefficientFit, speed_radps: number): number =>
  Math.exp(fit.a + fit.exponent * Math.log(speed_radps));

function residualsOf(
  rows: readonly StandRow[],
  thrust: CoefficientFit,
  power: CoefficientFit | null,
): StandResidual[] {
  return rows.flatMap((row, i): StandResidual[] => {
    if (row.ct === null) return [];
    const causes = [
      thrust.outlier[i] === null ? '' : `thrust ${thrust.outlier[i]}`,
      power === null || power.outlier[i] === null ? '' : `torque ${power.outlier[i]}`,
    ].filter((text) => text !== '');
    return [
      {
        file: row.file,
        row: row.row,
        speed_rpm: RPM * row.speed_radps,
        thrust_N: row.thrust_N,
        ct: row.ct,
        ctResidual_pct: 100 * (row.ct / lawAt(thrust, row.speed_radps) - 1),
        cp: row.cp,
        cpResidual_pct:
          row.cp === null || power === null ? null : 100 * (row.cp / lawAt(power, row.speed_radps) - 1),
        outlier: causes.length === 0 ? null : causes.join('; '),
      },
    ];
  });
}

/** Points of the table: single rows, or bins of equal steps in log speed; each moved to its speed by the power law. */
function tableOf(
  rows: readonly StandRow[],
  thrust: CoefficientFit,
  power: CoefficientFit | null,
  notes: string[],
): TablePoint[] {
  const good = rows.map((_, i) => i).filter((i) => thrust.values[i] !== null && thrust.outlier[i] === null);
  good.sort((a, b) => rows[a].speed_radps - rows[b].speed_radps);
  const groups: number[][] = [];
  const span = Math.log(rows[good[good.length - 1]].speed_radps / rows[good[0]].speed_radps);
  const width = good.length > MOST_SINGLE_ROWS ? Math.max(span / BINS, SAME_SPEED) : SAME_SPEED;
  for (const i of good) {
    const start = groups[groups.length - 1]?.[0];
    if (start === undefined || Math.log(rows[i].speed_radps / rows[start].speed_radps) > width)
      groups.push([i]);
    else groups[groups.length - 1].push(i);
  }
  const points = groups.map((group) => pointOf(group, rows, thrust, power));
  const sure = points.filter((point) => point.ctSigma <= WORST_POINT * point.ct);
  if (sure.length < points.length && sure.length >= 1) {
    notes.push(
      `${points.length - sure.length} points at low speed are known to worse than ${percent(WORST_POINT)} and are not in the table.`,
    );
  }
  return sure.length === 0 ? points : sure;
}

function pointOf(
  group: readonly number[],
  rows: readonly StandRow[],
  thrust: CoefficientFit,
  power: CoefficientFit | null,
): TablePoint {
  const log = group.reduce((sum, i) => sum + Math.log(rows[i].speed_radps), 0) / group.length;
  const speed = Math.exp(log);
  const ct = average(group, rows, thrust, speed);
  const withPower =
    power === null ? [] : group.filter((i) => power.values[i] !== null && power.outlier[i] === null);
  const cp = power === null || withPower.length === 0 ? null : average(withPower, rows, power, speed);
  // A row whose torque is an outlier takes the power law's value, so that no point lacks a C_P.
  const lawCp =
    power === null ? null : { value: lawAt(power, speed), sigma: power.scatter * lawAt(power, speed) };
  const settled = cp ?? lawCp;
  return {
    rpm: RPM * speed,
    ct: ct.value,
    ctSigma: ct.sigma,
    cp: settled?.value ?? null,
    cpSigma: settled?.sigma ?? null,
    rows: group.length,
  };
}

function average(
  group: readonly number[],
  rows: readonly StandRow[],
  fit: CoefficientFit,
  speed: number,
): { value: number; sigma: number } {
  let sum = 0;
  let squares = 0;
  for (const i of group) {
    const ratio = (fit.values[i] ?? 0) / lawAt(fit, rows[i].speed_radps);
    sum += fit.weights[i] ** 2 * ratio;
    squares += fit.weights[i] ** 2;
  }
  const value = (sum / squares) * lawAt(fit, speed);
  return { value, sigma: (value * fit.scatter) / Math.sqrt(squares) };
}

function costOf(values: readonly number[], constant: number): ConstantCost {
  const errors = values.map((value) => 100 * (constant / value - 1));
  return {
    range_pct: 100 * (Math.max(...values) / Math.min(...values) - 1),
    worst_pct: Math.max(...errors.map(Math.abs)),
    rms_pct: Math.sqrt(errors.reduce((sum, one) => sum + one * one, 0) / errors.length),
  };
}

/** Six figures: more than any stand measures. */
const rounded = (value: number): number => Number(value.toPrecision(6));

function propellerOf(
  diameter_m: number,
  thrust: CoefficientFit,
  power: CoefficientFit | null,
  table: readonly TablePoint[],
): StandResult['propeller'] {
  const rising = table.filter((point, i) => i === 0 || point.rpm > table[i - 1].rpm);
  return {
    diameter_m,
    thrustCoefficient: rounded(thrust.constant),
    ...(power === null ? {} : { powerCoefficient: rounded(power.constant) }),
    ...(rising.length < 2
      ? {}
      : {
          staticTable: rising.map((point) => ({
            rpm: rounded(point.rpm),
            ct: rounded(point.ct),
            ...(point.cp === null ? {} : { cp: rounded(point.cp) }),
          })),
        }),
  };
}

function motorOf(
  rows: readonly StandRow[],
  unit: 'µs' | 'share' | null,
  esc: EscRange | undefined,
  notes: string[],
): MotorFit | null {
  if (unit === null || !rows.some((row) => row.voltage_V !== null && row.current_A !== null)) return null;
  const range = esc ?? { min_us: 1000, max_us: 2000 };
  const motor = motorConstants(rows, unit, range, notes);
  if (motor !== null && esc === undefined && unit === 'µs') {
    notes.push(
      'KV and R take 1000 to 2000 µs as the whole range of the ESC; give its own range if it differs.',
    );
  }
  return motor;
}

/** Never "-0.00". */
function twoPlaces(value: number): string {
  return (Math.round(100 * value) / 100 + 0).toFixed(2);
}

function quantitiesOf(
  thrust: CoefficientFit,
  power: CoefficientFit | null,
  motor: MotorFit | null,
  dead: Quantified | null,
  rows: readonly StandRow[],
): Record<string, Quantified> {
  const estimate = { value: thrust.constant, sigma: thrust.constantSigma, unit: '1' };
  const out: Record<string, Quantified> = {
    thrustCoefficient: quantified(estimate, loopGainSentence('The thrust coefficient', estimate)),
    thrustExponent: quantified(
      { value: thrust.exponent, sigma: thrust.exponentSigma, unit: '1' },
      `C_T goes with speed to the power ${twoPlaces(thrust.exponent)}: with a constant the plant gain at full throttle and at idle would be wrong by that much, so the table is used.`,
    ),
  };
  if (power !== null) {
    const cp = { value: power.constant, sigma: power.constantSigma, unit: '1' };
    out.powerCoefficient = quantified(
      cp,
      `Known to ±${percent(halfWidth95(cp))} (95 %): yaw is turned by this torque, so the yaw gain is uncertain by as much.`,
    );
  }
  if (dead !== null) out.deadZone = dead;
  const efficiency = efficiencyCurve(rows);
  if (efficiency.length >= 3) {
    const values = efficiency.map((point) => point.efficiency_gPerW);
    const middle = median(values);
    out.efficiency_gPerW = quantified(
      { value: middle, sigma: robustScale(values), unit: 'g/W' },
      'Median over the run, sigma its spread: it sets the hover time, not the gains.',
    );
  }
  if (motor !== null) {
    out.kv_rpm_per_V = motor.kv;
    out.resistance_ohm = motor.resistance;
    if (motor.noLoadCurrent !== null) out.noLoadCurrent_A = motor.noLoadCurrent;
  }
  return out;
}
