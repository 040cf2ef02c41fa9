/**
 * Reads a column head such as "Thrust (g)", "torque [N·m]", "speed_rad/s", "esc_us" or "gyro_roll_dps" into
 * the quantity, its unit, and where the head says so the axis or corner.
 */
import { CORNERS, type Corner } from '../craft/build.ts';
import type { AxisName } from '../craft/gains.ts';
import { SI_UNIT, unitFor, unitMeanings, type Dimension, type Unit } from './units.ts';

export type Quantity =
  | 'time'
  | 'thrust'
  | 'torque'
  | 'speed'
  | 'electricalSpeed'
  | 'command'
  | 'voltage'
  | 'current'
  | 'power'
  | 'shaftPower'
  | 'setpoint'
  | 'gyro'
  | 'acceleration'
  | 'angle'
  | 'thrustCoefficient'
  | 'powerCoefficient'
  | 'torqueCoefficient'
  | 'temperature'
  | 'pressure'
  | 'airspeed'
  | 'efficiency'
  | 'count';

export interface RecognisedHead {
  readonly quantity: Quantity;
  /** Unit the head states, in display spelling; null when it states none. */
  readonly unit: string | null;
  /** value in `siUnit` = toSI · value + offset; 1 and 0 when the head states no unit. */
  readonly toSI: number;
  readonly offset: number;
  /** Unit after conversion; "µs" or "1" for commands. */
  readonly siUnit: string;
  readonly axis: AxisName | null;
  readonly corner: Corner | null;
  /** Lower is the surer reading; of two columns for one quantity the lower is proposed. */
  readonly rank: number;
}

/** Dimensions a quantity may be written in, the likeliest first; empty: a pure number. */
export const DIMENSIONS: Readonly<Record<Quantity, readonly Dimension[]>> = {
  time: ['time'],
  thrust: ['force'],
  torque: ['torque'],
  speed: ['rotation'],
  electricalSpeed: ['rotation'],
  command: ['pulse', 'share'],
  voltage: ['voltage'],
  current: ['current'],
  power: ['power'],
  shaftPower: ['power'],
  setpoint: ['rotation', 'angle', 'share'],
  gyro: ['rotation'],
  acceleration: ['acceleration'],
  angle: ['angle'],
  thrustCoefficient: [],
  powerCoefficient: [],
  torqueCoefficient: [],
  temperature: ['temperature'],
  pressure: ['pressure'],
  airspeed: ['velocity'],
  efficiency: [],
  count: [],
};

type Rule = readonly [quantity: Quantity, words: RegExp, rank: number];

