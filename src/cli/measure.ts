/** `measure`: bench measurements to fitted quantities, and into a build where one is given. */
import type { Command } from 'commander';
import { z } from 'zod';
import { LARGEST_JSON_BYTES, parseWith, quantity } from '../craft/fields.ts';
import { refuse } from '../craft/problem.ts';
import { buildFromMeasurements, type Measurement } from '../measuring/buildFromMeasurements.ts';
import { readTable, type ColumnKey, type ColumnMapping, type Table } from '../measuring/columns.ts';
import type { Quantified } from '../measuring/estimate.ts';
import { analyseSpinup, joinSpinup, type SpinupResult } from '../measuring/spinup.ts';
import { analyseStand, type StandResult } from '../measuring/stand.ts';
import { analyseStill, joinStill, type StillResult } from '../measuring/still.ts';
import { analyseSwing, joinSwings, type SwingResult } from '../measuring/swing.ts';
import { readSwing, SWING_CSV_KEYS, SWING_FORMAT } from '../measuring/swingFile.ts';
import { DONE, numberOption, printJson, readBuild, readJson, readText, runVerb, writeText } from './io.ts';

/** A record of ten minutes at 8 kHz fits. */
const LARGEST_RECORD_BYTES = 450_000_000;

interface CommonOptions {
  readonly build?: string;
  readonly out?: string;
  readonly json?: boolean;
}

interface TableOptions extends CommonOptions {
  readonly columns?: string;
}

interface StandCommandOptions extends TableOptions {
  readonly diameter_m: string;
  readonly density_kgpm3?: string;
  readonly elevation_m?: string;
  readonly temperature_C?: string;
  readonly pressure_Pa?: string;
  readonly poles?: string;
  readonly escMin_us?: string;
  readonly escMax_us?: string;
}

interface SpinupCommandOptions extends TableOptions {
  readonly poles?: string;
}

interface StillCommandOptions extends TableOptions {
  readonly speed_rpm?: string;
  readonly blades?: string;
  readonly rotors?: string;
}

const COLUMNS_HELP = 'JSON: {"thrust":{"column":"Thrust","unit":"g"}, …} where the heads do not say enough';

const SWING_HELP = `
FILE is JSON:
  {"format":"${SWING_FORMAT}","mass_kg":1.35,
   "tools":{"mass_kg":0.001,"length_m":0.001,"time_s":0.01},        smallest steps; optional
   "tests":[
    {"axis":"roll","method":"bifilar","wireDistance_m":0.3,"wireLength_m":1.2,"amplitude_deg":10,
     "timings":[{"swings":20,"time_s":21.4}, …],
     "support":{"mass_kg":0.05,"timings":[…]}},                      cradle, swung alone; optional
    {"axis":"pitch","method":"compound","pivotDistance_m":0.25,"timings":[…]},
    {"axis":"yaw","method":"compound","suspensions":[{"length_m":0.3,"timings":[…]},{"length_m":0.6,"timings":[…]}]}]}
or CSV with one test: lines "# key: value" (${SWING_CSV_KEYS.join(', ')}),
then columns swings, time_s (or period_s); suspension_m for two lengths; body (craft, support) for the cradle's own.
I = m g D² T²/(16 π² L) on two wires, I = m g d T²/(4 π²) − m d² about a pivot; the support is taken out.
Propellers off. Check string and knots before the craft hangs on them.`;

const STAND_HELP = `
Units are read from the column heads: "Thrust (g)", "thrust_N", "Torque [N·mm]", "rpm", "speed_rad/s", "esc_us", ….
Columns rpm, ct, cp are taken as they are. Several files are several voltages of the same propeller.
Stand guarded and bolted down, eye protection on, a hand on the cut-off.`;

