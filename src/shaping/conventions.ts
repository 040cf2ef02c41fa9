/**
 * Gain conventions: how a firmware counts. Inside, gains are µs per deg/s, µs per deg and µs per deg/s². A
 * convention says the unit of rate, what the output counts, how the integral and the derivative are written
 * (as gain, gain times tick, or time), and a scale for each. Going there and back is exact to rounding.
 */
import { z } from 'zod';
import { choice, formatTag, parseWith, positive, title } from '../craft/fields.ts';
import { AXES, type AxisName, type Gains } from '../craft/gains.ts';
import { DEG_PER_RAD } from '../math/angles.ts';

export const CONVENTION_FORMAT = 'gustbench.convention/1';

export const conventionSchema = z.strictObject(
  {
    format: formatTag(CONVENTION_FORMAT),
    name: title(),
    rate: choice(['deg/s', 'rad/s']),
    /** What the controller's output counts: µs of command, or a share of a span of so many µs. */
    output: choice(['us', 'share']),
    outputSpan_us: positive(10_000, 'µs').optional(),
    /** K_i (per second), K_i·T (per tick), or T_i = K_p/K_i (seconds). */
    integral: choice(['gain', 'gain-times-tick', 'time']),
    /** K_d, K_d/T (per tick), or T_d = K_d/K_p (seconds). */
    derivative: choice(['gain', 'gain-over-tick', 'time']),
    /** Constants are written as the value times this (a firmware that stores P × 1000). */
    scale: z
      .strictObject({
        p: positive(1e9, ''),
        i: positive(1e9, ''),
        d: positive(1e9, ''),
        ff: positive(1e9, ''),
      })
      .default({ p: 1, i: 1, d: 1, ff: 1 }),
  },
  { error: 'a convention object' },
);
export type Convention = z.output<typeof conventionSchema>;

/** @throws InputError naming path, value and what is allowed. */
export function parseConvention(raw: unknown, file = 'convention'): Convention {
  return parseWith(conventionSchema, raw, file);
}

const base = { format: CONVENTION_FORMAT, scale: { p: 1, i: 1, d: 1, ff: 1 } } as const;

/** Ways of counting that occur; named by what they say, after no program. */
export const CONVENTIONS: readonly Convention[] = [
  {
    ...base,
    name: 'µs, deg/s, per second',
    rate: 'deg/s',
    output: 'us',
    integral: 'gain',
    derivative: 'gain',
  },
  {
    ...base,
    name: 'µs, deg/s, per tick',
    rate: 'deg/s',
    output: 'us',
    integral: 'gain-times-tick',
    derivative: 'gain-over-tick',
  },
  {
    ...base,
    name: 'µs, deg/s, times T_i T_d',
    rate: 'deg/s',
    output: 'us',
    integral: 'time',
    derivative: 'time',
  },
  {
    ...base,
    name: 'share of 1000 µs, rad/s, per second',
    rate: 'rad/s',
    output: 'share',
    outputSpan_us: 1000,
    integral: 'gain',
    derivative: 'gain',
  },
  {
    ...base,
    name: 'share of 1000 µs, rad/s, per tick',
    rate: 'rad/s',
    output: 'share',
    outputSpan_us: 1000,
    integral: 'gain-times-tick',
    derivative: 'gain-over-tick',
  },
];

/** An axis's constants as the firmware writes them. */
export interface AxisConstants {
  readonly p: number;
  readonly i: number;
  readonly d: number;
  readonly ff: number;
}
export type Constants = Readonly<Record<AxisName, AxisConstants>>;

/** Output counts per µs, times rate units per deg/s: the factor from the inside to the firmware. */
function factor(convention: Convention): number {
  const perUs = convention.output === 'us' ? 1 : 1 / (convention.outputSpan_us ?? 1000);
  return convention.rate === 'deg/s' ? perUs : perUs * DEG_PER_RAD;
}

