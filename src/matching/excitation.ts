/**
 * Manoeuvres for a log worth having, as rate setpoints to be added to the pilot's: doublets and a sweep. Given
 * as a function, as a table, and as C for the craft's own firmware. Limits keep the tilt they cause small.
 */
import { z } from 'zod';
import { AXES, type AxisName } from '../craft/gains.ts';
import { choice, parseWith, quantity } from '../craft/fields.ts';
import { refuse } from '../craft/problem.ts';

/** Largest tilt one manoeuvre may cause by itself, deg; common practice, no source. */
const LARGEST_TILT_DEG = 30;
const LARGEST_HEADING_DEG = 90;

const common = {
  axis: choice(AXES),
  /** Rate setpoint added at most, deg/s. */
  amplitude_dps: quantity(5, 150, 'deg/s'),
};

const doublet = z.strictObject({
  kind: z.literal('doublet'),
  ...common,
  /** Lengths of one half, s, used in turn: short ones show the delay, long ones the gain. */
  halves_s: z
    .array(quantity(0.08, 1, 's'))
    .min(1)
    .max(12),
  /** Quiet before each, s. */
  rest_s: quantity(0.5, 10, 's'),
  repeats: z.number().int().min(1).max(60),
});

const sweep = z.strictObject({
  kind: z.literal('sweep'),
  ...common,
  from_Hz: quantity(0.2, 5, 'Hz'),
  to_Hz: quantity(1, 30, 'Hz'),
  duration_s: quantity(5, 120, 's'),
  /** Rise and fall of the amplitude at the ends, s. */
  taper_s: quantity(0.5, 5, 's').default(1),
});

const excitationSchema = z.discriminatedUnion('kind', [doublet, sweep], {
  error: 'an object with kind "doublet" or "sweep"',
});

export type Excitation = z.output<typeof excitationSchema>;

/**
 * Validates a manoeuvre.
 * @throws InputError naming the field, also when it would tilt the craft too far.
 */
export function parseExcitation(raw: unknown, file = 'excitation'): Excitation {
  const one = parseWith(excitationSchema, raw, file);
  if (one.kind === 'sweep' && one.to_Hz <= one.from_Hz) {
    throw refuse(file, 'to_Hz', one.to_Hz, `above from_Hz, ${one.from_Hz} Hz`);
  }
  if (one.kind === 'sweep' && 2 * one.taper_s >= one.duration_s) {
    throw refuse(file, 'taper_s', one.taper_s, `below half of duration_s, ${one.duration_s} s`);
  }
  const most = one.axis === 'yaw' ? LARGEST_HEADING_DEG : LARGEST_TILT_DEG;
  const turn_deg = largestTurn_deg(one);
  if (turn_deg > most) {
    const amplitude = Math.floor((one.amplitude_dps * most) / turn_deg);
    throw refuse(
      file,
      'amplitude_dps',
      one.amplitude_dps,
      `at most ${amplitude} deg/s here: it would turn the craft by ${turn_deg.toFixed(0)} degrees, ${most} are the most`,
    );
  }
  return one;
}

/** Largest angle the setpoint itself asks for, deg. */
export function largestTurn_deg(one: Excitation): number {
  if (one.kind === 'doublet') return one.amplitude_dps * Math.max(...one.halves_s);
  return (2 * one.amplitude_dps) / (2 * Math.PI * one.from_Hz);
}

/** Length of the whole manoeuvre, s. */
export function excitationDuration_s(one: Excitation): number {
  if (one.kind === 'sweep') return one.duration_s;
  let total = 0;
  for (let i = 0; i < one.repeats; i++) total += one.rest_s + 2 * one.halves_s[i % one.halves_s.length];
  return total;
}

/** Rate setpoint to add at `t_s` from its start, deg/s; 0 before and after. */
export function excitationAt_dps(one: Excitation, t_s: number): number {
  if (t_s < 0 || t_s >= excitationDuration_s(one)) return 0;
  return one.kind === 'doublet' ? doubletAt(one, t_s) : sweepAt(one, t_s);
}

function doubletAt(one: Extract<Excitation, { kind: 'doublet' }>, t_s: number): number {
  let left = t_s;
  for (let i = 0; i < one.repeats; i++) {
    const half = one.halves_s[i % one.halves_s.length];
    if (left < one.rest_s) return 0;
    left -= one.rest_s;
    if (left < half) return one.amplitude_dps;
    if (left < 2 * half) return -one.amplitude_dps;
    left -= 2 * half;
  }
  return 0;
}

/** Frequency rises by the same factor in the same time: as many cycles for each octave's share. */
function sweepAt(one: Extract<Excitation, { kind: 'sweep' }>, t_s: number): number {
  const ratio = one.to_Hz / one.from_Hz;
  const scale_s = one.duration_s / Math.log(ratio);
  const phase = 2 * Math.PI * one.from_Hz * scale_s * (Math.exp(t_s / scale_s) - 1);
  const edge = Math.min(1, t_s / one.taper_s, (one.duration_s - t_s) / one.taper_s);
  return one.amplitude_dps * 0.5 * (1 - Math.cos(Math.PI * edge)) * Math.sin(phase);
}

