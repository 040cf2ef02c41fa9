/** Centre of mass by balance: two or more scales, a knife edge, and a tilt for its height. */
import { refuse } from '../craft/problem.ts';
import {
  propagate,
  quantified,
  smallSampleFactor,
  stepSigma,
  type Input,
  type Quantified,
} from './estimate.ts';

/** One axis of the craft resting on scales at known places along it. */
export interface ScaleBalance {
  readonly axis: 'x' | 'y';
  /** Where each scale touches, along the axis, from the body origin, m, and what it reads, kg. */
  readonly scales: readonly { readonly position_m: number; readonly reading_kg: number }[];
  readonly massStep_kg: number;
  readonly lengthStep_m: number;
}

/** Balance points found along an axis, several times, with the craft turned round in between. */
export interface KnifeEdgeBalance {
  readonly axis: 'x' | 'y' | 'z';
  readonly positions_m: readonly number[];
  readonly lengthStep_m: number;
}

/** Height from readings level and tilted nose up by `tilt_deg` about scales fixed to the same two points. */
export interface TiltBalance {
  readonly level: ScaleBalance;
  readonly tiltedReadings_kg: readonly number[];
  readonly tilt_deg: number;
  readonly tiltStep_deg: number;
  /** Height of the line through the contact points, body z (down), m. */
  readonly contactDown_m: number;
}

export interface BalanceResult {
  readonly measurement: 'balance';
  readonly axis: 'x' | 'y' | 'z';
  readonly centre: Quantified;
  /** Sum of the scales; null for a knife edge. */
  readonly mass_kg: number | null;
  readonly notes: readonly string[];
}

const TILT_LEAST_DEG = 5;

/** @throws InputError for fewer than two scales, readings that are not positive, or scales in one place. */
export function centreFromScales(balance: ScaleBalance, file = 'balance'): BalanceResult {
  checkScales(balance, file);
  const { scales } = balance;
  const inputs = scaleInputs(
    balance,
    scales.map((scale) => scale.reading_kg),
  );
  const result = propagate('m', inputs, (values) => centreOf(values, scales.length));
  return {
    measurement: 'balance',
    axis: balance.axis,
    centre: quantified(result, centreSentence(result.value, result.sigma, balance.axis)),
    mass_kg: scales.reduce((sum, scale) => sum + scale.reading_kg, 0),
    notes: [],
  };
}

/** @throws InputError without a position, or with one that is no number. */
export function centreFromKnifeEdge(balance: KnifeEdgeBalance, file = 'balance'): BalanceResult {
  const { positions_m: positions, axis } = balance;
  if (positions.length === 0 || !positions.every((value) => Number.isFinite(value) && Math.abs(value) <= 5)) {
    throw refuse(file, 'positions_m', positions, 'at least one balance point, from -5 to 5 m');
  }
  const mean = positions.reduce((sum, value) => sum + value, 0) / positions.length;
  const degrees = positions.length - 1;
  const scatter =
    degrees === 0
      ? 0
      : Math.sqrt(
          positions.reduce((sum, value) => sum + (value - mean) ** 2, 0) / degrees / positions.length,
        ) * smallSampleFactor(degrees);
  const sigma = Math.hypot(scatter, stepSigma(balance.lengthStep_m));
  return {
    measurement: 'balance',
    axis,
    centre: quantified({ value: mean, sigma, unit: 'm' }, centreSentence(mean, sigma, axis)),
    mass_kg: null,
    notes: degrees === 0 ? ['One balance point only: turn the craft round and find it again.'] : [],
  };
}

/**
 * Height of the centre of mass: tilted by θ the readings balance at x − h tan θ, h above the contact line.
 * @throws InputError for a tilt below 5° or above 60°, or what centreFromScales refuses.
 */
