/**
 * The equations of motion: rate of change of the whole flight state for commands and air that hold over the
 * step. Passes in the order of the physics: attitude → airspeed → battery → motors and rotors → body drag →
 * linear and angular acceleration. Nothing is allocated.
 *
 * m v̇ = m g + R F;  I ω̇ + ω × (I ω + h) = τ, with h = Σ s J_r Ω about body z and the motors' reaction in τ.
 */
import { LAGGED_MOTOR_EFFICIENCY, type Craft } from '../craft/compile.ts';
import { GRAVITY_MPS2 } from '../math/angles.ts';
import {
  FORCE_X,
  FORCE_Y,
  groundEffect,
  INFLOW_RATE,
  LOADS_SIZE,
  MOMENT_X,
  MOMENT_Y,
  rotorLoads,
  THRUST,
  TORQUE,
} from './rotor.ts';
import { ATTITUDE, CHARGE, INFLOW, POSITION, RATES, ROTOR_SPEED, VELOCITY } from './state.ts';

/** Speed below which bearing friction fades to zero, rad/s, so that a motor comes to rest. */
const FRICTION_KNEE_RADPS = 5;
/** Time in which a struck rotor is taken to stand still. */
const STRUCK_STOP_S = 0.01;

export class FlightDynamics {
  /** Share of the battery voltage on each motor, 0…1, held over the step; FL, FR, RL, RR. */
  readonly duty = new Float64Array(4);
  /** 1 where a propeller struck something: its motor is off and it stops. */
  readonly stopped = new Uint8Array(4);
  /** Faults: share of healthy thrust and of healthy motor torque per rotor. */
  readonly thrustShare = new Float64Array([1, 1, 1, 1]);
  readonly torqueShare = new Float64Array([1, 1, 1, 1]);
  /** Air velocity, world axes, m/s, held over the step. */
  windNorth_mps = 0;
  windEast_mps = 0;
  windDown_mps = 0;
  /** Turbulent rotation of the air, body axes, rad/s. */
  gustP_radps = 0;
  gustQ_radps = 0;
  gustR_radps = 0;
  density_kgpm3: number;
  /** Rest voltage of the pack at its charge, V, held over the step. */
  openVoltage_V = 0;
  /** Down coordinate of the ground below, m; Infinity switches ground effect off. */
  groundDown_m = 0;

  /** Results of the last call: rotor loads (4 × LOADS_SIZE). */
  readonly loads = new Float64Array(4 * LOADS_SIZE);
  readonly motorCurrent_A = new Float64Array(4);
  batteryVoltage_V = 0;
  batteryCurrent_A = 0;
  /** Acceleration of the centre of mass, world axes, gravity included, m/s². */
  readonly acceleration_mps2 = new Float64Array(3);
  readonly angularAcceleration_radps2 = new Float64Array(3);
  /** What an accelerometer at the centre of mass feels, body axes, m/s². */
  readonly specificForce_mps2 = new Float64Array(3);

  constructor(
    public craft: Craft,
    density_kgpm3: number,
  ) {
    this.density_kgpm3 = density_kgpm3;
  }

