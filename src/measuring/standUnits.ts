/**
 * Does a thrust stand's column carry the unit its head says? A propeller's static coefficients lie in a
 * narrow band, so a gram taken for a newton, or rad/s for rev/min, shows at once.
 */
import { unitFor, type Dimension } from './units.ts';

/**
 * Static C_T and figure of merit of small propellers: the UIUC Propeller Data Site's static runs (Brandt &
 * Selig, AIAA 2011-1255) lie inside 0.05–0.18 and 0.35–0.75; the bands are wider.
 */
export const USUAL_CT: readonly [number, number] = [0.03, 0.25];
export const USUAL_MERIT: readonly [number, number] = [0.15, 0.95];
/** Coefficients a build file accepts at all. */
export const POSSIBLE_CT: readonly [number, number] = [0.005, 0.5];

const FORCE_UNITS = ['g', 'N', 'kgf', 'lbf', 'ozf', 'mN'];
const SPEED_UNITS = ['rev/min', 'rad/s', 'rev/s', 'deg/s'];
const TORQUE_UNITS = ['N·m', 'N·mm', 'mN·m', 'N·cm', 'gf·cm', 'kgf·cm', 'ozf·in', 'lbf·in', 'lbf·ft'];

export interface UnitDoubt {
  readonly column: 'thrust' | 'speed' | 'torque';
  readonly stated: string;
  /** Units that would give usual values, the likeliest first; empty when none does. */
  readonly likely: readonly string[];
  readonly why: string;
}

const inside = (value: number, [low, high]: readonly [number, number]): boolean =>
  value >= low && value <= high;

function factor(unit: string, dimension: Dimension): number {
  return unitFor(unit, [dimension])?.toSI ?? 1;
}

/** Doubt about thrust or speed from the median C_T; null when it is usual. */
export function doubtCt(ct: number, thrustUnit: string | null, speedUnit: string | null): UnitDoubt | null {
  if (inside(ct, USUAL_CT)) return null;
  const shown = Number(ct.toPrecision(3));
  const why = `C_T comes out as ${shown}; a propeller's lies from ${USUAL_CT[0]} to ${USUAL_CT[1]}`;
  const thrust = FORCE_UNITS.filter(
    (unit) =>
      thrustUnit !== null && inside((ct * factor(unit, 'force')) / factor(thrustUnit, 'force'), USUAL_CT),
  );
  const speed = SPEED_UNITS.filter(
    (unit) =>
      speedUnit !== null &&
      inside(ct * (factor(speedUnit, 'rotation') / factor(unit, 'rotation')) ** 2, USUAL_CT),
  );
  if (thrust.length === 0 && speed.length > 0) {
    return { column: 'speed', stated: speedUnit ?? '', likely: speed, why };
  }
  return { column: 'thrust', stated: thrustUnit ?? '', likely: thrust, why };
}

/** Doubt about torque from the median figure of merit; null when it is usual. */
export function doubtTorque(merit: number, torqueUnit: string | null): UnitDoubt | null {
  if (inside(merit, USUAL_MERIT)) return null;
  const likely = TORQUE_UNITS.filter(
    (unit) =>
      torqueUnit !== null &&
      inside((merit * factor(torqueUnit, 'torque')) / factor(unit, 'torque'), USUAL_MERIT),
  );
  return {
    column: 'torque',
    stated: torqueUnit ?? '',
    likely,
    why: `the figure of merit comes out as ${Number(merit.toPrecision(3))}; a propeller's lies from ${USUAL_MERIT[0]} to ${USUAL_MERIT[1]}`,
  };
}

/** "C_T comes out as 11.9; …: column thrust reads like g, not N". */
export function doubtSentence(doubt: UnitDoubt): string {
  const guess =
    doubt.likely.length === 0
      ? 'check units, diameter and the number of poles'
      : `the ${doubt.column} column reads like ${doubt.likely[0]}${doubt.stated === '' ? '' : `, not ${doubt.stated}`}`;
  return `${doubt.why}: ${guess}`;
}