/** Words of a head, space-separated in lower case, against quantities; the first that fits word and unit. */
const RULES: readonly Rule[] = [
  ['setpoint', /\b(sp|setpoint|set point|desired|target|demand|wanted)\b/, 0],
  ['electricalSpeed', /\b(erpm|e rpm)\b/, 0],
  ['thrustCoefficient', /\b(ct|c t|thrust coefficient|thrust coeff)\b/, 0],
  ['powerCoefficient', /\b(cp|c p|power coefficient|power coeff)\b/, 0],
  ['torqueCoefficient', /\b(cq|c q|torque coefficient|torque coeff)\b/, 0],
  ['efficiency', /\b(efficiency|eff|eta|wirkungsgrad|g\/w|n\/w)\b/, 0],
  ['temperature', /\b(temperature|temp|temperatur)\b/, 0],
  ['pressure', /\b(pressure|baro|druck)\b/, 0],
  ['airspeed', /\b(airspeed|air speed|wind speed)\b/, 0],
  ['shaftPower', /\b(shaft power|mechanical power|mech power|p mech|power mech|power out)\b/, 0],
  ['acceleration', /\b(acc|accel|accelerometer|acceleration|accelerations|beschleunigung)\b/, 0],
  ['gyro', /\b(gyro|gyr|gyroscope)\b/, 0],
  ['gyro', /\b(body rate|angular rate|angular velocity|rate|rates|drehrate)\b/, 1],
  ['time', /\b(time|t|timestamp|timestamps|zeit|elapsed|clock|tick|ticks)\b/, 0],
  ['speed', /\b(optical speed|rotor speed|prop speed|propeller speed|motor speed)\b/, 0],
  ['speed', /\b(speed|rpm|omega|drehzahl|revs|revolutions|rotation)\b/, 1],
  ['torque', /\b(torque|drehmoment|moment|q)\b/, 0],
  ['thrust', /\b(thrust|schub|pull)\b/, 0],
  ['thrust', /\b(lift|force|kraft|load|load cell|f)\b/, 1],
  ['command', /\b(esc signal|esc command|throttle|command|cmd|pwm|pulse|pulse width|duty|gas)\b/, 0],
  ['command', /\b(esc|signal|motor|output|servo|u)\b/, 1],
  ['voltage', /\b(voltage|volt|volts|spannung|vbat|vbatt|v bat|bus voltage)\b/, 0],
  ['voltage', /\b(battery|u|v)\b/, 1],
  ['current', /\b(current|amps|amperage|strom|i)\b/, 0],
  ['current', /\b(battery|a)\b/, 1],
  ['power', /\b(power|electrical power|watts|leistung|p in|p|w)\b/, 1],
  ['speed', /\b(electrical speed|n)\b/, 2],
  ['angle', /\b(angle|attitude|roll|pitch|yaw|winkel)\b/, 2],
  ['count', /\b(count|counts|swings|periods|oscillations|cycles|turns)\b/, 0],
];

/** Quantity meant by a unit alone ("rpm", "V"), or by one beside words not known here. */
const BY_DIMENSION: Readonly<Partial<Record<Dimension, Quantity>>> = {
  time: 'time',
  force: 'thrust',
  torque: 'torque',
  rotation: 'speed',
  voltage: 'voltage',
  current: 'current',
  power: 'power',
  share: 'command',
  temperature: 'temperature',
  pressure: 'pressure',
  acceleration: 'acceleration',
  angle: 'angle',
};

const AXES: Readonly<Record<string, AxisName>> = {
  x: 'roll',
  y: 'pitch',
  z: 'yaw',
  roll: 'roll',
  pitch: 'pitch',
  yaw: 'yaw',
  p: 'roll',
  q: 'pitch',
  r: 'yaw',
};
const AXIS_BY_INDEX: readonly AxisName[] = ['roll', 'pitch', 'yaw'];

interface Split {
  readonly words: string;
  readonly unit: string | null;
}

/** @returns null when neither words nor unit are known. */
export function recogniseHead(head: string): RecognisedHead | null {
  const text = head
    .normalize('NFKC')
    .replace(/\u03BC/g, 'µ')
    .trim();
  if (text === '' || text.length > 200) return null;
  for (const split of splits(text)) {
    const found = meaning(split);
    if (found !== null) return found;
  }
  return null;
}

/** Ways to divide a head into words and unit, the likeliest first. */
function splits(text: string): Split[] {
  const found: Split[] = [];
  const bracketed = /^(.*?)\s*[([{<]\s*([^()[\]{}<>]+?)\s*[)\]}>](.*)$/.exec(text);
  if (bracketed !== null && unitMeanings(bracketed[2]).length > 0 && !/^\d$/.test(bracketed[2])) {
    found.push({ words: `${bracketed[1]} ${bracketed[3]}`, unit: bracketed[2] });
  }
  // "thrust_N", "speed rad/s", "torque_N_m", "T / N", "thrust, g": up to three last pieces are a unit.
  const pieces = text.split(/[\s_,;:]+|\s\/\s/).filter((piece) => piece !== '' && piece !== '/');
  for (let count = Math.min(3, pieces.length - 1); count >= 1; count--) {
    const unit = pieces.slice(pieces.length - count).join('');
    if (unitMeanings(unit).length > 0) {
      found.push({ words: pieces.slice(0, pieces.length - count).join(' '), unit });
    }
  }
  found.push({ words: text, unit: null });
  if (unitMeanings(text).length > 0 && !/^[a-rt-z]$/.test(text)) found.push({ words: '', unit: text });
  return found;
}

