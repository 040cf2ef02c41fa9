/**
 * Trim: the rotor speeds, inflows and duties at which the craft keeps a steady attitude and velocity, found
 * by Newton's method on the nonlinear equations themselves.
 */
import { Matrix, solve } from 'ml-matrix';
import type { Craft } from '../craft/compile.ts';
import { GRAVITY_MPS2 } from '../math/angles.ts';
import { quaternionFromEuler } from '../math/quaternion.ts';
import { FlightDynamics } from './dynamics.ts';
import { ATTITUDE, CHARGE, INFLOW, POSITION, RATES, ROTOR_SPEED, STATE_SIZE, VELOCITY } from './state.ts';

export interface TrimPoint {
  /** Air-relative velocity to hold, world axes, m/s, heading north. */
  readonly north_mps: number;
  readonly east_mps: number;
  readonly down_mps: number;
  /** State of charge of the battery. */
  readonly charge: number;
  readonly density_kgpm3: number;
}

export interface Trim {
  /** Steady state, heading north, far above the ground. */
  readonly state: Float64Array;
  /** Share of battery voltage per motor, FL, FR, RL, RR. */
  readonly duty: Float64Array;
  /** The same as commands, µs. */
  readonly command_us: Float64Array;
  readonly roll_rad: number;
  readonly pitch_rad: number;
  readonly current_A: number;
  readonly voltage_V: number;
}

/** Unknowns: four rotor speeds, four inflows, four duties, roll and pitch. */
const UNKNOWNS = 14;
const TOLERANCE = 1e-11;

export const HOVER: Omit<TrimPoint, 'density_kgpm3'> = { north_mps: 0, east_mps: 0, down_mps: 0, charge: 1 };

/**
 * Finds the trim of `craft` at `point`.
 * @throws RangeError when there is none (not enough thrust, or too fast).
 */
export function findTrim(craft: Craft, point: TrimPoint): Trim {
  const dynamics = new FlightDynamics(craft, point.density_kgpm3);
  dynamics.groundDown_m = 1e6;
  const state = new Float64Array(STATE_SIZE);
  const rate = new Float64Array(STATE_SIZE);
  const unknown = firstGuess(craft, point);
  const scale = residualScale(craft);

  const residual = (x: Float64Array): Float64Array => {
    fillState(state, x, point);
    for (let i = 0; i < 4; i++) dynamics.duty[i] = x[8 + i];
    dynamics.prepare(state);
    // Twice, since a lagged motor's battery sees the loads of the call before.
    dynamics.derivative(state, rate);
    dynamics.derivative(state, rate);
    return Float64Array.from(
      [0, 1, 2]
        .map((i) => rate[VELOCITY + i])
        .concat([0, 1, 2].map((i) => rate[RATES + i]))
        .concat([0, 1, 2, 3].map((i) => rate[ROTOR_SPEED + i]))
        .concat([0, 1, 2, 3].map((i) => rate[INFLOW + i])),
      (value, index) => value / scale[index],
    );
  };

  let r = residual(unknown);
  for (let iteration = 0; iteration < 60 && norm(r) > TOLERANCE; iteration++) {
    const step = newtonStep(residual, unknown, r);
    let share = 1;
    let next = r;
    // Damped Newton: halve until the residual falls.
    for (let halving = 0; halving < 12; halving++) {
      const trial = unknown.map((value, i) => value - share * step[i]);
      next = residual(trial);
      if (norm(next) < norm(r)) {
        unknown.set(trial);
        break;
      }
      share /= 2;
    }
    if (next === r || !(norm(next) < norm(r))) break;
    r = next;
  }
  if (!(norm(r) < 1e-7) || unknown.subarray(8, 12).some((duty) => duty > 1 || duty < 0)) {
    throw new RangeError(
      `no trim for ${craft.name} at ${describePoint(point)}: a motor would need ${(100 * Math.max(...unknown.subarray(8, 12))).toFixed(0)} % of its voltage`,
    );
  }
  residual(unknown);
  const span_us = craft.escMax_us - craft.escMin_us;
  return {
    state: state.slice(),
    duty: unknown.slice(8, 12),
    command_us: unknown.slice(8, 12).map((duty) => craft.escMin_us + duty * span_us),
    roll_rad: unknown[12],
    pitch_rad: unknown[13],
    current_A: dynamics.batteryCurrent_A,
    voltage_V: dynamics.batteryVoltage_V,
  };
}

function describePoint(point: TrimPoint): string {
  return `${point.north_mps} m/s north, ${point.east_mps} m/s east, ${-point.down_mps} m/s up, charge ${point.charge}`;
}

function norm(values: Float64Array): number {
  let sum = 0;
  for (const value of values) sum += value * value;
  return Number.isFinite(sum) ? Math.sqrt(sum) : Infinity;
}

function residualScale(craft: Craft): Float64Array {
  const linear = GRAVITY_MPS2;
  const angular = GRAVITY_MPS2 / craft.span_m;
  const rotor = craft.topSpeed_radps / 0.05;
  const inflow = 5 / 0.005;
  return Float64Array.from([
    ...[linear, linear, linear],
    ...[angular, angular, angular],
    ...[rotor, rotor, rotor, rotor],
    ...[inflow, inflow, inflow, inflow],
  ]);
}

function firstGuess(craft: Craft, point: TrimPoint): Float64Array {
  const guess = new Float64Array(UNKNOWNS);
  const last = craft.rotor.thrustFactor.length - 1;
  const perSquare = craft.rotor.thrustFactor[last >> 1] * point.density_kgpm3;
  const speed = Math.sqrt((craft.mass_kg * GRAVITY_MPS2) / (4 * perSquare));
  guess.fill(speed, 0, 4);
  guess.fill(speed * craft.rotor.hoverInflowFactor_m[last >> 1], 4, 8);
  guess.fill(Math.min(0.95, speed / craft.topSpeed_radps), 8, 12);
  return guess;
}

function fillState(state: Float64Array, x: Float64Array, point: TrimPoint): void {
  state.fill(0);
  state[POSITION + 2] = -1000;
  state[VELOCITY] = point.north_mps;
  state[VELOCITY + 1] = point.east_mps;
  state[VELOCITY + 2] = point.down_mps;
  state.set(quaternionFromEuler(x[12], x[13], 0), ATTITUDE);
  for (let i = 0; i < 4; i++) {
    state[ROTOR_SPEED + i] = x[i];
    state[INFLOW + i] = x[4 + i];
  }
  state[CHARGE] = point.charge;
}

function newtonStep(
  residual: (x: Float64Array) => Float64Array,
  x: Float64Array,
  r: Float64Array,
): Float64Array {
  const jacobian = Matrix.zeros(UNKNOWNS, UNKNOWNS);
  for (let j = 0; j < UNKNOWNS; j++) {
    const delta = 1e-6 * Math.max(1e-2, Math.abs(x[j]));
    const high = x.slice();
    const low = x.slice();
    high[j] += delta;
    low[j] -= delta;
    const rHigh = residual(high);
    const rLow = residual(low);
    for (let i = 0; i < UNKNOWNS; i++) jacobian.set(i, j, (rHigh[i] - rLow[i]) / (2 * delta));
  }
  const step = solve(jacobian, Matrix.columnVector(Array.from(r)), true);
  return Float64Array.from(step.to1DArray());
}
