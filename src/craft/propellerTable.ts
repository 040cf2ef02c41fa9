/** Static propeller coefficients against speed, as the build file gives them. */
import type { Build } from './buildSchema.ts';

const SEA_LEVEL_DENSITY = 1.225;
type Propeller = Build['propeller'];

/** C_T and C_P at `speed_radps` from the table (linear between rows, held at its ends) or the constants. */
export function staticCoefficients(propeller: Propeller, speed_radps: number): { ct: number; cp: number } {
  const table = propeller.staticTable;
  if (table === undefined) return { ct: propeller.thrustCoefficient, cp: propeller.powerCoefficient };
  const rpm = (speed_radps * 30) / Math.PI;
  const last = table[table.length - 1];
  if (rpm <= table[0].rpm) return { ct: table[0].ct, cp: table[0].cp };
  if (rpm >= last.rpm) return { ct: last.ct, cp: last.cp };
  const upper = table.findIndex((row) => row.rpm >= rpm);
  const [a, b] = [table[upper - 1], table[upper]];
  const share = (rpm - a.rpm) / (b.rpm - a.rpm);
  return { ct: a.ct + share * (b.ct - a.ct), cp: a.cp + share * (b.cp - a.cp) };
}

/** Static thrust of one rotor at sea-level density, with the coefficients used. */
export function staticThrustAtSpeed_N(
  propeller: Propeller,
  speed_radps: number,
): { thrust_N: number; ct: number; cp: number } {
  const { ct, cp } = staticCoefficients(propeller, speed_radps);
  const n = speed_radps / (2 * Math.PI);
  return { thrust_N: ct * SEA_LEVEL_DENSITY * n * n * Math.pow(propeller.diameter_m, 4), ct, cp };
}