/** `t_s,setpoint_dps` at `rate_Hz`, for firmware that plays a table. */
export function excitationTable(one: Excitation, rate_Hz: number): string {
  const rows = Math.floor(excitationDuration_s(one) * rate_Hz) + 1;
  const lines = ['t_s,setpoint_dps'];
  for (let k = 0; k < rows; k++) {
    const t_s = k / rate_Hz;
    lines.push(`${Number(t_s.toFixed(6))},${Number(excitationAt_dps(one, t_s).toFixed(4))}`);
  }
  return `${lines.join('\n')}\n`;
}

const C_CAUTIONS = [
  'Added to the pilot’s rate setpoint of one axis while a switch is held. Before it flies:',
  '- Bench first, propellers OFF: print the values, check sign, size and that letting the switch go ends them.',
  '- First in the air at half the amplitude, then look at the log before going on.',
  '- In a clear area, nobody within 30 m, at 10 m height or more, no wind to speak of, eye protection on.',
  '- The pilot’s stick stays in charge: a push beyond the limit below ends the manoeuvre at once.',
  '- Kill switch tested, battery above half, motors cool. Local aviation rules come before all of this.',
];

/** Stick deflection, deg/s of setpoint, that ends the manoeuvre. */
const STICK_OVERRIDE_DPS = 15;

/** One C99 function without state or libraries beyond math.h. */
export function excitationC(one: Excitation): string {
  const lines = [
    '/* Excitation for system identification. Generated; change the numbers there, not here.',
    ...C_CAUTIONS.map((line) => ` * ${line.replace(/’/g, "'")}`),
    ' */',
    '#include <math.h>',
    '',
    `/* ${one.axis} rate to add, deg/s; t_s: seconds since the switch was closed; stick_dps: the pilot's own. */`,
    `float ${one.axis}_excitation_dps(float t_s, float stick_dps)`,
    '{',
    `    const float amplitude_dps = ${cFloat(one.amplitude_dps)};`,
    `    const float duration_s = ${cFloat(excitationDuration_s(one))};`,
    `    if (fabsf(stick_dps) > ${cFloat(STICK_OVERRIDE_DPS)}) return 0.0f;`,
    '    if (!(t_s >= 0.0f) || t_s >= duration_s) return 0.0f;',
    ...(one.kind === 'doublet' ? doubletC(one) : sweepC(one)),
    '}',
    '',
  ];
  return lines.join('\n');
}

function doubletC(one: Extract<Excitation, { kind: 'doublet' }>): string[] {
  const count = one.halves_s.length;
  return [
    `    static const float halves_s[${count}] = {${one.halves_s.map(cFloat).join(', ')}};`,
    `    for (int i = 0; i < ${one.repeats}; i++) {`,
    `        const float half_s = halves_s[i % ${count}];`,
    `        if (t_s < ${cFloat(one.rest_s)}) return 0.0f;`,
    `        t_s -= ${cFloat(one.rest_s)};`,
    '        if (t_s < half_s) return amplitude_dps;',
    '        if (t_s < 2.0f * half_s) return -amplitude_dps;',
    '        t_s -= 2.0f * half_s;',
    '    }',
    '    return 0.0f;',
  ];
}

function sweepC(one: Extract<Excitation, { kind: 'sweep' }>): string[] {
  const scale_s = one.duration_s / Math.log(one.to_Hz / one.from_Hz);
  // Single precision would lose the phase after many cycles: doubles, taken once a tick.
  return [
    `    const double scale_s = ${scale_s.toPrecision(12)};`,
    `    const double phase = ${(2 * Math.PI * one.from_Hz * scale_s).toPrecision(12)} * (exp((double)t_s / scale_s) - 1.0);`,
    '    float edge = 1.0f;',
    `    if (t_s < ${cFloat(one.taper_s)}) edge = t_s / ${cFloat(one.taper_s)};`,
    `    if (duration_s - t_s < ${cFloat(one.taper_s)}) edge = (duration_s - t_s) / ${cFloat(one.taper_s)};`,
    '    return amplitude_dps * 0.5f * (1.0f - cosf(3.14159265f * edge)) * (float)sin(phase);',
  ];
}

function cFloat(value: number): string {
  const text = String(Number(value.toPrecision(7)));
  return `${/[.e]/.test(text) ? text : `${text}.0`}f`;
}

/** Good starting manoeuvres for an axis that follows setpoints up to `maxRate_dps`. */
export function suggestedExcitations(axis: AxisName, maxRate_dps: number): Excitation[] {
  const amplitude = (most: number) => Math.max(5, Math.min(most, Math.round(maxRate_dps * 0.35)));
  return [
    {
      kind: 'doublet',
      axis,
      amplitude_dps: amplitude(axis === 'yaw' ? 90 : 75),
      halves_s: [0.25, 0.4, 0.15, 0.3, 0.2],
      rest_s: 1,
      repeats: 15,
    },
    {
      kind: 'sweep',
      axis,
      amplitude_dps: amplitude(axis === 'yaw' ? 60 : 40),
      from_Hz: 0.5,
      to_Hz: 12,
      duration_s: 30,
      taper_s: 1,
    },
  ];
}
