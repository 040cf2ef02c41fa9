/** A bare craft over ground and solids: free steps by a plain Runge–Kutta, contact steps by ContactWorld. */
import { OPEN_FIELD, parseScene, type Scene } from '../../src/craft/scene.ts';
import { GRAVITY_MPS2 } from '../../src/math/angles.ts';
import { RungeKutta4 } from '../../src/math/integration.ts';
import { ContactWorld, type ContactOptions } from '../../src/physics/contact.ts';
import { ATTITUDE, POSITION, RATES, VELOCITY } from '../../src/physics/state.ts';

export const STEP_S = 0.0005;
export const LEG_M = 0.14;
export const TRACK_M = 0.12;
export const MASS_KG = 1.35;
export const RADIUS_M = 0.127;
const INERTIA = [0.0152, 0.0164, 0.0278] as const;
const SIZE = 13;

export function siteWith(
  solids: readonly object[],
  ground: { friction?: number; restitution?: number } = {},
): Scene {
  return parseScene({
    ...OPEN_FIELD,
    ground: { tone: 'grass', friction: 0.5, restitution: 0.3, ...ground },
    solids,
  });
}

export function optionsAt(scene: Scene): ContactOptions {
  return {
    scene,
    mass_kg: MASS_KG,
    inertiaDiagonal_kgm2: INERTIA,
    rotorPositions_m: [
      [0.16, -0.16, -0.03],
      [0.16, 0.16, -0.03],
      [-0.16, -0.16, -0.03],
      [-0.16, 0.16, -0.03],
    ],
    propellerRadius_m: RADIUS_M,
    legHeight_m: LEG_M,
    legHalfTrack_m: TRACK_M,
  };
}

export class ContactBench {
  readonly state = new Float64Array(SIZE);
  readonly world: ContactWorld;
  /** Beyond gravity: m/s² world, N·m body. */
  readonly push_mps2 = new Float64Array(3);
  readonly torque_Nm = new Float64Array(3);
  gravity_mps2 = GRAVITY_MPS2;
  /** Steps with contact so far, and the largest gain of energy in one of them, J. */
  contactSteps = 0;
  worstGain_J = -Infinity;
  touched = false;
  private readonly integrator = new RungeKutta4(SIZE);
  private readonly rate = new Float64Array(SIZE);

  constructor(scene: Scene) {
    this.world = new ContactWorld(optionsAt(scene));
    this.state[ATTITUDE] = 1;
  }

  at(down: number, velocity: readonly number[] = [0, 0, 0]): this {
    this.state[POSITION + 2] = down;
    this.state.set(velocity, VELOCITY);
    return this;
  }

  run(seconds: number, each?: (state: Float64Array) => void): this {
    const steps = Math.round(seconds / STEP_S);
    for (let k = 0; k < steps; k++) {
      this.step();
      each?.(this.state);
    }
    return this;
  }

  step(): void {
    const { state, rate, world } = this;
    this.derivative(state, rate);
    this.touched = false;
    if (world.near(state)) {
      const before = this.energy_J();
      this.touched = world.step(
        state,
        STEP_S,
        rate.subarray(VELOCITY, VELOCITY + 3),
        rate.subarray(RATES, RATES + 3),
      );
      if (this.touched) {
        this.contactSteps++;
        this.worstGain_J = Math.max(this.worstGain_J, this.energy_J() - before);
      }
    }
    if (this.touched) return;
    this.integrator.step(this, state, STEP_S);
    const q = state.subarray(ATTITUDE, ATTITUDE + 4);
    const size = Math.hypot(q[0], q[1], q[2], q[3]);
    for (let i = 0; i < 4; i++) q[i] /= size;
  }

  derivative(s: Float64Array, d: Float64Array): void {
    const [w, x, y, z] = s.subarray(ATTITUDE, ATTITUDE + 4);
    const [p, q, r] = s.subarray(RATES, RATES + 3);
    for (let i = 0; i < 3; i++) {
      d[POSITION + i] = s[VELOCITY + i];
      d[VELOCITY + i] = this.push_mps2[i];
    }
    d[VELOCITY + 2] += this.gravity_mps2;
    d[ATTITUDE] = 0.5 * (-x * p - y * q - z * r);
    d[ATTITUDE + 1] = 0.5 * (w * p + y * r - z * q);
    d[ATTITUDE + 2] = 0.5 * (w * q - x * r + z * p);
    d[ATTITUDE + 3] = 0.5 * (w * r + x * q - y * p);
    const [ix, iy, iz] = INERTIA;
    d[RATES] = (this.torque_Nm[0] - (iz - iy) * q * r) / ix;
    d[RATES + 1] = (this.torque_Nm[1] - (ix - iz) * r * p) / iy;
    d[RATES + 2] = (this.torque_Nm[2] - (iy - ix) * p * q) / iz;
  }

  energy_J(): number {
    const s = this.state;
    return (
      0.5 * MASS_KG * (s[3] ** 2 + s[4] ** 2 + s[5] ** 2) +
      0.5 * (INERTIA[0] * s[10] ** 2 + INERTIA[1] * s[11] ** 2 + INERTIA[2] * s[12] ** 2) -
      MASS_KG * this.gravity_mps2 * s[POSITION + 2]
    );
  }

  /** Angle between body z and straight down, rad. */
  tilt_rad(): number {
    const s = this.state;
    return 2 * Math.asin(Math.min(1, Math.hypot(s[ATTITUDE + 1], s[ATTITUDE + 2])));
  }
}