/**
 * @throws RangeError when a time is asked for with P = 0, which no time can express.
 */
export function toConvention(gains: Gains, convention: Convention): Constants {
  const k = factor(convention);
  const T = 1 / gains.loop_Hz;
  const convert = (axis: AxisName): AxisConstants => {
    const own = gains.axes[axis];
    const p = own.p_us_per_dps * k;
    const i = own.i_us_per_deg * k;
    const d = own.d_us_per_dps2 * k;
    return {
      p: p * convention.scale.p,
      i: integralTo(convention, p, i, T, axis) * convention.scale.i,
      d: derivativeTo(convention, p, d, T, axis) * convention.scale.d,
      ff: own.feedforward_us_per_dps * k * convention.scale.ff,
    };
  };
  return { roll: convert('roll'), pitch: convert('pitch'), yaw: convert('yaw') };
}

function integralTo(convention: Convention, p: number, i: number, T: number, axis: AxisName): number {
  if (convention.integral === 'gain') return i;
  if (convention.integral === 'gain-times-tick') return i * T;
  // T_i = 0 is written for "no integral": the customary sign for an infinite time.
  if (i === 0) return 0;
  if (p === 0) throw new RangeError(`${axis}: an integral time needs P above 0`);
  return p / i;
}

function derivativeTo(convention: Convention, p: number, d: number, T: number, axis: AxisName): number {
  if (convention.derivative === 'gain') return d;
  if (convention.derivative === 'gain-over-tick') return d / T;
  if (d === 0) return 0;
  if (p === 0) throw new RangeError(`${axis}: a derivative time needs P above 0`);
  return d / p;
}

/** The gains with axis constants read in a convention at the gains' own loop rate. */
export function fromConvention(constants: Constants, convention: Convention, gains: Gains): Gains {
  const k = factor(convention);
  const T = 1 / gains.loop_Hz;
  const convert = (axis: AxisName) => {
    const own = constants[axis];
    const p = own.p / convention.scale.p;
    const iRaw = own.i / convention.scale.i;
    const dRaw = own.d / convention.scale.d;
    const i =
      convention.integral === 'gain'
        ? iRaw
        : convention.integral === 'gain-times-tick'
          ? iRaw / T
          : iRaw === 0
            ? 0
            : p / iRaw;
    const d =
      convention.derivative === 'gain'
        ? dRaw
        : convention.derivative === 'gain-over-tick'
          ? dRaw * T
          : dRaw * p;
    return {
      ...gains.axes[axis],
      p_us_per_dps: p / k,
      i_us_per_deg: i / k,
      d_us_per_dps2: d / k,
      feedforward_us_per_dps: own.ff / convention.scale.ff / k,
    };
  };
  return { ...gains, axes: { roll: convert('roll'), pitch: convert('pitch'), yaw: convert('yaw') } };
}

/** Which constants must change, and by what factor, when the loop rate goes from one to another. */
export function whatChangesWithRate(
  convention: Convention,
  from_Hz: number,
  to_Hz: number,
): readonly string[] {
  const lines: string[] = [];
  const ratio = from_Hz / to_Hz;
  if (convention.integral === 'gain-times-tick') lines.push(`I constants × ${ratio.toPrecision(6)} (K_i·T)`);
  if (convention.derivative === 'gain-over-tick')
    lines.push(`D constants × ${(1 / ratio).toPrecision(6)} (K_d/T)`);
  if (lines.length === 0) lines.push('no constant: none of them holds the tick');
  lines.push('filter coefficients, where the firmware stores coefficients and not cutoffs in Hz');
  return lines;
}

const CAUTION = [
  'Found in simulation: no clearance to fly. Propellers off for the first power-up, then a restrained hover,',
  'eye protection, clear area, kill switch tried. Local aviation rules and licensed practice come first.',
];

export const EXPORTS = ['c', 'cpp', 'json', 'text'] as const;
export type ExportKind = (typeof EXPORTS)[number];

