/**
 * Swing tests as files: JSON `gustbench.swing/1` with any number of tests, or CSV with one test's timings
 * under "#" lines `# key: value`.
 */
import { z } from 'zod';
import { choice, formatTag, parseJson, parseWith, positive, quantity } from '../craft/fields.ts';
import { refuse } from '../craft/problem.ts';
import { columnInSI, proposeMapping, readTable, type Table } from './columns.ts';

export const SWING_FORMAT = 'gustbench.swing/1';

const timing = z.strictObject(
  {
    /** Full swings, there and back. */
    swings: quantity(1, 10_000, 'swings'),
    time_s: positive(36_000, 's'),
  },
  { error: 'an object {swings, time_s}' },
);
const timings = z
  .array(timing, { error: 'a list of {swings, time_s}' })
  .min(1, { error: 'at least one timing {swings, time_s}' })
  .max(1000, { error: 'at most 1000 timings' });

/** What holds the craft while it swings: by its own inertia, or swung alone on the same wires. */
const support = z.strictObject(
  {
    mass_kg: quantity(0, 100, 'kg'),
    inertia_kgm2: quantity(0, 100, 'kg·m²').optional(),
    timings: timings.optional(),
    /** Pivot to the support's own centre of mass; compound pendulum only. */
    pivotDistance_m: quantity(0, 20, 'm').optional(),
  },
  { error: 'an object {mass_kg, timings | inertia_kgm2}' },
);

const common = {
  axis: choice(['roll', 'pitch', 'yaw']),
  /** Largest angle from rest at the start of the timing, and at its end. */
  amplitude_deg: quantity(0, 90, 'deg').optional(),
  amplitudeEnd_deg: quantity(0, 90, 'deg').optional(),
  support: support.optional(),
};

const bifilar = z.strictObject({
  ...common,
  method: z.literal('bifilar'),
  /** Between the two parallel wires. */
  wireDistance_m: positive(20, 'm'),
  wireLength_m: positive(50, 'm'),
  /** Axis of swing to the craft's centre of mass; 0 when the wires straddle it. */
  offset_m: quantity(0, 5, 'm').default(0),
  timings,
});

const compound = z.strictObject({
  ...common,
  method: z.literal('compound'),
  /** Pivot to the craft's centre of mass. */
  pivotDistance_m: positive(50, 'm').optional(),
  timings: timings.optional(),
  /** Instead: two lengths of the same suspension, told by their difference alone. */
  suspensions: z
    .array(z.strictObject({ length_m: quantity(0, 50, 'm'), timings }), {
      error: 'a list of two {length_m, timings}',
    })
    .length(2, { error: 'exactly two {length_m, timings}' })
    .optional(),
});

const swingTest = z.discriminatedUnion('method', [bifilar, compound], {
  error: 'a test with method "bifilar" or "compound"',
});

const swingSchema = z.strictObject(
  {
    format: formatTag(SWING_FORMAT),
    note: z.string({ error: 'a text' }).max(4000, { error: 'at most 4000 characters' }).optional(),
    /** The craft as it hangs, without the support. */
    mass_kg: positive(150, 'kg'),
    gravity_mps2: quantity(9.7, 9.9, 'm/s²').default(9.80665),
    /** Smallest steps of scale, tape and clock. */
    tools: z
      .strictObject(
        {
          mass_kg: quantity(0, 1, 'kg').default(0.001),
          length_m: quantity(0, 0.1, 'm').default(0.001),
          time_s: quantity(0, 1, 's').default(0.01),
        },
        { error: 'an object {mass_kg, length_m, time_s}' },
      )
      .prefault({}),
    tests: z
      .array(swingTest, { error: 'a list of tests' })
      .min(1, { error: 'at least one test' })
      .max(30, { error: 'at most 30 tests' }),
  },
  { error: 'a swing object with format, mass_kg, tests' },
);

