/**
 * The equations of motion: rate of change of the whole flight state for commands and air that hold over the
 * step. Passes in the order of the physics: attitude → airspeed → battery → motors and rotors → body drag →
 * linear and angular acceleration. Nothing is allocated.
 *
 * m v̇ = m g + R F;  I ω̇ + ω × (I ω + h) = τ, with h = Σ s J_r Ω about body z and the motors' reaction in τ.
 */
import { openCircuitVoltage_V } from '../craft/cell.ts';
import { LAGGED_MOTOR_EFFICIENCY, type Craft } from '../craft/compile.ts';
import { GRAVITY_MPS2 } from '../math/angles.ts';
import {
  FLOW_DENSITY,
  FLOW_DOWN_X,
  FLOW_DOWN_Y,
  FLOW_DOWN_Z,
  FLOW_HEIGHT,
  FLOW_P,
  FLOW_Q,
  FLOW_R,
  FLOW_U,
  FLOW_V,
  FLOW_W,
  RotorSet,
  WRENCH_FX,
  WRENCH_FY,
  WRENCH_FZ,
  WRENCH_MX,
  WRENCH_MY,
  WRENCH_MZ,
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
  /** Faults: share of healthy motor torque per rotor. */
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
  /** Faults: voltage that dead cells no longer give. */
  missingVoltage_V = 0;
  /** Down coordinate of the ground below, m; Infinity switches ground effect off. */
  groundDown_m = 0;


  /** The rotors, with their faults and the loads of the last call. */
  readonly rotors = new RotorSet();
  readonly motorCurrent_A = new Float64Array(4);
  batteryVoltage_V = 0;
  batteryCurrent_A = 0;
  private readonly emf_V = new Float64Array(4);

  constructor(
    public craft: Craft,
    density_kgpm3: number,
  ) {
    this.density_kgpm3 = density_kgpm3;
  }

  /**
   * Takes what holds over a step from the state: the pack's rest voltage and the rotors' static coefficients.
   * Call it before each step, or before each `derivative` when that is differentiated.
   */
  prepare(s: Float64Array): void {
    const { craft } = this;
    this.openVoltage_V = craft.cells * openCircuitVoltage_V(s[CHARGE]) - this.missingVoltage_V;
    this.rotors.hold(craft.rotor, s);
  }

  /** dS/dt of the state `s` into `d`; the rotors' loads and the battery's fields are those of this call. */
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
    const rotors = this.rotors;
    const flow = rotors.flow;
    flow[FLOW_U] = u;
    flow[FLOW_V] = v;
    flow[FLOW_W] = w;
    flow[FLOW_P] = p - this.gustP_radps;
    flow[FLOW_Q] = q - this.gustQ_radps;
    flow[FLOW_R] = r - this.gustR_radps;
    flow[FLOW_DENSITY] = rho;
    flow[FLOW_HEIGHT] = this.groundDown_m - s[POSITION + 2];
    flow[FLOW_DOWN_X] = r20;
    flow[FLOW_DOWN_Y] = r21;
    flow[FLOW_DOWN_Z] = r22;

    // Battery, rotors, motors.
    this.solveBattery(s);
    d[CHARGE] = -this.batteryCurrent_A / craft.capacity_C;
    rotors.loads(craft.rotor, craft.rotorPosition_m, craft.spin, s);
    const wrench = rotors.wrench;
    let fx = wrench[WRENCH_FX];
    let fy = wrench[WRENCH_FY];
    let fz = wrench[WRENCH_FZ];
    const mx = wrench[WRENCH_MX];
    const my = wrench[WRENCH_MY];
    let mz = wrench[WRENCH_MZ];
    let spinMomentum = 0;
    const rotorInertia = craft.rotor.inertia_kgm2;
    for (let i = 0; i < 4; i++) {
      const speed = s[ROTOR_SPEED + i];
      const torque = rotors.torque_Nm[i];
      const spinUp = this.rotorAcceleration(i, speed, torque);
      d[ROTOR_SPEED + i] = spinUp;
      d[INFLOW + i] = rotors.inflowRate_mps2[i];
      spinMomentum += craft.spin[i] * rotorInertia * speed;
      // The stator gives the rotor J_r dΩ/dt + Q and feels the opposite.
      mz -= craft.spin[i] * (rotorInertia * spinUp + torque);
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
    const emf = this.emf_V;
    let square = 0;
    let back = 0;
    let off = 0;
    for (let i = 0; i < 4; i++) {
      const own = motor.torqueConstant * this.torqueShare[i] * s[ROTOR_SPEED + i];
      const u = duty[i];
      emf[i] = own;
      square += u * u;
      back += u * own;
      off |= this.stopped[i] << i;
    }
    const Rb = craft.batteryResistance_ohm;
    const perOhm = 1 / motor.resistance_ohm;
    let voltage = (this.openVoltage_V + Rb * back * perOhm) / (1 + Rb * square * perOhm);
    if (off !== 0 || !craft.braking) {
      off = this.switchedOff(off, voltage);
      voltage = this.voltageWithout(off);
    }
    let total = 0;
    for (let i = 0; i < 4; i++) {
      const current = (off & (1 << i)) !== 0 ? 0 : (duty[i] * voltage - emf[i]) * perOhm;
      motorCurrent_A[i] = current;
      total += duty[i] * current;
    }
    this.batteryVoltage_V = voltage;
    this.batteryCurrent_A = total;
  }

  /** Pack voltage with the motors in the bit set `off` drawing nothing. */
  private voltageWithout(off: number): number {
    const { craft, duty, emf_V } = this;
    let square = 0;
    let back = 0;
    for (let i = 0; i < 4; i++) {
      if ((off & (1 << i)) !== 0) continue;
      square += duty[i] * duty[i];
      back += duty[i] * emf_V[i];
    }
    const share = craft.batteryResistance_ohm / craft.motor.resistance_ohm;
    return (this.openVoltage_V + share * back) / (1 + share * square);
  }

  /** Adds to `off` the motors that would generate, unless the ESC brakes; at most four more passes. */
  private switchedOff(off: number, voltage: number): number {
    if (this.craft.braking) return off;
    let set = off;
    let volts = voltage;
    for (let pass = 0; pass < 4; pass++) {
      const before = set;
      for (let i = 0; i < 4; i++) if (this.duty[i] * volts < this.emf_V[i]) set |= 1 << i;
      if (set === before) break;
      volts = this.voltageWithout(set);
    }
    return set;
  }

  /** A lagged motor's current from its shaft power at a typical efficiency. */
  private solveLaggedBattery(s: Float64Array): void {
    let power_W = 0;
    for (let i = 0; i < 4; i++) {
      const shaft_W = Math.max(0, this.rotors.torque_Nm[i] * s[ROTOR_SPEED + i]);
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
