/**
 * One rotor in any flow, in closed form from its compiled constants.
 *
 * Thrust: static C_T(n) less the blade-element loss for inflow beyond hover's, with the induced velocity as a
 * state that relaxes to momentum theory (Glauert) through the apparent mass of Pitt & Peters (1981); in
 * descent the mass flow follows Leishman's fit through the vortex ring state (Principles of Helicopter
 * Aerodynamics, eq. 2.96). With a measured advance table C_T(J), C_P(J) take over in climb.
 * In-plane force: proportional to Ω times the in-plane airspeed (Bristeau, Martin, Salaün 2009; Mahony,
 * Kumar, Corke 2012). Hub moments: the blade-element rolling moment of a blade in edgewise flow, of which a
 * stiff small propeller passes most as roll (its sense follows the spin) and a part, by flapping, as pitch back.
 */
import { TABLE_POINTS, type RotorConstants } from '../craft/compile.ts';

/** Shares of the rigid-blade moment that reach the hub: flap frequency ratio 1.5, Lock number 2.5. */
const ROLL_SHARE = 0.95;
const FLAP_BACK_SHARE = 0.24;
/** Apparent mass of the disc's flow over ρ A R, Pitt & Peters. */
const APPARENT_MASS = 8 / (3 * Math.PI);
/** Cheeseman & Bennett is not used closer to the ground than half a radius: T/T∞ = 4/3 there. */
const LEAST_GROUND_CLEARANCE = 0.5;
/** Above four radii the effect is below 0.4 %. */
const GROUND_EFFECT_REACH = 8;

/** Offsets in one rotor's block of loads. */
export const THRUST = 0;
export const TORQUE = 1;
export const FORCE_X = 2;
export const FORCE_Y = 3;
export const MOMENT_X = 4;
export const MOMENT_Y = 5;
export const INFLOW_RATE = 6;
export const LOADS_SIZE = 7;

/**
 * Ratio of induced to hover velocity in axial flight, v_i/v_h, for climb ratio x = V_c/v_h (negative in
 * descent): momentum theory for x ≥ 0, Leishman's quartic for −2 ≤ x < 0, windmill brake state below.
 */
export function axialInflowRatio(x: number): number {
  if (x >= 0) return -x / 2 + Math.sqrt((x * x) / 4 + 1);
  if (x >= -2) return 1 + x * (-1.125 + x * (-1.372 + x * (-1.718 + x * -0.655)));
  return -x / 2 - Math.sqrt((x * x) / 4 - 1);
}

/** Cheeseman & Bennett (1955), T/T∞ at constant power for height z of the disc over the ground. */
export function groundEffect(radius_m: number, height_m: number): number {
  if (height_m > GROUND_EFFECT_REACH * radius_m) return 1;
  const clearance = Math.max(height_m / radius_m, LEAST_GROUND_CLEARANCE);
  const q = 1 / (4 * clearance);
  return 1 / (1 - q * q);
}

/**
 * Loads of one rotor, written into `out` from `at` (offsets above): thrust N, shaft torque N·m, in-plane
 * force N, hub moments N·m, rate of the induced velocity m/s².
 *
 * @param rho air density kg/m³
 * @param speed rotor speed rad/s
 * @param inflow induced velocity m/s (state)
 * @param u,v,w velocity of the hub relative to the air, body axes, m/s
 * @param spin +1 clockwise from above, −1 counter-clockwise
 * @param ground T/T∞ of the ground effect
 * @param thrustShare share of the healthy thrust (faults); torque follows it by half
 */
export function rotorLoads(
  c: RotorConstants,
  rho: number,
  speed: number,
  inflow: number,
  u: number,
  v: number,
  w: number,
  spin: number,
  ground: number,
  thrustShare: number,
  out: Float64Array,
  at: number,
): void {
  const place = (Math.abs(speed) / c.tableTop_radps) * (TABLE_POINTS - 1);
  const index = place >= TABLE_POINTS - 2 ? TABLE_POINTS - 2 : place | 0;
  const part = place >= TABLE_POINTS - 1 ? 1 : place - index;
  const kT = (c.thrustFactor[index] + part * (c.thrustFactor[index + 1] - c.thrustFactor[index])) * thrustShare;
  const kQ = c.torqueFactor[index] + part * (c.torqueFactor[index + 1] - c.torqueFactor[index]);
  const kHealthy =
    c.hoverInflowFactor_m[index] + part * (c.hoverInflowFactor_m[index + 1] - c.hoverInflowFactor_m[index]);
  const kH = thrustShare === 1 ? kHealthy : kHealthy * Math.sqrt(thrustShare);

  const climb = -w;
  const hoverInflow = kH * speed;
  let thrust: number;
  let torque: number;
  let through = climb + inflow;
  if (c.advanceTop > 0) {
    if (climb >= 0 && speed > 1) {
      const j = (Math.PI * climb) / (speed * c.radius_m);
      const rowPlace = (j / c.advanceTop) * (TABLE_POINTS - 1);
      const row = rowPlace >= TABLE_POINTS - 2 ? TABLE_POINTS - 2 : rowPlace | 0;
      const rowPart = rowPlace >= TABLE_POINTS - 1 ? 1 : rowPlace - row;
      const rT = c.advanceThrust[row] + rowPart * (c.advanceThrust[row + 1] - c.advanceThrust[row]);
      const rQ = c.advancePower[row] + rowPart * (c.advancePower[row + 1] - c.advancePower[row]);
      thrust = kT * rho * speed * speed * rT;
      torque = kQ * rho * speed * speed * rQ;
    } else {
      through = hoverInflow > 0.1 ? climb + hoverInflow * axialInflowRatio(climb / hoverInflow) : climb;
      const perSpeed = rho * (kT * speed - c.inflowSlope_m3 * (through - hoverInflow));
      thrust = perSpeed * speed;
      torque = perSpeed * through + rho * (kQ - kT * kH) * speed * speed;
    }
  } else {
    const perSpeed = rho * (kT * speed - c.inflowSlope_m3 * thrustShare * (through - hoverInflow));
    thrust = perSpeed * speed;
    // Induced and climb power, plus what is left of the static shaft power (profile drag, swirl, tip loss).
    torque = perSpeed * through + rho * (kQ - kT * kH) * speed * speed;
  }

  const inPlane2 = u * u + v * v;
  let axialFlow = Math.abs(through);
  const inducedSquare = thrust / (2 * rho * c.discArea_m2);
  if (climb < 0 && inducedSquare > 1e-6) {
    const vh = Math.sqrt(inducedSquare);
    if (climb > -2 * vh) axialFlow = vh / axialInflowRatio(climb / vh);
  }
  const massFlowSpeed = Math.sqrt(inPlane2 + axialFlow * axialFlow);

  const drag = (c.inPlaneDrag * rho * Math.abs(speed)) / 1.225;
  const edgewise = speed > 1 ? thrust / speed + 0.5 * rho * c.inflowSlope_m3 * through : 0;
  const roll = ROLL_SHARE * edgewise * spin;
  const back = FLAP_BACK_SHARE * edgewise;
  out[at + THRUST] = thrust * ground;
  out[at + TORQUE] = torque;
  out[at + FORCE_X] = -drag * u;
  out[at + FORCE_Y] = -drag * v;
  out[at + MOMENT_X] = roll * u - back * v;
  out[at + MOMENT_Y] = roll * v + back * u;
  out[at + INFLOW_RATE] = (2 * (inducedSquare - massFlowSpeed * inflow)) / (APPARENT_MASS * c.radius_m);
}