/** Units of the constants in words, for comments. */
function unitsOf(convention: Convention): Record<keyof AxisConstants, string> {
  const out = convention.output === 'us' ? 'us' : `1/${convention.outputSpan_us ?? 1000} us`;
  const rate = convention.rate === 'deg/s' ? 'deg/s' : 'rad/s';
  const angle = convention.rate === 'deg/s' ? 'deg' : 'rad';
  const scaled = (unit: string, scale: number) => (scale === 1 ? unit : `${unit}, times ${scale}`);
  const { scale } = convention;
  return {
    p: scaled(`${out} per ${rate}`, scale.p),
    i: scaled(
      convention.integral === 'gain'
        ? `${out} per ${angle}`
        : convention.integral === 'gain-times-tick'
          ? `${out} per ${rate} and tick (Ki*T)`
          : 's (Ti, 0 = none)',
      scale.i,
    ),
    d: scaled(
      convention.derivative === 'gain'
        ? `${out} per ${rate}/s`
        : convention.derivative === 'gain-over-tick'
          ? `${out} per ${rate} change a tick (Kd/T)`
          : 's (Td)',
      scale.d,
    ),
    ff: scaled(`${out} per ${rate}`, scale.ff),
  };
}

/** Constants as source text or data, units in comments. */
export function exportConstants(
  gains: Gains,
  convention: Convention,
  kind: ExportKind,
  craft: string,
): string {
  const constants = toConvention(gains, convention);
  const units = unitsOf(convention);
  if (kind === 'json') {
    return `${JSON.stringify({ craft, convention: convention.name, loop_Hz: gains.loop_Hz, units, constants, caution: CAUTION.join(' ') }, null, 2)}\n`;
  }
  const rows = AXES.flatMap((axis) =>
    (['p', 'i', 'd', 'ff'] as const).map((key) => ({
      axis,
      key,
      value: literal(constants[axis][key]),
      unit: units[key],
    })),
  );
  const facts = [
    `${craft}, ${gains.name ?? 'unnamed gains'}; convention: ${convention.name}`,
    `loop ${gains.loop_Hz} Hz; D low-pass ${gains.derivativeLowPass_Hz} Hz (0 = none) on ${gains.derivativeOn}; gyro low-pass ${gains.gyroLowPass_Hz} Hz`,
    `limits: integral ${gains.integralLimit_us} us, output ${gains.outputLimit_us} us`,
    ...CAUTION,
  ];
  if (kind === 'text') {
    return [
      ...facts,
      '',
      ...rows.map((row) => `${row.axis.padEnd(6)}${row.key.padEnd(4)}${row.value.padStart(16)}  ${row.unit}`),
      '',
    ].join('\n');
  }
  const name = (row: { axis: string; key: string }) =>
    `RATE_${row.axis.toUpperCase()}_${row.key.toUpperCase()}`;
  if (kind === 'c') {
    return [
      '/*',
      ...facts.map((fact) => ` * ${fact}`),
      ' */',
      '#ifndef RATE_GAINS_H',
      '#define RATE_GAINS_H',
      `#define RATE_LOOP_HZ ${literal(gains.loop_Hz)}f`,
      ...rows.map((row) => `#define ${name(row)} ${row.value}f /* ${row.unit} */`),
      '#endif',
      '',
    ].join('\n');
  }
  return [
    ...facts.map((fact) => `// ${fact}`),
    '#pragma once',
    'namespace rate_gains {',
    `constexpr float loop_hz = ${literal(gains.loop_Hz)}f;`,
    ...rows.map((row) => `constexpr float ${row.axis}_${row.key} = ${row.value}f; // ${row.unit}`),
    '} // namespace rate_gains',
    '',
  ].join('\n');
}

/** A number as C reads it: always with a point or an exponent. */
function literal(value: number): string {
  const text = String(Number(value.toPrecision(9)));
  return /[.e]/.test(text) ? text : `${text}.0`;
}