/** Lower-case words: camel case, underscores, brackets and glued axis letters taken apart. */
function plainWords(text: string): string {
  return text
    .replace(/([a-z])([A-Z])/g, '$1 $2')
    .toLowerCase()
    .replace(/[^\p{L}\p{N}/]+/gu, ' ')
    .replace(/\b(gyro|gyr|omega|rate|acc|accel)([xyz])\b/g, '$1 $2')
    .replace(/\b[gw]([xyz])\b/g, 'gyro $1')
    .replace(/\ba([xyz])\b/g, 'acc $1')
    .replace(/\b(gyro|acc)[ ]?adc\b/g, '$1')
    .trim();
}

function meaning(split: Split): RecognisedHead | null {
  const words = plainWords(split.words);
  const axis = axisOf(words);
  const corner = CORNERS.find((one) => new RegExp(`\\b${one.toLowerCase()}\\b`).test(words)) ?? null;
  for (const [quantity, pattern, rank] of RULES) {
    const match = pattern.exec(words);
    if (match === null) continue;
    const dimensions = DIMENSIONS[quantity];
    if (split.unit === null) {
      // One letter says too little without a unit, t for time apart.
      if (match[0].length === 1 && match[0] !== 't') continue;
      return recognised(quantity, impliedUnit(words, dimensions), axis, corner, rank);
    }
    const unit = unitFor(split.unit, dimensions);
    if (unit !== null) return recognised(quantity, unit, axis, corner, rank);
    if (dimensions.length === 0) return null;
  }
  return split.unit === null ? axisAlone(words, axis) : byUnit(split.unit, words, axis, corner);
}

/** A word that is a unit at the same time: "rpm", "amps", "volts", "watts". */
function impliedUnit(words: string, dimensions: readonly Dimension[]): Unit | null {
  for (const word of words.split(' ')) {
    if (word.length < 3) continue;
    const unit = unitFor(word === 'erpm' ? 'rpm' : word, dimensions);
    if (unit !== null && word !== 'pwm' && word !== 'duty') return unit;
  }
  return null;
}

/** Bare p, q, r are body rates (ISO 1151-1); roll, pitch, yaw alone are left open. */
function axisAlone(words: string, axis: AxisName | null): RecognisedHead | null {
  return axis !== null && /^[pqr]$/.test(words) ? recognised('gyro', null, axis, null, 2) : null;
}

/** Words that say nothing known: the unit decides, if it has only one meaning or stands alone. */
function byUnit(
  written: string,
  words: string,
  axis: AxisName | null,
  corner: Corner | null,
): RecognisedHead | null {
  const meanings = unitMeanings(written);
  if (words !== '' && meanings.length > 1) return null;
  const quantity = BY_DIMENSION[meanings[0].dimension];
  return quantity === undefined ? null : recognised(quantity, meanings[0], axis, corner, 3);
}

function recognised(
  named: Quantity,
  unit: Unit | null,
  axis: AxisName | null,
  corner: Corner | null,
  rank: number,
): RecognisedHead {
  // Angular speed about a body axis is a gyro's, not a rotor's.
  const turning = named === 'speed' && axis !== null && !(unit?.unit.includes('rev') ?? false);
  const quantity = turning ? 'gyro' : named;
  const dimension = unit?.dimension ?? DIMENSIONS[quantity][0];
  return {
    quantity,
    unit: unit?.unit ?? null,
    toSI: unit?.toSI ?? 1,
    offset: unit?.offset ?? 0,
    siUnit: dimension === undefined ? '1' : SI_UNIT[dimension],
    axis,
    corner,
    rank,
  };
}

function axisOf(words: string): AxisName | null {
  for (const word of words.split(' ')) {
    if (word in AXES) return AXES[word];
  }
  const index = /\b(?:gyro|acc|accel|rate|setpoint)\s?([012])\b/.exec(words);
  return index === null ? null : AXIS_BY_INDEX[Number(index[1])];
}
