/**
 * The equations of motion: rate of change of the whole flight state for commands and air that hold over the
 * step. Passes in the order of the physics: attitude → air → battery → rotors → motors → body drag → rigid
 * body. Nothing is allocated.
 */
import { openCircuitVoltage_V } from '../craft/cell.ts';
import { LAGGED_MOTOR_EFFICIENCY, type Craft } from '../craft/compile.ts';
import {
  FORCE_X,
  FORCE_Y,
  FORCE_Z,
  rigidBodyRates,
  rotationOf,
  SPIN_MOMENTUM,
  TORQUE_Z,
} from './rigidBody.ts';
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
} from './rotor.ts';
import { CHARGE, INFLOW, POSITION, RATES, ROTOR_SPEED, VELOCITY } from './state.ts';

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
  /** Faults: cells that give no voltage. */
  deadCells = 0;
  /** Down coordinate of the ground below, m; Infinity switches ground effect off. */
  groundDown_m = 0;

  /** The rotors, with their faults and the loads of the last call. */
  readonly rotors = new RotorSet();
  readonly motorCurrent_A = new Float64Array(4);
  batteryVoltage_V = 0;
  batteryCurrent_A = 0;
  private readonly rotation = new Float64Array(9);
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
    this.openVoltage_V = (craft.cells - this.deadCells) * openCircuitVoltage_V(s[CHARGE]);
    this.rotors.hold(craft.rotor, s);
  }

  /** dS/dt of the state `s` into `d`; the rotors' loads and the battery's fields are those of this call. */
  derivative(s: Float64Array, d: Float64Array): void {
    const { craft, rotors, rotation } = this;
    rotationOf(s, rotation);
    this.meetAir(s);
    this.solveBattery(s);
    d[CHARGE] = -this.batteryCurrent_A / craft.capacity_C;
    rotors.loads(craft.rotor, craft.rotorPosition_m, craft.spin, s);
    this.turnRotors(s, d);
    this.dragBody();
    rigidBodyRates(craft, s, rotation, rotors.wrench, d);
  }

  /** Velocity and rates against the air, body axes, and the height over ground, into the rotors' flow. */
  private meetAir(s: Float64Array): void {
    const r = this.rotation;
    const flow = this.rotors.flow;
    const north = s[VELOCITY] - this.windNorth_mps;
    const east = s[VELOCITY + 1] - this.windEast_mps;
    const down = s[VELOCITY + 2] - this.windDown_mps;
    flow[FLOW_U] = r[0] * north + r[3] * east + r[6] * down;
    flow[FLOW_V] = r[1] * north + r[4] * east + r[7] * down;
    flow[FLOW_W] = r[2] * north + r[5] * east + r[8] * down;
    flow[FLOW_P] = s[RATES] - this.gustP_radps;
    flow[FLOW_Q] = s[RATES + 1] - this.gustQ_radps;
    flow[FLOW_R] = s[RATES + 2] - this.gustR_radps;
    flow[FLOW_DENSITY] = this.density_kgpm3;
    flow[FLOW_HEIGHT] = this.groundDown_m - s[POSITION + 2];
    flow[FLOW_DOWN_X] = r[6];
    flow[FLOW_DOWN_Y] = r[7];
    flow[FLOW_DOWN_Z] = r[8];
  }

  /** Rotor accelerations and inflow rates into `d`; the motors' reaction and momentum into the wrench. */
  private turnRotors(s: Float64Array, d: Float64Array): void {
    const { craft, rotors } = this;
    const { torque_Nm, inflowRate_mps2, wrench } = rotors;
    const inertia = craft.rotor.inertia_kgm2;
    const spin = craft.spin;
    let reaction = 0;
    let momentum = 0;
    for (let i = 0; i < 4; i++) {
      const speed = s[ROTOR_SPEED + i];
      const torque = torque_Nm[i];
      const acceleration = this.rotorAcceleration(i, speed, torque);
      d[ROTOR_SPEED + i] = acceleration;
      d[INFLOW + i] = inflowRate_mps2[i];
      momentum += spin[i] * inertia * speed;
      // The stator gives the rotor J_r dΩ/dt + Q and feels the opposite.
      reaction -= spin[i] * (inertia * acceleration + torque);
    }
    wrench[TORQUE_Z] += reaction;
    wrench[SPIN_MOMENTUM] = momentum;
  }

  /** Body drag, quadratic per axis, onto the wrench. */
  private dragBody(): void {
    const { flow, wrench } = this.rotors;
    const area = this.craft.dragArea_m2;
    const half = 0.5 * this.density_kgpm3;
    const u = flow[FLOW_U];
    const v = flow[FLOW_V];
    const w = flow[FLOW_W];
    wrench[FORCE_X] -= half * area[0] * Math.abs(u) * u;
    wrench[FORCE_Y] -= half * area[1] * Math.abs(v) * v;
    wrench[FORCE_Z] -= half * area[2] * Math.abs(w) * w;
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
      const friction = motor.noLoadCurrent_A * Math.max(-1, Math.min(1, speed / FRICTION_KNEE_RADPS));
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
