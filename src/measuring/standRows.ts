/** Rows of a thrust stand in SI, tared, with what each is good for. */
import { median } from 'simple-statistics';
import { refuse } from '../craft/problem.ts';
import {
  columnInSI,
  proposeMapping,
  type ColumnChoice,
  type ColumnKey,
  type ColumnMapping,
  type Table,
} from './columns.ts';
import { extent } from './regression.ts';

export interface StandRow {
  /** Row in the file, counted from 1. */
  readonly row: number;
  readonly file: string;
  readonly speed_radps: number;
  readonly thrust_N: number | null;
  readonly torque_Nm: number | null;
  readonly ct: number | null;
  readonly cp: number | null;
  readonly command: number | null;
  readonly voltage_V: number | null;
  readonly current_A: number | null;
  /** Electrical power, from its own column or voltage times current. */
  readonly power_W: number | null;
}

export interface StandRows {
  readonly file: string;
  /** Rows with the propeller turning. */
  readonly turning: readonly StandRow[];
  /** Rows at rest, for tare and dead zone. */
  readonly still: readonly StandRow[];
  readonly mapping: ColumnMapping;
  readonly commandUnit: 'µs' | 'share' | null;
  readonly notes: readonly string[];
}

export interface StandAir {
  readonly density_kgpm3: number;
}

/** Below this a propeller counts as standing still, rad/s (about 95 rev/min). */
const STILL_RADPS = 10;
/** Beyond this no propeller turns (200,000 rev/min, the build file's bound). */
const FASTEST_RADPS = 20_944;
const WANTED: readonly ColumnKey[] = [
  'speed',
  'electricalSpeed',
  'thrust',
  'torque',
  'shaftPower',
  'thrustCoefficient',
  'powerCoefficient',
  'torqueCoefficient',
  'command',
  'voltage',
  'current',
  'power',
];

/** Units that go without saying where a head states none; thrust and torque are in too many to guess. */
const PLAIN_UNITS: Partial<Record<ColumnKey, string>> = { voltage: 'V', current: 'A', power: 'W' };

type Columns = Partial<Record<ColumnKey, Float64Array>>;

/**
 * Takes the mapped columns of one file.
 * @param changes what the user corrected in the proposed mapping
 * @param poles of the motor, for a column of electrical speed
 * @throws InputError for a missing column, a unit that does not fit, a cell that is no number.
 */
export function standRows(
  table: Table,
  diameter_m: number,
  air: StandAir,
  changes: ColumnMapping = {},
  poles?: number,
): StandRows {
  const notes: string[] = [...table.notes];
  const mapping: ColumnMapping = { ...proposeMapping(table), ...changes };
  const used: Partial<Record<ColumnKey, ColumnChoice>> = {};
  const columns: Columns = {};
  let commandUnit: StandRows['commandUnit'] = null;
  for (const key of WANTED) {
    const choice = mapping[key];
    if (choice === undefined || (key === 'electricalSpeed' && mapping.speed !== undefined)) continue;
    if (key === 'command') {
      const found = commandColumn(table, choice, notes);
      if (found === null) continue;
      [columns.command, commandUnit] = found;
      used.command = { column: choice.column, unit: commandUnit === 'µs' ? 'µs' : (choice.unit ?? 'share') };
      continue;
    }
    const plain = key in PLAIN_UNITS && choice.unit === null ? PLAIN_UNITS[key] : undefined;
    if (plain !== undefined) notes.push(`"${choice.column}" states no unit; it is taken as ${plain}.`);
    const settled = plain === undefined ? choice : { ...choice, unit: plain };
    used[key] = settled;
    columns[key] = columnInSI(table, key, settled);
  }
  const speed = speedColumn(table, columns, poles);
  requireThrust(table, columns);
  refuseGaps(table, columns, used, speed);
  settleSigns(table, columns, speed, notes);
  const rows = Array.from(speed, (value, i) => rowOf(table.file, i, value, columns, diameter_m, air));
  const still = rows.filter((row) => row.speed_radps < STILL_RADPS);
  const turning = rows.filter((row) => row.speed_radps >= STILL_RADPS);
  if (turning.length === 0) {
    throw refuse(table.file, used.speed?.column ?? 'speed', 'no row that turns', 'speeds above 100 rev/min');
  }
  return { file: table.file, turning, still, mapping: used, commandUnit, notes };
}

function speedColumn(table: Table, columns: Columns, poles: number | undefined): Float64Array {
  let speed = columns.speed;
  if (speed === undefined && columns.electricalSpeed !== undefined) {
    if (poles === undefined) {
      throw refuse(
        table.file,
        'electrical speed',
        'no number of poles',
        'the number of magnet poles of the motor',
      );
    }
    speed = columns.electricalSpeed.map((value) => value / (poles / 2));
  }
  if (speed === undefined) {
    throw refuse(
      table.file,
      'speed',
      undefined,
      `a column of rotor speed such as "rpm" or "speed_rad/s" (found ${table.heads.join(', ')})`,
    );
  }
  const absolute = speed.map(Math.abs);
  absolute.forEach((value, i) => {
    if (value > FASTEST_RADPS) throw refuse(table.file, `row ${i + 1}, speed`, value, 'up to 200000 rev/min');
  });
  return absolute;
}