export type SwingFile = z.output<typeof swingSchema>;
export type SwingTest = SwingFile['tests'][number];
export type BifilarTest = z.output<typeof bifilar>;
export type CompoundTest = z.output<typeof compound>;
export type Timing = z.output<typeof timing>;
export type SwingTools = SwingFile['tools'];

/**
 * Validates a swing object.
 * @throws InputError naming path, value and what is allowed.
 */
export function parseSwing(raw: unknown, file = 'swing'): SwingFile {
  const swing = parseWith(swingSchema, raw, file);
  swing.tests.forEach((test, i) => checkTest(test, `tests[${i}]`, file));
  return swing;
}

function checkTest(test: SwingTest, path: string, file: string): void {
  const { amplitude_deg, amplitudeEnd_deg, support: held } = test;
  if (amplitudeEnd_deg !== undefined && !(amplitudeEnd_deg <= (amplitude_deg ?? -1))) {
    throw refuse(
      file,
      `${path}.amplitudeEnd_deg`,
      amplitudeEnd_deg,
      'at most amplitude_deg, which must be given',
    );
  }
  if (
    held !== undefined &&
    held.timings === undefined &&
    held.inertia_kgm2 === undefined &&
    held.mass_kg > 0
  ) {
    throw refuse(file, `${path}.support`, held, 'timings of the support alone, or its inertia_kgm2');
  }
  if (test.method === 'bifilar') return;
  const known = test.pivotDistance_m !== undefined && test.timings !== undefined;
  if (known === (test.suspensions !== undefined)) {
    throw refuse(
      file,
      path,
      undefined,
      'either pivotDistance_m with timings, or suspensions with two lengths',
    );
  }
  if (test.suspensions !== undefined) {
    const [a, b] = test.suspensions;
    if (Math.abs(a.length_m - b.length_m) < 0.01) {
      throw refuse(
        file,
        `${path}.suspensions[1].length_m`,
        b.length_m,
        `at least 0.01 m from ${a.length_m} m`,
      );
    }
    if (held !== undefined && held.mass_kg > 0) {
      throw refuse(
        file,
        `${path}.support`,
        held,
        'no support with two lengths: its distances would not be known',
      );
    }
  }
  if (held?.timings !== undefined && held.pivotDistance_m === undefined) {
    throw refuse(
      file,
      `${path}.support.pivotDistance_m`,
      undefined,
      'the distance from pivot to the support’s centre',
    );
  }
}

/**
 * Reads a swing file, JSON or CSV by its first character.
 * @throws InputError naming path, value and what is allowed.
 */
export function readSwing(text: string, file: string): SwingFile {
  const start = text.replace(/^\uFEFF/, '').trimStart();
  return start.startsWith('{')
    ? parseSwing(parseJson(text, file), file)
    : swingFromCsv(readTable(text, file));
}

const TOP_KEYS = ['mass_kg', 'gravity_mps2', 'note'];
const TOOL_KEYS: Readonly<Record<string, string>> = {
  massStep_kg: 'mass_kg',
  lengthStep_m: 'length_m',
  timeStep_s: 'time_s',
};
const SUPPORT_KEYS: Readonly<Record<string, string>> = {
  supportMass_kg: 'mass_kg',
  supportInertia_kgm2: 'inertia_kgm2',
  supportPivotDistance_m: 'pivotDistance_m',
};
const TEST_KEYS = [
  'axis',
  'method',
  'wireDistance_m',
  'wireLength_m',
  'offset_m',
  'pivotDistance_m',
  'amplitude_deg',
  'amplitudeEnd_deg',
];
export const SWING_CSV_KEYS: readonly string[] = [
  ...TEST_KEYS,
  ...TOP_KEYS,
  ...Object.keys(TOOL_KEYS),
  ...Object.keys(SUPPORT_KEYS),
];

/**
 * CSV: comment lines `# key: value` (SWING_CSV_KEYS), columns swings and time, or period alone; a column
 * `suspension` (m) for two lengths, a column `body` with "craft" or "support" for the support's own timings.
 */
