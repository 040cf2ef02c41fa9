/**
 * Units as people write them in column heads, with their factors to SI. One spelling may belong to several
 * dimensions ("g" is a force on a thrust stand, a mass on a scale, an acceleration in a log); the quantity
 * that a head names decides.
 */

/** What a unit measures. `command` is an ESC's pulse width (kept in µs) or a share of full command. */
export type Dimension =
  | 'time'
  | 'force'
  | 'torque'
  | 'rotation'
  | 'voltage'
  | 'current'
  | 'power'
  | 'pulse'
  | 'share'
  | 'acceleration'
  | 'angle'
  | 'temperature'
  | 'pressure'
  | 'length'
  | 'mass'
  | 'velocity';

export interface Unit {
  readonly dimension: Dimension;
  /** Spelling for display. */
  readonly unit: string;
  /** value in `siUnit` = toSI · value + offset. */
  readonly toSI: number;
  readonly offset: number;
}

/** Unit that values of a dimension are turned into. Pulses stay in µs, the unit of the build's ESC fields. */
export const SI_UNIT: Readonly<Record<Dimension, string>> = {
  time: 's',
  force: 'N',
  torque: 'N·m',
  rotation: 'rad/s',
  voltage: 'V',
  current: 'A',
  power: 'W',
  pulse: 'µs',
  share: '1',
  acceleration: 'm/s²',
  angle: 'rad',
  temperature: 'K',
  pressure: 'Pa',
  length: 'm',
  mass: 'kg',
  velocity: 'm/s',
};

/** CGPM 1901. */
const G = 9.80665;
/** International avoirdupois pound (1959) and inch. */
const LB_KG = 0.45359237;
const OZ_KG = LB_KG / 16;
const INCH_M = 0.0254;
const FOOT_M = 0.3048;
const TURN = 2 * Math.PI;

type Row = readonly [dimension: Dimension, unit: string, toSI: number, spellings: string, offset?: number];