function requireThrust(table: Table, columns: Columns): void {
  if (columns.thrust !== undefined || columns.thrustCoefficient !== undefined) return;
  throw refuse(
    table.file,
    'thrust',
    undefined,
    `a column of thrust such as "Thrust (g)" or "thrust_N" (found ${table.heads.join(', ')})`,
  );
}

/** A cell that is no number in a column that is used is a fault of the file, not something to guess. */
function refuseGaps(table: Table, columns: Columns, used: ColumnMapping, speed: Float64Array): void {
  for (const key of ['speed', 'thrust', 'thrustCoefficient', 'torque', 'powerCoefficient'] as const) {
    const values = key === 'speed' ? speed : columns[key];
    if (values === undefined) continue;
    const at = values.findIndex((value) => Number.isNaN(value));
    const head = used[key]?.column ?? key;
    if (at !== -1) {
      const odd = table.oddCells.find((cell) => cell.row === at + 1 && cell.head === head);
      throw refuse(table.file, `row ${at + 1}, ${head}`, odd?.text, 'a number');
    }
  }
  for (const [key, limit, unit] of [
    ['thrust', 50_000, 'N'],
    ['torque', 10_000, 'N·m'],
  ] as const) {
    const at = columns[key]?.findIndex((value) => Math.abs(value) > limit) ?? -1;
    if (at !== -1) {
      throw refuse(
        table.file,
        `row ${at + 1}, ${used[key]?.column ?? key}`,
        columns[key]?.[at],
        `at most ${limit} ${unit}`,
      );
    }
  }
}

/** Stands differ in the sign of thrust and torque, and drift: the zero is taken from the rows at rest. */
function settleSigns(table: Table, columns: Columns, speed: Float64Array, notes: string[]): void {
  const still = Array.from(speed.keys()).filter((i) => speed[i] < STILL_RADPS);
  const turning = Array.from(speed.keys()).filter((i) => speed[i] >= STILL_RADPS);
  for (const key of ['thrust', 'torque'] as const) {
    const values = columns[key];
    if (values === undefined || turning.length === 0) continue;
    const tare = still.length === 0 ? 0 : median(still.map((i) => values[i]));
    const sign = median(turning.map((i) => values[i] - tare)) < 0 ? -1 : 1;
    const largest = extent(turning.map((i) => Math.abs(values[i] - tare)))[1];
    for (let i = 0; i < values.length; i++) values[i] = sign * (values[i] - tare);
    if (sign < 0) notes.push(`${key} is negative in ${table.file}; its sign was turned.`);
    if (largest > 0 && Math.abs(tare) > 1e-3 * largest) {
      notes.push(
        `${key} reads ${((100 * tare) / largest).toFixed(1)} % of its largest value at rest; that was taken off every row.`,
      );
    }
  }
}

function commandColumn(
  table: Table,
  choice: ColumnChoice,
  notes: string[],
): [Float64Array, 'µs' | 'share'] | null {
  if (choice.unit !== null) {
    const values = columnInSI(table, 'command', choice);
    return [values, choice.unit === 'µs' || choice.unit === 'ms' ? 'µs' : 'share'];
  }
  const raw = columnInSI(table, 'command', { ...choice, unit: '1' });
  const largest = raw.reduce((most, value) => (value > most ? value : most), 0);
  if (largest > 500 && largest < 5000) {
    notes.push(`"${choice.column}" states no unit; its values up to ${largest} are taken as µs.`);
    return [raw, 'µs'];
  }
  if (largest > 1.5 && largest <= 110) {
    notes.push(`"${choice.column}" states no unit; its values up to ${largest} are taken as per cent.`);
    return [raw.map((value) => value / 100), 'share'];
  }
  if (largest > 0 && largest <= 1.5) return [raw, 'share'];
  notes.push(`"${choice.column}" states no unit and its values fit neither µs nor per cent: left out.`);
  return null;
}

function rowOf(
  file: string,
  i: number,
  speed: number,
  columns: Columns,
  diameter_m: number,
  air: StandAir,
): StandRow {
  const at = (key: ColumnKey): number | null => {
    const value = columns[key]?.[i];
    return value === undefined || Number.isNaN(value) ? null : value;
  };
  const n = speed / (2 * Math.PI);
  const perCt = air.density_kgpm3 * n * n * diameter_m ** 4;
  const perTorque = air.density_kgpm3 * n * n * diameter_m ** 5;
  const shaft = at('shaftPower');
  const cq = at('torqueCoefficient');
  const cpGiven = at('powerCoefficient') ?? (cq === null ? null : 2 * Math.PI * cq);
  const ctGiven = at('thrustCoefficient');
  const turning = speed >= STILL_RADPS;
  let torque = at('torque');
  if (torque === null && shaft !== null && turning) torque = shaft / speed;
  if (torque === null && cpGiven !== null) torque = (cpGiven * perTorque) / (2 * Math.PI);
  const thrust = at('thrust') ?? (ctGiven === null ? null : ctGiven * perCt);
  const voltage = at('voltage');
  const current = at('current');
  return {
    row: i + 1,
    file,
    speed_radps: speed,
    thrust_N: thrust,
    torque_Nm: torque,
    ct: thrust === null || !turning ? null : thrust / perCt,
    cp: torque === null || !turning ? null : (2 * Math.PI * torque) / perTorque,
    command: at('command'),
    voltage_V: voltage,
    current_A: current,
    power_W: at('power') ?? (voltage === null || current === null ? null : voltage * current),
  };
}