  /** dS/dt of the state `s` into `d`; also refreshes the result fields. */
  derivative(s: Float64Array, d: Float64Array): void {
    const craft = this.craft;
    const rho = this.density_kgpm3;

    // Attitude: rotation matrix, body to world.
    const qw = s[ATTITUDE];
    const qx = s[ATTITUDE + 1];
    const qy = s[ATTITUDE + 2];
    const qz = s[ATTITUDE + 3];
    // The quaternion's length is divided out here: RK4's inner stages leave the unit sphere by O(h²).
    const unit = 2 / (qw * qw + qx * qx + qy * qy + qz * qz);
    const r00 = 1 - unit * (qy * qy + qz * qz);
    const r01 = unit * (qx * qy - qw * qz);
    const r02 = unit * (qx * qz + qw * qy);
    const r10 = unit * (qx * qy + qw * qz);
    const r11 = 1 - unit * (qx * qx + qz * qz);
    const r12 = unit * (qy * qz - qw * qx);
    const r20 = unit * (qx * qz - qw * qy);
    const r21 = unit * (qy * qz + qw * qx);
    const r22 = 1 - unit * (qx * qx + qy * qy);
    const p = s[RATES];
    const q = s[RATES + 1];
    const r = s[RATES + 2];

    // Airspeed of the centre of mass, body axes.
    const an = s[VELOCITY] - this.windNorth_mps;
    const ae = s[VELOCITY + 1] - this.windEast_mps;
    const ad = s[VELOCITY + 2] - this.windDown_mps;
    const u = r00 * an + r10 * ae + r20 * ad;
    const v = r01 * an + r11 * ae + r21 * ad;
    const w = r02 * an + r12 * ae + r22 * ad;
    const pa = p - this.gustP_radps;
    const qa = q - this.gustQ_radps;
    const ra = r - this.gustR_radps;

    this.solveBattery(s);
    d[CHARGE] = -this.batteryCurrent_A / craft.capacity_C;

    // Motors and rotors.
    const position = craft.rotorPosition_m;
    let fx = 0;
    let fy = 0;
    let fz = 0;
    let mx = 0;
    let my = 0;
    let mz = 0;
    let spinMomentum = 0;
    const loads = this.loads;
    for (let i = 0; i < 4; i++) {
      const x = position[3 * i];
      const y = position[3 * i + 1];
      const z = position[3 * i + 2];
      const speed = s[ROTOR_SPEED + i];
      const at = i * LOADS_SIZE;
      const height = this.groundDown_m - (s[POSITION + 2] + r20 * x + r21 * y + r22 * z);
      const ground = r22 > 0.5 ? groundEffect(craft.rotor.radius_m, height) : 1;
      rotorLoads(
        craft.rotor,
        rho,
        speed,
        s[INFLOW + i],
        u + qa * z - ra * y,
        v + ra * x - pa * z,
        w + pa * y - qa * x,
        craft.spin[i],
        ground,
        this.thrustShare[i],
        loads,
        at,
      );
      const spinUp = this.rotorAcceleration(i, speed, loads[at + TORQUE]);
      d[ROTOR_SPEED + i] = spinUp;
      d[INFLOW + i] = loads[at + INFLOW_RATE];
      const inertia = craft.rotor.inertia_kgm2;
      spinMomentum += craft.spin[i] * inertia * speed;
      const bx = loads[at + FORCE_X];
      const by = loads[at + FORCE_Y];
      const bz = -loads[at + THRUST];
      fx += bx;
      fy += by;
      fz += bz;
      mx += y * bz - z * by + loads[at + MOMENT_X];
      my += z * bx - x * bz + loads[at + MOMENT_Y];
      // The stator gives the rotor J_r dΩ/dt + Q and feels the opposite.
      mz += x * by - y * bx - craft.spin[i] * (inertia * spinUp + loads[at + TORQUE]);
    }

    // Body drag, quadratic per axis.
    const area = craft.dragArea_m2;
    fx -= 0.5 * rho * area[0] * Math.abs(u) * u;
    fy -= 0.5 * rho * area[1] * Math.abs(v) * v;
    fz -= 0.5 * rho * area[2] * Math.abs(w) * w;

    // Linear motion.
    const perMass = 1 / craft.mass_kg;
    const sx = fx * perMass;
    const sy = fy * perMass;
    const sz = fz * perMass;
    const dvn = r00 * sx + r01 * sy + r02 * sz;
    const dve = r10 * sx + r11 * sy + r12 * sz;
    const dvd = r20 * sx + r21 * sy + r22 * sz + GRAVITY_MPS2;
    d[POSITION] = s[VELOCITY];
    d[POSITION + 1] = s[VELOCITY + 1];
    d[POSITION + 2] = s[VELOCITY + 2];
    d[VELOCITY] = dvn;
    d[VELOCITY + 1] = dve;
    d[VELOCITY + 2] = dvd;

    // Angular motion, full tensor and rotor gyroscopics.
    const I = craft.inertia;
    const hx = I[0] * p + I[1] * q + I[2] * r;
    const hy = I[3] * p + I[4] * q + I[5] * r;
    const hz = I[6] * p + I[7] * q + I[8] * r + spinMomentum;
    const tx = mx - (q * hz - r * hy);
    const ty = my - (r * hx - p * hz);
    const tz = mz - (p * hy - q * hx);
    const inv = craft.inertiaInverse;
    const dp = inv[0] * tx + inv[1] * ty + inv[2] * tz;
    const dq = inv[3] * tx + inv[4] * ty + inv[5] * tz;
    const dr = inv[6] * tx + inv[7] * ty + inv[8] * tz;
    d[RATES] = dp;
    d[RATES + 1] = dq;
    d[RATES + 2] = dr;
    d[ATTITUDE] = 0.5 * (-qx * p - qy * q - qz * r);
    d[ATTITUDE + 1] = 0.5 * (qw * p + qy * r - qz * q);
    d[ATTITUDE + 2] = 0.5 * (qw * q + qz * p - qx * r);
    d[ATTITUDE + 3] = 0.5 * (qw * r + qx * q - qy * p);

    this.specificForce_mps2[0] = sx;
    this.specificForce_mps2[1] = sy;
    this.specificForce_mps2[2] = sz;
    this.acceleration_mps2[0] = dvn;
    this.acceleration_mps2[1] = dve;
    this.acceleration_mps2[2] = dvd;
    this.angularAcceleration_radps2[0] = dp;
    this.angularAcceleration_radps2[1] = dq;
    this.angularAcceleration_radps2[2] = dr;
  }