export function addMeasureCommand(program: Command): void {
  const measure = program
    .command('measure')
    .description('bench measurements to quantities with their uncertainty');
  common(measure.command('swing <files...>').description('swing tests to moments of inertia'))
    .addHelpText('after', SWING_HELP)
    .action((files: string[], options: CommonOptions) => runVerb(() => swing(files, options)));
  common(measure.command('stand <files...>').description('thrust stand to propeller and motor'))
    .requiredOption('--diameter_m <m>', 'propeller diameter')
    .option('--density_kgpm3 <kg/m³>', 'air density')
    .option('--elevation_m <m>', 'elevation, where the density is not known')
    .option('--temperature_C <°C>', 'air temperature of the day')
    .option('--pressure_Pa <Pa>', 'air pressure of the day at the stand')
    .option('--poles <number>', 'magnet poles, for a column of electrical speed')
    .option('--esc-min_us <µs>', 'command of no duty (1000 when absent)')
    .option('--esc-max_us <µs>', 'command of full duty (2000 when absent)')
    .option('--columns <file>', COLUMNS_HELP)
    .addHelpText('after', STAND_HELP)
    .action((files: string[], options: StandCommandOptions) => runVerb(() => stand(files, options)));
  common(measure.command('spinup <files...>').description('motor step recordings to lags up and down'))
    .option('--poles <number>', 'magnet poles, for a column of electrical speed')
    .option('--columns <file>', COLUMNS_HELP)
    .addHelpText(
      'after',
      '\nColumns time, speed and, for the delay, command. Stand guarded, eye protection on.',
    )
    .action((files: string[], options: SpinupCommandOptions) => runVerb(() => spinup(files, options)));
  common(
    measure
      .command('still <files...>')
      .description('gyro at rest and at idle to noise, bias, resolution, vibration'),
  )
    .option('--speed_rpm <rev/min>', 'rotor speed while recording, where no column gives it (0: at rest)')
    .option('--blades <number>', 'blades of one propeller', '2')
    .option('--rotors <number>', 'rotors that turned', '4')
    .option('--columns <file>', COLUMNS_HELP)
    .addHelpText(
      'after',
      '\nColumns time and gyro_x, gyro_y, gyro_z (deg/s or rad/s), accelerometer and speeds if there.\n' +
        'Propellers off at rest; with rotors turning the craft is strapped down and nobody is in their plane.',
    )
    .action((files: string[], options: StillCommandOptions) => runVerb(() => still(files, options)));
}

function common(command: Command): Command {
  return command
    .option('--build <file>', 'build to put the measured values into')
    .option('--out <file>', 'where to write that build')
    .option('--json', 'print one JSON object');
}

function swing(files: readonly string[], options: CommonOptions): number {
  const tests = files.flatMap((file) => analyseSwing(readSwing(readText(file), file), file).tests);
  return report(joinSwings(tests), files, options);
}

function stand(files: readonly string[], options: StandCommandOptions): number {
  const number = (name: string, text: string | undefined, min: number, max: number, unit: string) =>
    text === undefined ? undefined : numberOption(name, text, min, max, unit);
  const celsius = number('temperature_C', options.temperature_C, -50, 60, '°C');
  const least = number('esc-min_us', options.escMin_us, 0, 5000, 'µs') ?? 1000;
  const most = number('esc-max_us', options.escMax_us, 1, 5000, 'µs') ?? 2000;
  if (most <= least) throw refuse('command line', '--esc-max_us', most, `above --esc-min_us, ${least} µs`);
  const result = analyseStand(tablesOf(files), {
    diameter_m: numberOption('diameter_m', options.diameter_m, 0.02, 5, 'm'),
    density_kgpm3: number('density_kgpm3', options.density_kgpm3, 0.3, 2, 'kg/m³'),
    elevation_m: number('elevation_m', options.elevation_m, -450, 6000, 'm'),
    temperature_K: celsius === undefined ? undefined : celsius + 273.15,
    pressure_Pa: number('pressure_Pa', options.pressure_Pa, 40_000, 110_000, 'Pa'),
    poles: polesOf(options.poles),
    esc:
      options.escMin_us === undefined && options.escMax_us === undefined
        ? undefined
        : { min_us: least, max_us: most },
    mapping: mappingOf(options.columns),
  });
  return report(result, files, options);
}

function spinup(files: readonly string[], options: SpinupCommandOptions): number {
  const settings = { mapping: mappingOf(options.columns), poles: polesOf(options.poles) };
  return report(joinSpinup(tablesOf(files).map((table) => analyseSpinup(table, settings))), files, options);
}

function still(files: readonly string[], options: StillCommandOptions): number {
  const settings = {
    mapping: mappingOf(options.columns),
    speed_rpm:
      options.speed_rpm === undefined
        ? undefined
        : numberOption('speed_rpm', options.speed_rpm, 0, 200_000, 'rev/min'),
    blades: numberOption('blades', options.blades ?? '2', 1, 8, '', true),
    rotorsTurning: numberOption('rotors', options.rotors ?? '4', 1, 4, '', true),
  };
  return report(joinStill(tablesOf(files).map((table) => analyseStill(table, settings))), files, options);
}

const tablesOf = (files: readonly string[]): Table[] =>
  files.map((file) => readTable(readText(file, LARGEST_RECORD_BYTES), file));

const polesOf = (text: string | undefined): number | undefined =>
  text === undefined ? undefined : numberOption('poles', text, 2, 100, '', true);