function swingFromCsv(table: Table): SwingFile {
  const { file } = table;
  const raw: Record<string, unknown> = { format: SWING_FORMAT };
  const test: Record<string, unknown> = {};
  const tools: Record<string, unknown> = {};
  const held: Record<string, unknown> = {};
  for (const [key, value] of headerOf(table)) {
    if (TEST_KEYS.includes(key)) test[key] = value;
    else if (TOP_KEYS.includes(key)) raw[key] = value;
    else if (key in TOOL_KEYS) tools[TOOL_KEYS[key]] = value;
    else if (key in SUPPORT_KEYS) held[SUPPORT_KEYS[key]] = value;
  }
  if (!('method' in test)) {
    throw refuse(
      file,
      '# method',
      undefined,
      'a line "# method: bifilar" or "# method: compound" above the head',
    );
  }
  const rows = timingRows(table);
  const ofSupport = rows.filter((row) => row.support).map((row) => row.timing);
  const ofCraft = rows.filter((row) => !row.support);
  if (ofSupport.length > 0) held.timings = ofSupport;
  const lengths = [...new Set(ofCraft.map((row) => row.length_m).filter((value) => value !== null))];
  if (lengths.length > 0) {
    test.suspensions = lengths.map((length_m) => ({
      length_m,
      timings: ofCraft.filter((row) => row.length_m === length_m).map((row) => row.timing),
    }));
  } else {
    test.timings = ofCraft.map((row) => row.timing);
  }
  if (Object.keys(held).length > 0) test.support = held;
  return parseSwing({ ...raw, tools, tests: [test] }, file);
}

function headerOf(table: Table): [string, unknown][] {
  return table.comments.flatMap((line): [string, unknown][] => {
    const match = /^\s*([A-Za-z_0-9]+)\s*[:=]\s*(.+?)\s*$/.exec(line);
    if (match === null || !SWING_CSV_KEYS.includes(match[1])) return [];
    const number = Number(match[2].replace(/^(-?\d+),(\d+)$/, '$1.$2'));
    return [[match[1], Number.isNaN(number) || match[1] === 'note' ? match[2] : number]];
  });
}

interface TimingRow {
  readonly timing: Timing;
  readonly length_m: number | null;
  readonly support: boolean;
}

function timingRows(table: Table): TimingRow[] {
  const place = (pattern: RegExp) => table.heads.findIndex((head) => pattern.test(head.toLowerCase()));
  const periodAt = place(/^period/);
  const lengthAt = place(/^(suspension|length)/);
  const bodyAt = place(/^(body|what)$/);
  const mapping = proposeMapping(table);
  const swings = mapping.count === undefined ? null : columnInSI(table, 'count', mapping.count);
  let times: Float64Array;
  if (periodAt !== -1) {
    const unit = /ms/.test(table.heads[periodAt]) ? 'ms' : 's';
    times = columnInSI(table, 'time', { column: table.heads[periodAt], unit });
  } else if (mapping.time !== undefined) {
    times = columnInSI(table, 'time', { ...mapping.time, unit: mapping.time.unit ?? 's' });
  } else {
    throw refuse(
      table.file,
      'head line',
      table.heads.join(', '),
      'columns "swings" and "time_s", or "period_s"',
    );
  }
  if (swings === null && periodAt === -1) {
    throw refuse(
      table.file,
      'head line',
      table.heads.join(', '),
      'a column "swings" beside the time, or "period_s"',
    );
  }
  return Array.from(times, (time_s, i) => {
    const count = swings === null ? 1 : swings[i];
    if (Number.isNaN(time_s) || Number.isNaN(count)) {
      throw refuse(table.file, `row ${i + 1}`, undefined, 'a number of swings and a time');
    }
    const length = lengthAt === -1 ? NaN : table.columns[lengthAt][i];
    return {
      timing: { swings: count, time_s: periodAt === -1 ? time_s : time_s * count },
      length_m: Number.isNaN(length) ? null : length,
      support: bodyAt !== -1 && /support|cradle/i.test(table.texts[bodyAt]?.[i] ?? ''),
    };
  });
}
