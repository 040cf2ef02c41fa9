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
import { FORCE_X, FORCE_Y, FORCE_Z, TORQUE_X, TORQUE_Y, TORQUE_Z, WRENCH_SIZE } from './rigidBody.ts';
import { INFLOW, ROTOR_SPEED } from './state.ts';

/** Shares of the rigid-blade moment that reach the hub: flap frequency ratio 1.5, Lock number 2.5. */
const ROLL_SHARE = 0.95;
const FLAP_BACK_SHARE = 0.24;
const PER_SEA_LEVEL_DENSITY = 1 / 1.225;
/** Cheeseman & Bennett is not used closer to the ground than half a radius: T/T∞ = 4/3 there. */
const LEAST_GROUND_CLEARANCE = 0.5;
/** Above four radii the effect is below 0.4 %. */
const GROUND_EFFECT_REACH = 8;

/** Offsets in the flow that meets the rotors: velocity of the centre of mass and rates, both against the air. */
export const FLOW_U = 0;
export const FLOW_V = 1;
export const FLOW_W = 2;
export const FLOW_P = 3;
export const FLOW_Q = 4;
export const FLOW_R = 5;
export const FLOW_DENSITY = 6;
/** Height of the centre of mass over the ground, and the last row of the rotation body to world. */
export const FLOW_HEIGHT = 7;
export const FLOW_DOWN_X = 8;
export const FLOW_DOWN_Y = 9;
export const FLOW_DOWN_Z = 10;
export const FLOW_SIZE = 11;

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

/** Offsets in one rotor's block of coefficients that hold over a step. */
const HELD_THRUST = 0;
const HELD_TORQUE = 1;
const HELD_INFLOW = 2;
const HELD_SHARE = 3;
const HELD_SIZE = 4;

/**
 * The four rotors' aerodynamics: static coefficients that hold over a step, and the loads in any flow.
 * Numbers go through typed arrays, not arguments: a number passed to a function that is not inlined is boxed,
 * one allocation each.
 */
export class RotorSet {
  /** Share of the healthy thrust per rotor (faults). */
  readonly thrustShare = new Float64Array([1, 1, 1, 1]);
  /** The flow, set by the caller. */
  readonly flow = new Float64Array(FLOW_SIZE);
  /** Results of `loads`: wrench on the body; thrust N, shaft torque N·m, inflow rate m/s² per rotor. */
  readonly wrench = new Float64Array(WRENCH_SIZE);
  readonly thrust_N = new Float64Array(4);
  readonly torque_Nm = new Float64Array(4);
  readonly inflowRate_mps2 = new Float64Array(4);
  private readonly held = new Float64Array(4 * HELD_SIZE);

  /**
   * Takes the static coefficients from the tables at the rotors' speeds: thrust and torque over ρ Ω², hover
   * inflow over Ω. They change by parts in a thousand within a step and so hold over it.
   */
  hold(c: RotorConstants, s: Float64Array): void {
    const { held, thrustShare } = this;
    for (let i = 0; i < 4; i++) {
      const place = Math.min(Math.abs(s[ROTOR_SPEED + i]) * c.tablePerSpeed_s, TABLE_POINTS - 1.000001);
      const index = place | 0;
      const part = place - index;
      const share = thrustShare[i];
      const at = i * HELD_SIZE;
      held[at + HELD_THRUST] =
        share * (c.thrustFactor[index] + part * (c.thrustFactor[index + 1] - c.thrustFactor[index]));
      held[at + HELD_TORQUE] =
        c.torqueFactor[index] + part * (c.torqueFactor[index + 1] - c.torqueFactor[index]);
      held[at + HELD_INFLOW] =
        Math.sqrt(share) *
        (c.hoverInflowFactor_m[index] +
          part * (c.hoverInflowFactor_m[index + 1] - c.hoverInflowFactor_m[index]));
      held[at + HELD_SHARE] = share;
    }
  }