export function heightFromTilt(balance: TiltBalance, file = 'balance'): BalanceResult {
  checkScales(balance.level, file);
  const { tilt_deg, tiltedReadings_kg: tilted } = balance;
  const count = balance.level.scales.length;
  if (!(tilt_deg >= TILT_LEAST_DEG && tilt_deg <= 60)) {
    throw refuse(file, 'tilt_deg', tilt_deg, `from ${TILT_LEAST_DEG} to 60 deg`);
  }
  if (tilted.length !== count || !tilted.every((value) => value >= 0 && Number.isFinite(value))) {
    throw refuse(file, 'tiltedReadings_kg', tilted, `${count} readings of at least 0 kg, one a scale`);
  }
  const level = scaleInputs(
    balance.level,
    balance.level.scales.map((scale) => scale.reading_kg),
  );
  const inputs: Input[] = [
    ...level,
    ...tilted.map((value, i) => ({
      name: `tilted reading ${i + 1}`,
      value,
      sigma: stepSigma(balance.level.massStep_kg),
    })),
    { name: 'tilt', value: tilt_deg, sigma: stepSigma(balance.tiltStep_deg) },
  ];
  const result = propagate('m', inputs, (values) => {
    const places = values.slice(0, count);
    const centre = centreOf(values, count);
    const tiltedCentre = centreOf([...places, ...values.slice(2 * count, 3 * count)], count);
    const height = (centre - tiltedCentre) / Math.tan((values[3 * count] * Math.PI) / 180);
    return balance.contactDown_m - height;
  });
  return {
    measurement: 'balance',
    axis: 'z',
    centre: quantified(result, centreSentence(result.value, result.sigma, 'z')),
    mass_kg: balance.level.scales.reduce((sum, scale) => sum + scale.reading_kg, 0),
    notes: [],
  };
}

function checkScales(balance: ScaleBalance, file: string): void {
  const { scales } = balance;
  if (scales.length < 2) throw refuse(file, 'scales', scales.length, 'at least two scales');
  scales.forEach((scale, i) => {
    if (!(scale.reading_kg >= 0 && scale.reading_kg <= 150)) {
      throw refuse(file, `scales[${i}].reading_kg`, scale.reading_kg, 'a number from 0 to 150 kg');
    }
    if (!(Math.abs(scale.position_m) <= 5)) {
      throw refuse(file, `scales[${i}].position_m`, scale.position_m, 'a number from -5 to 5 m');
    }
  });
  const places = scales.map((scale) => scale.position_m);
  if (Math.max(...places) - Math.min(...places) < 0.01) {
    throw refuse(file, 'scales', places, 'scales at least 0.01 m apart');
  }
  if (!(scales.reduce((sum, scale) => sum + scale.reading_kg, 0) > 0)) {
    throw refuse(file, 'scales', 0, 'readings that add up to more than 0 kg');
  }
}

/** Places first, then readings. */
function scaleInputs(balance: ScaleBalance, readings: readonly number[]): Input[] {
  return [
    ...balance.scales.map((scale, i) => ({
      name: `place of scale ${i + 1}`,
      value: scale.position_m,
      sigma: stepSigma(balance.lengthStep_m),
    })),
    ...readings.map((value, i) => ({
      name: `reading ${i + 1}`,
      value,
      sigma: stepSigma(balance.massStep_kg),
    })),
  ];
}

function centreOf(values: readonly number[], count: number): number {
  let moment = 0;
  let mass = 0;
  for (let i = 0; i < count; i++) {
    moment += values[i] * values[count + i];
    mass += values[count + i];
  }
  return moment / mass;
}

function centreSentence(value: number, sigma: number, axis: 'x' | 'y' | 'z'): string {
  const mm = (1000 * value).toFixed(1);
  const doubt = (1000 * 1.96 * sigma).toFixed(1);
  if (axis === 'z') {
    return `Known to ±${doubt} mm (95 %): its height from the rotor plane couples speed changes into tilt; it does not move the margins of the rate loop.`;
  }
  return `At ${mm} mm, known to ±${doubt} mm (95 %): an offset makes one pair of rotors carry more in hover, so ${axis === 'x' ? 'pitch' : 'roll'} has less command left on one side; the integral term holds it.`;
}
