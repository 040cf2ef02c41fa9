/**
 * Columns of a log: which column is which signal, in which unit and with which sign. The columns file of the
 * command line and the mapping a user confirms on the page are the same object.
 */
import { z } from 'zod';
import { CORNERS } from '../craft/build.ts';
import { AXES } from '../craft/gains.ts';
import { choice, parseWith } from '../craft/fields.ts';
import { refuse } from '../craft/problem.ts';
import { DEG_PER_RAD, RPM_PER_RAD_PER_S } from '../math/angles.ts';

/** What a signal measures; each kind has its own units. */
export type SignalKind =
  'time' | 'rate' | 'share' | 'command' | 'axisCommand' | 'speed' | 'angle' | 'velocity';

/** Units of each kind with their factor to the one used inside. `range` scales by the ESC's span. */
export const UNITS: Readonly<Record<SignalKind, Readonly<Record<string, number | 'range'>>>> = {
  time: { s: 1, ms: 1e-3, us: 1e-6, ns: 1e-9 },
  rate: { 'deg/s': 1, dps: 1, 'rad/s': DEG_PER_RAD, 'mrad/s': DEG_PER_RAD / 1000 },
  share: { '1': 1, '%': 0.01, us: 'range' },
  command: { us: 1, ms: 1000, '1': 'range', '%': 'range' },
  axisCommand: { us: 1, '1': 'range', '%': 'range' },
  speed: { rpm: 1, 'rev/min': 1, Hz: 60, 'rev/s': 60, 'rad/s': RPM_PER_RAD_PER_S },
  angle: { deg: 1, rad: DEG_PER_RAD },
  velocity: { 'm/s': 1 },
};

/** Unit taken when none is said: the one used inside. */
const USUAL_UNIT: Readonly<Record<SignalKind, string>> = {
  time: 's',
  rate: 'deg/s',
  share: '1',
  command: 'us',
  axisCommand: 'us',
  speed: 'rpm',
  angle: 'deg',
  velocity: 'm/s',
};

/** The unit used inside; not the first key, for JavaScript puts keys like "1" before all others. */
export function unitInside(kind: SignalKind): string {
  const units = Object.entries(UNITS[kind]);
  return (units.find(([, factor]) => factor === 1) ?? units[0])[0];
}

const perAxis = (prefix: string, kind: SignalKind) =>
  AXES.map((axis): [string, SignalKind] => [`${prefix}_${axis}`, kind]);
const perCorner = (prefix: string, kind: SignalKind) =>
  CORNERS.map((corner): [string, SignalKind] => [`${prefix}_${corner}`, kind]);

/** Every signal a log may give, in the order shown to the user. */
export const SIGNALS: ReadonlyMap<string, SignalKind> = new Map<string, SignalKind>([
  ['t', 'time'],
  ...perAxis('gyro', 'rate'),
  ...perAxis('sp', 'rate'),
  ['throttle', 'share'],
  ...perCorner('cmd', 'command'),
  ...perAxis('u', 'axisCommand'),
  ...perCorner('speed', 'speed'),
  ...perAxis('angle', 'angle'),
  ['descent', 'velocity'],
]);

function columnSchema(kind: SignalKind) {
  const units = Object.keys(UNITS[kind]) as [string, ...string[]];
  const column = 'the head of a column (a text) or its place, counted from 1';
  return z.strictObject(
    {
      column: z.union([z.string().min(1).max(200), z.number().int().min(1).max(10_000)], { error: column }),
      unit: choice(units).default(USUAL_UNIT[kind]),
      sign: z.union([z.literal(1), z.literal(-1)], { error: '1 or -1' }).default(1),
    },
    { error: `an object with column, unit (${units.join(', ')}) and, if turned about, sign` },
  );
}

const columnsSchema = z.strictObject(
  Object.fromEntries([...SIGNALS].map(([name, kind]) => [name, columnSchema(kind).optional()])),
  { error: `an object with ${[...SIGNALS.keys()].join(', ')}` },
);

export interface ColumnChoice {
  readonly column: string | number;
  readonly unit: string;
  readonly sign: 1 | -1;
}
export type Columns = Readonly<Partial<Record<string, ColumnChoice>>>;

/**
 * Validates a columns object.
 * @throws InputError naming the field, the value and what is allowed; also when what the fit needs is not named.
 */
export function parseColumns(raw: unknown, file = 'columns'): Columns {
  const columns: Columns = parseWith(columnsSchema, raw, file);
  const gap = missingSignals(columns)[0];
  if (gap !== undefined) throw refuse(file, gap.signal, undefined, gap.allowed);
  return columns;
}

/** What a fit cannot do without and `columns` does not name. */
export function missingSignals(columns: Columns): { signal: string; allowed: string }[] {
  const has = (name: string) => columns[name] !== undefined;
  const missing: { signal: string; allowed: string }[] = [];
  if (!has('t')) missing.push({ signal: 't', allowed: 'the column of the time' });
  const measured = AXES.filter((axis) => has(`gyro_${axis}`));
  if (measured.length === 0) {
    missing.push({
      signal: 'gyro_roll',
      allowed: 'the column of at least one of gyro_roll, gyro_pitch, gyro_yaw',
    });
  }
  const motors = CORNERS.filter((corner) => has(`cmd_${corner}`));
  const uncommanded = measured.find((axis) => !has(`u_${axis}`));
  if (motors.length !== 4 && uncommanded !== undefined) {
    const absent = CORNERS.find((corner) => !has(`cmd_${corner}`)) ?? 'FL';
    missing.push({
      signal: motors.length === 0 ? `u_${uncommanded}` : `cmd_${absent}`,
      allowed: `the column of the axis command u_${uncommanded}, or of all four motor commands cmd_FL, cmd_FR, cmd_RL, cmd_RR`,
    });
  }
  return missing;
}

/** Limits of the ESC, to read commands and throttle that are given as shares. */
export interface CommandRange {
  readonly min_us: number;
  readonly max_us: number;
}

/** value_inside = scale · value_in_file + offset. */
export function conversion(signal: string, choiceOf: ColumnChoice, range: CommandRange) {
  const kind = SIGNALS.get(signal) ?? 'share';
  const factor = UNITS[kind][choiceOf.unit];
  const { sign } = choiceOf;
  if (factor !== 'range') return { scale: sign * factor, offset: 0 };
  const span = range.max_us - range.min_us;
  const perUnit = choiceOf.unit === '%' ? 0.01 : 1;
  if (kind === 'share') return { scale: sign / span, offset: -range.min_us / span };
  return { scale: sign * span * perUnit, offset: kind === 'command' ? range.min_us : 0 };
}

const OWN_UNITS: Readonly<Partial<Record<SignalKind, [suffix: string, unit: string]>>> = {
  time: ['_s', 's'],
  rate: ['_dps', 'deg/s'],
  command: ['_us', 'us'],
  axisCommand: ['_us', 'us'],
  speed: ['_rpm', 'rpm'],
};

/** The bench's own record: its heads say signal and unit. Null when `heads` are not those of a record. */
export function ownColumns(heads: readonly string[]): Columns | null {
  const columns: Record<string, ColumnChoice> = {};
  for (const [signal, kind] of SIGNALS) {
    const [suffix, unit] = OWN_UNITS[kind] ?? ['', USUAL_UNIT[kind]];
    const head = signal === 'descent' ? 'vd_mps' : `${signal}${suffix}`;
    if (heads.includes(head)) columns[signal] = { column: head, unit, sign: 1 };
  }
  return missingSignals(columns).length === 0 ? columns : null;
}