  /** Loads of all rotors at state `s` in `flow`; results in the fields above. */
  loads(c: RotorConstants, position: Float64Array, spin: Float64Array, s: Float64Array): void {
    const { flow, held, wrench, thrust_N, torque_Nm, inflowRate_mps2 } = this;
    const { advanceTop, inflowSlope_m3, inflowRelaxation_per_m } = c;
    const u0 = flow[FLOW_U];
    const v0 = flow[FLOW_V];
    const w0 = flow[FLOW_W];
    const p = flow[FLOW_P];
    const q = flow[FLOW_Q];
    const r = flow[FLOW_R];
    const rho = flow[FLOW_DENSITY];
    const nearGround = flow[FLOW_DOWN_Z] > 0.5 && flow[FLOW_HEIGHT] < GROUND_EFFECT_REACH * 3 * c.radius_m;
    const perArea = c.perTwiceArea_m2 / rho;
    const dragFactor = c.inPlaneDrag * rho * PER_SEA_LEVEL_DENSITY;
    let fx = 0;
    let fy = 0;
    let fz = 0;
    let mx = 0;
    let my = 0;
    let mz = 0;
    for (let i = 0; i < 4; i++) {
      const x = position[3 * i];
      const y = position[3 * i + 1];
      const z = position[3 * i + 2];
      const speed = s[ROTOR_SPEED + i];
      const inflow = s[INFLOW + i];
      // Velocity of the hub against the air.
      const u = u0 + q * z - r * y;
      const v = v0 + r * x - p * z;
      const climb = q * x - w0 - p * y;
      const hold = i * HELD_SIZE;
      const kT = held[hold + HELD_THRUST];
      const kQ = held[hold + HELD_TORQUE];
      const kH = held[hold + HELD_INFLOW];

      // Thrust over speed, so that a stopped rotor needs no division.
      const hoverInflow = kH * speed;
      let through = climb + inflow;
      let perSpeed: number;
      let torque: number;
      if (advanceTop > 0 && climb >= 0 && speed > 1) {
        const j = (Math.PI * climb) / (speed * c.radius_m);
        perSpeed = kT * rho * speed * ratioAt(c.advanceThrust, j / advanceTop);
        torque = kQ * rho * speed * speed * ratioAt(c.advancePower, j / advanceTop);
      } else {
        // A table holds steady values, so descent beside it takes the steady inflow too and joins at rest.
        if (advanceTop > 0) {
          through = climb + (hoverInflow > 0.1 ? hoverInflow * axialInflowRatio(climb / hoverInflow) : 0);
        }
        perSpeed = rho * (kT * speed - inflowSlope_m3 * held[hold + HELD_SHARE] * (through - hoverInflow));
        // Induced and climb power, plus the rest of the static shaft power (profile drag, swirl, tip loss).
        torque = perSpeed * through + rho * (kQ - kT * kH) * speed * speed;
      }
      const freeThrust = perSpeed * speed;

      // Induced velocity relaxes to momentum theory; in descent the mass flow is that of Leishman's fit.
      const inducedSquare = freeThrust * perArea;
      let axialFlow = climb + inflow;
      if (climb < 0 && inducedSquare > 1e-6 && climb * climb < 4 * inducedSquare) {
        const vh = Math.sqrt(inducedSquare);
        axialFlow = vh / axialInflowRatio(climb / vh);
      }
      const massFlowSpeed = Math.sqrt(u * u + v * v + axialFlow * axialFlow);
      inflowRate_mps2[i] = (inducedSquare - massFlowSpeed * inflow) * inflowRelaxation_per_m;

      let thrust = freeThrust;
      if (nearGround) {
        const below = flow[FLOW_DOWN_X] * x + flow[FLOW_DOWN_Y] * y + flow[FLOW_DOWN_Z] * z;
        thrust *= groundEffect(c.radius_m, flow[FLOW_HEIGHT] - below);
      }
      thrust_N[i] = thrust;
      torque_Nm[i] = torque;

      // In-plane force and the hub moments of edgewise flow.
      const drag = dragFactor * Math.abs(speed);
      const hx = -drag * u;
      const hy = -drag * v;
      const edgewise = speed > 1 ? perSpeed + 0.5 * rho * inflowSlope_m3 * through : 0;
      const roll = ROLL_SHARE * edgewise * spin[i];
      const back = FLAP_BACK_SHARE * edgewise;
      fx += hx;
      fy += hy;
      fz -= thrust;
      mx += roll * u - back * v - y * thrust - z * hy;
      my += roll * v + back * u + z * hx + x * thrust;
      mz += x * hy - y * hx;
    }
    wrench[FORCE_X] = fx;
    wrench[FORCE_Y] = fy;
    wrench[FORCE_Z] = fz;
    wrench[TORQUE_X] = mx;
    wrench[TORQUE_Y] = my;
    wrench[TORQUE_Z] = mz;
  }
}

/** A compiled advance table at `share` of its reach, linear between its points. */
function ratioAt(table: Float64Array, share: number): number {
  const place = Math.min(share * (TABLE_POINTS - 1), TABLE_POINTS - 1.000001);
  const index = place | 0;
  return table[index] + (place - index) * (table[index + 1] - table[index]);
}
