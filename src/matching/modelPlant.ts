/**
 * The plant that a build itself promises about hover, per axis: what a fit is compared with and where its
 * search begins. From the build's constants in closed form (rigid body, static thrust, first-order motor).
 */
import { compileCraft, type Craft } from '../craft/compile.ts';
import type { Build } from '../craft/build.ts';
import type { AxisName } from '../craft/gains.ts';
import { staticCoefficients } from '../craft/propellerTable.ts';
import { DEG_PER_RAD } from '../math/angles.ts';
import { findTrim, HOVER } from '../physics/trim.ts';
import { ROTOR_SPEED } from '../physics/state.ts';
import type { PlantParameters } from './axisData.ts';

const SEA_LEVEL_DENSITY = 1.225;

export interface ModelPlant extends Readonly<Record<AxisName, Required<PlantParameters>>> {
  /** Mean motor command in hover, µs. */
  readonly hoverCommand_us: number;
}

/**
 * Plant about hover at sea level on a full pack.
 * @param computeDelay_s of the controller, where it is known
 * @throws RangeError when the build cannot hover.
 */
export function modelPlant(build: Build, computeDelay_s = 0): ModelPlant {
  const craft = compileCraft(build);
  const trim = findTrim(craft, { ...HOVER, density_kgpm3: SEA_LEVEL_DENSITY });
  const speed = trim.state.subarray(ROTOR_SPEED, ROTOR_SPEED + 4).reduce((sum, value) => sum + value, 0) / 4;
  const motor = motorAbout(craft, speed, trim.voltage_V);
  const thrustSlope = slope(craft, speed, 'thrust');
  const torqueSlope = slope(craft, speed, 'torque');
  const delay_s = computeDelay_s + gyroDelay_s(build);
  const arms = [0, 1].map((axis) => {
    let sum = 0;
    // Roll by the arms along y, pitch by those along x.
    for (let i = 0; i < 4; i++) sum += Math.abs(craft.rotorPosition_m[3 * i + (1 - axis)]);
    return sum;
  });
  const [Ixx, Iyy, Izz] = [craft.inertia[0], craft.inertia[4], craft.inertia[8]];
  const perSpeed = motor.speedPerCommand * DEG_PER_RAD;
  const plant = (gain: number, lead_s: number): Required<PlantParameters> => ({
    gain_dps2_per_us: gain,
    lag_s: motor.lag_s,
    delay_s,
    lead_s,
    damping_per_s: 0,
  });
  return {
    roll: plant((arms[0] * thrustSlope * perSpeed) / Ixx, 0),
    pitch: plant((arms[1] * thrustSlope * perSpeed) / Iyy, 0),
    yaw: plant((4 * torqueSlope * perSpeed) / Izz, craft.rotor.inertia_kgm2 / torqueSlope),
    hoverCommand_us: trim.command_us.reduce((sum, value) => sum + value, 0) / 4,
  };
}

/** Delay of the gyro with the lag of its bandwidth, s. */
export function gyroDelay_s(build: Build): number {
  const { delay_s, bandwidth_Hz } = build.gyro;
  return delay_s + (bandwidth_Hz > 0 ? 1 / (2 * Math.PI * bandwidth_Hz) : 0);
}

/** First-order motor about `speed`: J dΩ/dt = K(uV − KΩ)/R − Q(Ω), linearised; or the lag that was measured. */
function motorAbout(craft: Craft, speed: number, voltage_V: number) {
  const { motor } = craft;
  const span_us = craft.escMax_us - craft.escMin_us;
  if (!motor.electric) {
    return { lag_s: (motor.lagUp_s + motor.lagDown_s) / 2, speedPerCommand: motor.maxSpeed_radps / span_us };
  }
  const K = motor.torqueConstant;
  const load = (K * K) / motor.resistance_ohm + slope(craft, speed, 'torque');
  return {
    lag_s: craft.rotor.inertia_kgm2 / load,
    speedPerCommand: (K * voltage_V) / (motor.resistance_ohm * load * span_us),
  };
}

/** dT/dΩ or dQ/dΩ at rest, N or N·m per rad/s. */
function slope(craft: Craft, speed: number, what: 'thrust' | 'torque'): number {
  const h = speed * 1e-3;
  return (load(craft, speed + h, what) - load(craft, speed - h, what)) / (2 * h);
}

function load(craft: Craft, speed: number, what: 'thrust' | 'torque'): number {
  const { ct, cp } = staticCoefficients(craft.build.propeller, speed);
  const n = speed / (2 * Math.PI);
  const D = craft.build.propeller.diameter_m;
  return what === 'thrust'
    ? ct * SEA_LEVEL_DENSITY * n * n * D ** 4
    : (cp / (2 * Math.PI)) * SEA_LEVEL_DENSITY * n * n * D ** 5;
}