  /**
   * Pack voltage and motor currents that agree: V = E − R_b Σ u_i i_i with i_i = (u_i V − K Ω_i)/R. Linear in
   * V; without braking a motor that would generate is left out and the rest solved again.
   */
  private solveBattery(s: Float64Array): void {
    const { craft, duty, motorCurrent_A } = this;
    const motor = craft.motor;
    if (!motor.electric) {
      this.solveLaggedBattery(s);
      return;
    }
    const perOhm = 1 / motor.resistance_ohm;
    const Rb = craft.batteryResistance_ohm;
    let active = 15;
    let voltage = 0;
    for (let pass = 0; pass < 4; pass++) {
      let square = 0;
      let back = 0;
      for (let i = 0; i < 4; i++) {
        if ((active & (1 << i)) === 0 || this.stopped[i] !== 0) continue;
        const emf = motor.torqueConstant * this.torqueShare[i] * s[ROTOR_SPEED + i];
        square += duty[i] * duty[i];
        back += duty[i] * emf;
      }
      voltage = (this.openVoltage_V + Rb * back * perOhm) / (1 + Rb * square * perOhm);
      if (craft.braking) break;
      let changed = false;
      for (let i = 0; i < 4; i++) {
        const emf = motor.torqueConstant * this.torqueShare[i] * s[ROTOR_SPEED + i];
        if ((active & (1 << i)) !== 0 && duty[i] * voltage < emf) {
          active &= ~(1 << i);
          changed = true;
        }
      }
      if (!changed) break;
    }
    let total = 0;
    for (let i = 0; i < 4; i++) {
      if ((active & (1 << i)) === 0 || this.stopped[i] !== 0) {
        motorCurrent_A[i] = 0;
        continue;
      }
      const emf = motor.torqueConstant * this.torqueShare[i] * s[ROTOR_SPEED + i];
      const current = (duty[i] * voltage - emf) * perOhm;
      motorCurrent_A[i] = current;
      total += duty[i] * current;
    }
    this.batteryVoltage_V = voltage;
    this.batteryCurrent_A = total;
  }

  /** A lagged motor's current from its shaft power at a typical efficiency. */
  private solveLaggedBattery(s: Float64Array): void {
    let power_W = 0;
    for (let i = 0; i < 4; i++) {
      const shaft_W = Math.max(0, this.loads[i * LOADS_SIZE + TORQUE] * s[ROTOR_SPEED + i]);
      const electric_W = shaft_W / LAGGED_MOTOR_EFFICIENCY;
      this.motorCurrent_A[i] = this.openVoltage_V > 0 ? electric_W / this.openVoltage_V : 0;
      power_W += electric_W;
    }
    this.batteryCurrent_A = this.openVoltage_V > 0 ? power_W / this.openVoltage_V : 0;
    this.batteryVoltage_V = this.openVoltage_V - this.craft.batteryResistance_ohm * this.batteryCurrent_A;
  }

  /** dΩ/dt, rad/s². */
  private rotorAcceleration(i: number, speed: number, torque: number): number {
    const { craft } = this;
    const motor = craft.motor;
    if (this.stopped[i] !== 0) return -speed / STRUCK_STOP_S;
    if (motor.electric) {
      const friction =
        motor.noLoadCurrent_A * Math.max(-1, Math.min(1, speed / FRICTION_KNEE_RADPS));
      const K = motor.torqueConstant * this.torqueShare[i];
      return (K * (this.motorCurrent_A[i] - friction) - torque) / craft.rotor.inertia_kgm2;
    }
    const target = this.duty[i] * motor.maxSpeed_radps * this.torqueShare[i] * this.laggedVoltageShare();
    return (target - speed) / (target > speed ? motor.lagUp_s : motor.lagDown_s);
  }

  /** A lagged motor's speed follows the pack: its top speed was measured on a full one. */
  private laggedVoltageShare(): number {
    return this.batteryVoltage_V / (this.craft.cells * 4.2);
  }
}