const columnChoice = z.strictObject(
  {
    column: z.string({ error: 'the head of a column, a text' }),
    unit: z.string({ error: 'a unit, a text' }).nullable().default(null),
    sign: quantity(-1, 1, '').optional(),
  },
  { error: 'an object {column, unit}' },
);
const columnsSchema = z.record(z.string(), columnChoice, {
  error: 'an object of {"quantity": {column, unit}}',
});

const KEYS: readonly ColumnKey[] = [
  'time',
  'thrust',
  'torque',
  'speed',
  'electricalSpeed',
  'command',
  'voltage',
  'current',
  'power',
  'shaftPower',
  'thrustCoefficient',
  'powerCoefficient',
  'torqueCoefficient',
  'gyro_roll',
  'gyro_pitch',
  'gyro_yaw',
  'acceleration_roll',
  'acceleration_pitch',
  'acceleration_yaw',
];

function mappingOf(file: string | undefined): ColumnMapping | undefined {
  if (file === undefined) return undefined;
  const raw = parseWith(columnsSchema, readJson(file), file);
  const mapping: ColumnMapping = {};
  for (const [name, one] of Object.entries(raw)) {
    const key = KEYS.find((known) => known === name);
    if (key === undefined)
      throw refuse(file, name, one, `no quantity of this name; one of ${KEYS.join(', ')}`);
    if (one.sign !== undefined && Math.abs(one.sign) !== 1)
      throw refuse(file, `${name}.sign`, one.sign, '1 or -1');
    mapping[key] = { column: one.column, unit: one.unit, ...(one.sign === -1 ? { sign: -1 as const } : {}) };
  }
  return mapping;
}

type Result = SwingResult | StandResult | SpinupResult | StillResult;

/** Prints, and writes the build where one is asked for. */
function report(result: Result, files: readonly string[], options: CommonOptions): number {
  const built = buildOf(result, options);
  if (options.json === true) {
    printJson(
      plain({
        files,
        ...result,
        ...(built === null ? {} : { build: built.build, provenance: built.provenance }),
      }),
    );
    for (const note of result.notes) process.stderr.write(`${note}\n`);
  } else {
    process.stdout.write(`${describe(result).join('\n')}\n`);
  }
  return DONE;
}

function buildOf(result: Measurement, options: CommonOptions) {
  if (options.build === undefined) {
    if (options.out !== undefined)
      throw refuse('command line', '--out', options.out, '--build with the build to start from');
    return null;
  }
  const built = buildFromMeasurements(readBuild(options.build), [result]);
  if (options.out !== undefined) {
    const text = `${JSON.stringify(built.build, null, 2)}\n`;
    if (text.length > LARGEST_JSON_BYTES)
      throw refuse(options.out, '', text.length, `at most ${LARGEST_JSON_BYTES} characters`);
    writeText(options.out, [text]);
  }
  return built;
}

/** Typed arrays as lists; the long spectra are for plots and stay out. */
function plain(value: unknown): unknown {
  if (value instanceof Float64Array) return Array.from(value);
  if (Array.isArray(value)) return value.map(plain);
  if (typeof value !== 'object' || value === null) return value;
  return Object.fromEntries(
    Object.entries(value)
      .filter(([key]) => key !== 'spectrum')
      .map(([key, part]) => [key, plain(part)]),
  );
}

function describe(result: Result): string[] {
  const quantities = Object.entries(result.quantities) as [string, Quantified][];
  const width = Math.max(...quantities.map(([name]) => name.length)) + 2;
  const lines = quantities.map(([name, one]) => {
    const doubt = Number((1.96 * one.sigma).toPrecision(2));
    return `${name.padEnd(width)}${Number(one.value.toPrecision(5))} ± ${doubt} ${one.unit === '1' ? '' : one.unit} (95 %)\n${''.padEnd(width)}${one.meaning}`;
  });
  if (result.measurement === 'stand') lines.push(...describeStand(result));
  return [...lines, ...result.notes.map((note) => `note: ${note}`), 'A measurement is no clearance to fly.'];
}

function describeStand(result: StandResult): string[] {
  const cost = result.constantCost.thrust;
  return [
    '',
    'rev/min    C_T      C_P',
    ...result.table.map(
      (point) =>
        `${point.rpm.toFixed(0).padStart(7)}  ${point.ct.toFixed(4)}  ${point.cp === null ? '' : point.cp.toFixed(4)}`,
    ),
    `C_T ranges over ${cost.range_pct.toFixed(1)} %; one constant would be wrong by up to ${cost.worst_pct.toFixed(1)} %.`,
    ...result.outliers.map((row) => `outlier: ${row.file} row ${row.row}: ${row.outlier ?? ''}`),
  ];
}