/** Spellings after `plainUnit`, where case helps to tell (mN, MN) as written, otherwise in lower case. */
const ROWS: readonly Row[] = [
  ['time', 's', 1, 's sec secs second seconds'],
  ['time', 'ms', 1e-3, 'ms msec millis millisecond milliseconds'],
  ['time', 'µs', 1e-6, 'us usec micros microsecond microseconds'],
  ['time', 'ns', 1e-9, 'ns nsec'],
  ['time', 'min', 60, 'min minutes'],
  ['force', 'N', 1, 'N n newton newtons'],
  ['force', 'mN', 1e-3, 'mN mn'],
  ['force', 'kN', 1e3, 'kN kn'],
  ['force', 'g', G / 1000, 'g gf gr gram grams p pond gramforce gforce'],
  ['force', 'kgf', G, 'kg kgf kp kilogram kilograms kilogramforce'],
  ['force', 'lbf', LB_KG * G, 'lb lbs lbf pound pounds'],
  ['force', 'ozf', OZ_KG * G, 'oz ozf ounce ounces'],
  ['torque', 'N·m', 1, 'Nm nm newtonmeter newtonmetre newtonmeters newtonmetres'],
  ['torque', 'mN·m', 1e-3, 'mNm mnm'],
  ['torque', 'N·mm', 1e-3, 'Nmm nmm'],
  ['torque', 'N·cm', 1e-2, 'Ncm ncm'],
  ['torque', 'gf·cm', (G / 1000) * 0.01, 'gcm gfcm'],
  ['torque', 'gf·m', G / 1000, 'gm gfm'],
  ['torque', 'gf·mm', G * 1e-6, 'gmm gfmm'],
  ['torque', 'kgf·cm', G * 0.01, 'kgcm kgfcm'],
  ['torque', 'kgf·m', G, 'kgm kgfm'],
  ['torque', 'ozf·in', OZ_KG * G * INCH_M, 'ozin inoz ozfin'],
  ['torque', 'lbf·in', LB_KG * G * INCH_M, 'lbin inlb lbfin inlbf'],
  ['torque', 'lbf·ft', LB_KG * G * FOOT_M, 'lbft ftlb lbfft ftlbf'],
  ['rotation', 'rad/s', 1, 'rad/s rad/sec radps rads rads1 radians/s radpers'],
  ['rotation', 'mrad/s', 1e-3, 'mrad/s mradps'],
  ['rotation', 'deg/s', Math.PI / 180, 'deg/s deg/sec dps degps degs degs1 degrees/s degpers'],
  ['rotation', 'mdeg/s', Math.PI / 180_000, 'mdps mdeg/s'],
  [
    'rotation',
    'rev/min',
    TURN / 60,
    'rpm rev/min r/min revs/min 1/min min1 u/min turns/min revpermin tr/min',
  ],
  ['rotation', 'krev/min', (TURN / 60) * 1000, 'krpm'],
  ['rotation', 'rev/s', TURN, 'rps rev/s r/s revs/s 1/s hz'],
  ['voltage', 'V', 1, 'V v volt volts vdc'],
  ['voltage', 'mV', 1e-3, 'mV mv millivolt millivolts'],
  ['current', 'A', 1, 'A a amp amps ampere amperes'],
  ['current', 'mA', 1e-3, 'mA ma milliamp milliamps'],
  ['power', 'W', 1, 'W w watt watts'],
  ['power', 'mW', 1e-3, 'mW mw'],
  ['power', 'kW', 1e3, 'kW kw'],
  ['pulse', 'µs', 1, 'us usec micros microsecond microseconds pwm'],
  ['pulse', 'ms', 1e3, 'ms'],
  ['share', '%', 0.01, '% percent pct prozent'],
  ['share', '1', 1, '1 share duty fraction normalized normalised 01'],
  ['share', '‰', 1e-3, '‰ permil'],
  ['acceleration', 'm/s²', 1, 'm/s2 m/s/s ms2 mps2 m/sec2 m/s^2'],
  ['acceleration', 'g', G, 'g gs gee gn'],
  ['acceleration', 'mg', G / 1000, 'mg'],
  ['angle', 'rad', 1, 'rad radian radians'],
  ['angle', 'deg', Math.PI / 180, 'deg degree degrees'],
  ['temperature', 'K', 1, 'K k kelvin'],
  ['temperature', '°C', 1, 'degc c celsius', 273.15],
  ['temperature', '°F', 5 / 9, 'degf f fahrenheit', 273.15 - (32 * 5) / 9],
  ['pressure', 'Pa', 1, 'Pa pa pascal'],
  ['pressure', 'hPa', 100, 'hpa mbar mb'],
  ['pressure', 'kPa', 1000, 'kpa'],
  ['length', 'm', 1, 'm metre metres meter meters'],
  ['length', 'cm', 0.01, 'cm'],
  ['length', 'mm', 0.001, 'mm'],
  ['length', 'in', INCH_M, 'in inch inches'],
  ['mass', 'kg', 1, 'kg kilogram kilograms'],
  ['mass', 'g', 0.001, 'g gr gram grams'],
  ['mass', 'oz', OZ_KG, 'oz ounce ounces'],
  ['mass', 'lb', LB_KG, 'lb lbs pound pounds'],
  ['velocity', 'm/s', 1, 'm/s mps m/sec'],
  ['velocity', 'km/h', 1 / 3.6, 'km/h kmh kph'],
];

function tabulate(): ReadonlyMap<string, readonly Unit[]> {
  const table = new Map<string, Unit[]>();
  for (const [dimension, unit, toSI, spellings, offset = 0] of ROWS) {
    for (const spelling of spellings.split(' ')) {
      const known = table.get(spelling) ?? [];
      known.push({ dimension, unit, toSI, offset });
      table.set(spelling, known);
    }
  }
  return table;
}

const UNITS = tabulate();

/** Spelling without multiplication signs, powers and look-alike letters: "N·m" → "Nm", "µs" → "us". */
function plainUnit(text: string): string {
  return text
    .normalize('NFKC')
    .replace(/\u03BC/g, 'u')
    .replace(/°|º/g, 'deg')
    .replace(/[\s·⋅•×*^_]/g, '')
    .replace(/−/g, '-')
    .replace(/[.-](?=[a-zA-Z0-9])/g, '');
}

/** Every meaning of a unit as written; none when it is no unit known here. */
export function unitMeanings(text: string): readonly Unit[] {
  const plain = plainUnit(text);
  if (plain === '') return [];
  return UNITS.get(plain) ?? UNITS.get(plain.toLowerCase()) ?? [];
}

/** The meaning of a unit for one of these dimensions, the earlier first; null when it fits none. */
export function unitFor(text: string, dimensions: readonly Dimension[]): Unit | null {
  const meanings = unitMeanings(text);
  for (const dimension of dimensions) {
    const found = meanings.find((unit) => unit.dimension === dimension);
    if (found !== undefined) return found;
  }
  return null;
}

/** Spellings that a quantity of these dimensions may have, for messages. */
export function unitsOf(dimensions: readonly Dimension[]): string {
  return ROWS.filter(([dimension]) => dimensions.includes(dimension))
    .map(([, unit]) => unit)
    .join(', ');
}
