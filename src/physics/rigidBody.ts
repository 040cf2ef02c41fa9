/**
 * Rigid body with full inertia tensor and rotor angular momentum:
 * m v̇ = m g + R F;  I ω̇ + ω × (I ω + h) = τ;  q̇ = ½ q ⊗ (0, ω).
 */
import type { Craft } from '../craft/compile.ts';
import { GRAVITY_MPS2 } from '../math/angles.ts';
import { ATTITUDE, POSITION, RATES, VELOCITY } from './state.ts';

/** Offsets of the wrench on the body about its centre of mass, body axes, and of the rotors' momentum. */
export const FORCE_X = 0;
export const FORCE_Y = 1;
export const FORCE_Z = 2;
export const TORQUE_X = 3;
export const TORQUE_Y = 4;
export const TORQUE_Z = 5;
/** Σ s J_r Ω about body z, N·m·s. */
export const SPIN_MOMENTUM = 6;
export const WRENCH_SIZE = 7;

/** Rotation matrix body to world of the state's quaternion, row by row, into `rotation`. */
export function rotationOf(s: Float64Array, rotation: Float64Array): void {
  const qw = s[ATTITUDE];
  const qx = s[ATTITUDE + 1];
  const qy = s[ATTITUDE + 2];
  const qz = s[ATTITUDE + 3];
  // The quaternion's length is divided out: RK4's inner stages leave the unit sphere by O(h²).
  const unit = 2 / (qw * qw + qx * qx + qy * qy + qz * qz);
  rotation[0] = 1 - unit * (qy * qy + qz * qz);
  rotation[1] = unit * (qx * qy - qw * qz);
  rotation[2] = unit * (qx * qz + qw * qy);
  rotation[3] = unit * (qx * qy + qw * qz);
  rotation[4] = 1 - unit * (qx * qx + qz * qz);
  rotation[5] = unit * (qy * qz - qw * qx);
  rotation[6] = unit * (qx * qz - qw * qy);
  rotation[7] = unit * (qy * qz + qw * qx);
  rotation[8] = 1 - unit * (qx * qx + qy * qy);
}

/** Rates of position, velocity, attitude and body rates for a wrench, into `d`. */
export function rigidBodyRates(
  craft: Craft,
  s: Float64Array,
  rotation: Float64Array,
  wrench: Float64Array,
  d: Float64Array,
): void {
  const p = s[RATES];
  const q = s[RATES + 1];
  const r = s[RATES + 2];

  const perMass = 1 / craft.mass_kg;
  const sx = wrench[FORCE_X] * perMass;
  const sy = wrench[FORCE_Y] * perMass;
  const sz = wrench[FORCE_Z] * perMass;
  d[POSITION] = s[VELOCITY];
  d[POSITION + 1] = s[VELOCITY + 1];
  d[POSITION + 2] = s[VELOCITY + 2];
  d[VELOCITY] = rotation[0] * sx + rotation[1] * sy + rotation[2] * sz;
  d[VELOCITY + 1] = rotation[3] * sx + rotation[4] * sy + rotation[5] * sz;
  d[VELOCITY + 2] = rotation[6] * sx + rotation[7] * sy + rotation[8] * sz + GRAVITY_MPS2;

  const qw = s[ATTITUDE];
  const qx = s[ATTITUDE + 1];
  const qy = s[ATTITUDE + 2];
  const qz = s[ATTITUDE + 3];
  d[ATTITUDE] = 0.5 * (-qx * p - qy * q - qz * r);
  d[ATTITUDE + 1] = 0.5 * (qw * p + qy * r - qz * q);
  d[ATTITUDE + 2] = 0.5 * (qw * q + qz * p - qx * r);
  d[ATTITUDE + 3] = 0.5 * (qw * r + qx * q - qy * p);

  const I = craft.inertia;
  const hx = I[0] * p + I[1] * q + I[2] * r;
  const hy = I[3] * p + I[4] * q + I[5] * r;
  const hz = I[6] * p + I[7] * q + I[8] * r + wrench[SPIN_MOMENTUM];
  const tx = wrench[TORQUE_X] - (q * hz - r * hy);
  const ty = wrench[TORQUE_Y] - (r * hx - p * hz);
  const tz = wrench[TORQUE_Z] - (p * hy - q * hx);
  const inv = craft.inertiaInverse;
  d[RATES] = inv[0] * tx + inv[1] * ty + inv[2] * tz;
  d[RATES + 1] = inv[3] * tx + inv[4] * ty + inv[5] * tz;
  d[RATES + 2] = inv[6] * tx + inv[7] * ty + inv[8] * tz;
}
