/**
 * One flight: the fixed tick that joins everything below it. `flight` owns the only mutable state; the craft
 * is constant. A tick is one control period: sense, control, send commands, then the integration steps up to
 * the next tick, each of them wind → command in effect → equations of motion → contact → sensors.
 */
import { compileCraft, type Craft } from '../craft/compile.ts';
import type { Build } from '../craft/build.ts';
import type { Gains } from '../craft/gains.ts';
import { withoutPayload, withShiftedCentre } from '../craft/payload.ts';
import { OPEN_FIELD, type Scene } from '../craft/scene.ts';
import type { Wind } from '../craft/wind.ts';
import { applyFaults, type Fault, type FaultEffects } from '../disturbance/faults.ts';
import { WindField } from '../disturbance/windField.ts';
import { DEG_PER_RAD, GRAVITY_MPS2, RAD_PER_DEG, RPM_PER_RAD_PER_S } from '../math/angles.ts';
import { RungeKutta4 } from '../math/integration.ts';
import { headingOf, quaternionFromEuler, rotateToWorld } from '../math/quaternion.ts';
import { RandomStream } from '../math/random.ts';
import { SnapshotReader, SnapshotWriter } from '../math/snapshot.ts';
import { siteAir } from '../physics/atmosphere.ts';
import { ContactWorld } from '../physics/contact.ts';
import { FlightDynamics } from '../physics/dynamics.ts';
import {
  ATTITUDE,
  CHARGE,
  POSITION,
  RATES,
  ROTOR_SPEED,
  STATE_NAMES,
  STATE_SIZE,
  VELOCITY,
} from '../physics/state.ts';
import { findTrim, HOVER, type Trim } from '../physics/trim.ts';
import { Accelerometer } from '../sensing/accelerometer.ts';
import { Gyro } from '../sensing/gyro.ts';
import { CommandQueue } from './commandQueue.ts';
import { Pilot, type Sticks } from './pilot.ts';
import { SIGNAL_NAMES } from './signals.ts';

/** Longest integration step, s; the step is the largest exact divisor of the tick that is no longer. */
const LONGEST_STEP_S = 0.0005;
const AMBIENT_FALLBACK_K = 288.15;
/** Beyond these the simulation is said to have diverged. */
const LARGEST_RATE_RADPS = 1000;
const LARGEST_SPEED_MPS = 500;

/** Where and how a flight begins. */
export type Start =
  | { readonly kind: 'ground' }
  | { readonly kind: 'hover'; readonly height_m: number }
  | {
      readonly kind: 'free-air';
      readonly height_m: number;
      readonly roll_deg?: number;
      readonly pitch_deg?: number;
    };

export interface FlightSetup {
  readonly build: Build;
  readonly gains: Gains;
  readonly wind: Wind;
  readonly scene?: Scene;
  readonly seed: number;
  readonly faults?: readonly Fault[];
  readonly start?: Start;
}

/** Why a flight ended by itself. */
export interface Stopped {
  readonly tick: number;
  readonly time_s: number;
  readonly reason: 'diverged';
  /** The state that failed: its name and value. */
  readonly what: string;
}

export class Flight {
  readonly state = new Float64Array(STATE_SIZE);
  /** The last tick's row, in the order of SIGNAL_NAMES. */
  readonly signals = new Float64Array(SIGNAL_NAMES.length);
  readonly scene: Scene;
  readonly tick_s: number;
  readonly step_s: number;
  /** Hover in still air on a full pack at this site: what trims and the assists start from. */
  readonly trim: Trim;
  tickIndex = 0;
  stopped: Stopped | null = null;

  private currentCraft: Craft;
  private currentGains: Gains;
  private currentWind: Wind;
  private readonly stepsPerTick: number;
  private readonly dynamics: FlightDynamics;
  private readonly integrator = new RungeKutta4(STATE_SIZE);
  private readonly rate = new Float64Array(STATE_SIZE);
  private readonly gyro: Gyro;
  private readonly accelerometer: Accelerometer;
  private readonly pilot: Pilot;
  private readonly queue = new CommandQueue();
  private readonly windField: WindField;
  private contact: ContactWorld;
  private readonly phase_rad = new Float64Array(4);
  private readonly heat_W = new Float64Array(4);
  private readonly winding_K = new Float64Array(4);
  private readonly struck = new Uint8Array(4);
  private readonly before = new Float64Array(13);
  private readonly specificForce_mps2 = new Float64Array(3);
  private readonly delayStream: RandomStream;
  private effects: FaultEffects;
  private faultList: readonly Fault[];
  private vibrationSetting = 1;
  private touching = false;
  private lastSend_s = 0;
  private dropped = false;
  private readonly ambient_K: number;

  constructor(setup: FlightSetup) {
    this.scene = setup.scene ?? OPEN_FIELD;
    this.currentGains = setup.gains;
    this.currentWind = setup.wind;
    this.tick_s = 1 / setup.gains.loop_Hz;
    this.stepsPerTick = Math.ceil(this.tick_s / LONGEST_STEP_S - 1e-9);
    this.step_s = this.tick_s / this.stepsPerTick;
    this.faultList = setup.faults ?? [];
    this.effects = applyFaults(this.faultList);
    const sound = compileCraft(setup.build);
    this.currentCraft = compileCraft(withShiftedCentre(setup.build, this.effects.comShift_m));
    const air = siteAir(this.scene);
    this.ambient_K = air.temperature_K ?? AMBIENT_FALLBACK_K;
    this.trim = findTrim(sound, { ...HOVER, density_kgpm3: air.density_kgpm3 });
    const hoverSpeed = this.trim.state[ROTOR_SPEED];
    this.dynamics = new FlightDynamics(this.currentCraft, air.density_kgpm3);
    this.gyro = new Gyro(this.currentCraft, this.step_s, this.tick_s, hoverSpeed, setup.seed);
    this.accelerometer = new Accelerometer(this.currentCraft, this.step_s, this.tick_s, setup.seed);
    this.delayStream = new RandomStream(setup.seed, 'loop.jitter');
    this.windField = new WindField({
      wind: setup.wind,
      scene: this.scene,
      step_s: this.step_s,
      seed: setup.seed,
      span_m: this.currentCraft.span_m,
    });
    this.contact = this.newContact();
    // The controller knows the craft as built, not its faults.
    this.pilot = new Pilot(sound, setup.gains, this.trim.duty[0]);
    this.applyEffects();
    this.begin(setup.start ?? { kind: 'ground' });
  }

  get time_s(): number {
    return this.tickIndex * this.tick_s;
  }

  get craft(): Craft {
    return this.currentCraft;
  }

  get gains(): Gains {
    return this.currentGains;
  }

  get wind(): Wind {
    return this.currentWind;
  }

  get faults(): readonly Fault[] {
    return this.faultList;
  }

  /** One control period. Does nothing once the flight has stopped. */
  tick(sticks: Sticks): void {
    if (this.stopped !== null) return;
    const time_s = this.time_s;
    this.sense();
    const missed =
      this.effects.missedTickShare > 0 && this.delayStream.uniform() < this.effects.missedTickShare;
    if (!missed) {
      this.pilot.tick(sticks, this.gyro.sample_dps, this.accelerometer.sample_mps2, this.state, this.tick_s);
      this.send(time_s);
    }
    this.observe(time_s, sticks);
    for (let k = 0; k < this.stepsPerTick; k++) this.step(time_s + k * this.step_s);
    this.heatWindings();
    this.tickIndex++;
    this.checkSane();
  }

  // --- Changes in flight -------------------------------------------------------------------------------

  /** New gains from the next tick on. @throws RangeError when the loop rate differs: that needs a new flight. */
  setGains(gains: Gains): void {
    if (gains.loop_Hz !== this.currentGains.loop_Hz) {
      throw new RangeError(
        `loop_Hz ${gains.loop_Hz} differs from the flight's ${this.currentGains.loop_Hz}; start a new flight`,
      );
    }
    this.currentGains = gains;
    this.pilot.setGains(gains);
  }

  setWind(wind: Wind): void {
    this.currentWind = wind;
    this.windField.setWind(wind);
  }

  /** Gyro noise and vibration over the build's own; 1 = as built. */
  setNoise(noiseScale: number, vibrationScale: number): void {
    this.vibrationSetting = vibrationScale;
    this.gyro.noiseScale = noiseScale;
    this.accelerometer.noiseScale = noiseScale;
    this.gyro.vibrationScale = vibrationScale * this.effects.vibrationScale;
  }

  /** Faults from now on (a shifted centre of mass acts at once). */
  setFaults(faults: readonly Fault[]): void {
    const old = this.effects;
    this.faultList = faults;
    this.effects = applyFaults(faults);
    const shift = this.effects.comShift_m.map((value, axis) => value - old.comShift_m[axis]);
    if (shift.some((value) => value !== 0)) {
      this.changeCraft(withShiftedCentre(this.currentCraft.build, shift));
    }
    this.applyEffects();
  }

  /** Lets the payload go, if there is one. */
  dropPayload(): void {
    if (this.currentCraft.build.payload === undefined) return;
    this.dropped = true;
    this.changeCraft(withoutPayload(this.currentCraft.build));
  }

  get payloadDropped(): boolean {
    return this.dropped;
  }

  /** Goes on where `other` is: place, motion, rotors, battery and winding heat; sensors start settled. */
  takeOver(other: Flight): void {
    if (other.dropped && !this.dropped) this.dropPayload();
    this.state.set(other.state);
    this.winding_K.set(other.winding_K);
    for (let i = 0; i < 4; i++) this.struck[i] = this.dynamics.stopped[i] = other.struck[i];
    this.queue.force(other.queue.active_us);
    this.pilot.command_us.set(other.pilot.command_us);
    this.resetSensors();
  }

  /** Puts the craft upright where it is, at rest, a little over what it lies on. */
  setUpright(): void {
    const s = this.state;
    const yaw = headingOf(s, ATTITUDE);
    s.set(quaternionFromEuler(0, 0, yaw), ATTITUDE);
    s.fill(0, VELOCITY, VELOCITY + 3);
    s.fill(0, RATES, RATES + 3);
    s.fill(0, ROTOR_SPEED, ROTOR_SPEED + 4);
    s[POSITION + 2] -= this.currentCraft.span_m / 2;
    this.struck.fill(0);
    this.dynamics.stopped.fill(0);
    this.queue.force(new Float64Array(4).fill(this.currentCraft.escMin_us));
    this.resetSensors();
  }

  // --- Passes of a tick ---------------------------------------------------------------------------------

  private sense(): void {
    this.gyro.sample(this.phase_rad, this.state, ROTOR_SPEED);
    this.accelerometer.sample();
  }

  /** Sends the pilot's commands on their way: compute delay, faults, ESC frames. */
  private send(time_s: number): void {
    const { craft, effects } = this;
    let at_s = time_s + this.currentGains.computeDelay_s + effects.extraDelay_s;
    if (effects.jitter_s > 0) at_s += effects.jitter_s * this.delayStream.uniform();
    if (craft.escUpdate_Hz < this.currentGains.loop_Hz * 0.999) {
      at_s = Math.ceil(at_s * craft.escUpdate_Hz - 1e-6) / craft.escUpdate_Hz;
    }
    // A jittered command cannot overtake the one before it.
    this.lastSend_s = Math.max(this.lastSend_s, at_s);
    this.queue.push(this.lastSend_s, this.pilot.command_us);
  }

  /** One integration step that begins at `time_s`. */
  private step(time_s: number): void {
    const { state: s, dynamics, windField, step_s } = this;
    windField.advance(time_s, s);
    const air = windField.sample;
    dynamics.windNorth_mps = air.north_mps;
    dynamics.windEast_mps = air.east_mps;
    dynamics.windDown_mps = air.down_mps;
    dynamics.gustP_radps = air.p_radps;
    dynamics.gustQ_radps = air.q_radps;
    dynamics.gustR_radps = air.r_radps;

    this.queue.advance(time_s, step_s);
    const { escMin_us, escMax_us } = this.currentCraft;
    const perSpan = 1 / (escMax_us - escMin_us);
    for (let i = 0; i < 4; i++) {
      dynamics.duty[i] = Math.max(0, Math.min(1, (this.queue.mean_us[i] - escMin_us) * perSpan));
    }

    for (let i = 0; i < 13; i++) this.before[i] = s[i];
    dynamics.prepare(s);
    const near = this.contact.near(s);
    if (near) dynamics.derivative(s, this.rate);
    this.integrator.step(dynamics, s, step_s);
    normalise(s);
    this.touching = false;
    if (near) this.resolveContact();

    this.feel();
    for (let i = 0; i < 4; i++) {
      const turned = this.phase_rad[i] + s[ROTOR_SPEED + i] * step_s;
      this.phase_rad[i] = turned > 2 * Math.PI ? turned - 2 * Math.PI : turned;
    }
    this.gyro.advance(s, RATES);
    this.accelerometer.advance(this.specificForce_mps2);
  }

  /**
   * Near something solid the body's motion over this step is handed to the contact world, from the state
   * before the step and the free accelerations there; the rotors keep what the integrator gave them.
   */
  private resolveContact(): void {
    const { state: s, before, rate, contact } = this;
    const linear = this.linear;
    const angular = this.angular;
    for (let i = 0; i < 3; i++) {
      linear[i] = rate[VELOCITY + i];
      angular[i] = rate[RATES + i];
    }
    const free = this.free;
    for (let i = 0; i < 13; i++) {
      free[i] = s[i];
      s[i] = before[i];
    }
    this.touching = contact.step(s, this.step_s, linear, angular);
    if (!this.touching) {
      for (let i = 0; i < 13; i++) s[i] = free[i];
      return;
    }
    for (let i = 0; i < 4; i++) {
      if (contact.struck[i] !== 0 && this.dynamics.duty[i] > 0) {
        this.struck[i] = 1;
        this.dynamics.stopped[i] = 1;
      }
    }
  }
  private readonly linear = new Float64Array(3);
  private readonly angular = new Float64Array(3);
  private readonly free = new Float64Array(13);

  /** Specific force over the step, body axes, from the change of velocity: contact is felt as well. */
  private feel(): void {
    const { state: s, before } = this;
    const per = 1 / this.step_s;
    const an = (s[VELOCITY] - before[VELOCITY]) * per;
    const ae = (s[VELOCITY + 1] - before[VELOCITY + 1]) * per;
    const ad = (s[VELOCITY + 2] - before[VELOCITY + 2]) * per - GRAVITY_MPS2;
    const w = s[ATTITUDE];
    const x = s[ATTITUDE + 1];
    const y = s[ATTITUDE + 2];
    const z = s[ATTITUDE + 3];
    const out = this.specificForce_mps2;
    out[0] = (1 - 2 * (y * y + z * z)) * an + 2 * (x * y + w * z) * ae + 2 * (x * z - w * y) * ad;
    out[1] = 2 * (x * y - w * z) * an + (1 - 2 * (x * x + z * z)) * ae + 2 * (y * z + w * x) * ad;
    out[2] = 2 * (x * z + w * y) * an + 2 * (y * z - w * x) * ae + (1 - 2 * (x * x + y * y)) * ad;
  }

  /** Winding heat i²R and a first-order thermal estimate, once a tick. */
  private heatWindings(): void {
    const { motor } = this.currentCraft;
    for (let i = 0; i < 4; i++) {
      const current = this.dynamics.motorCurrent_A[i];
      const heat = motor.electric ? current * current * motor.resistance_ohm : 0;
      this.heat_W[i] = heat;
      const lost = (this.winding_K[i] - this.ambient_K) / motor.thermalResistance_K_per_W;
      this.winding_K[i] += ((heat - lost) * this.tick_s) / motor.heatCapacity_J_per_K;
    }
  }

  private checkSane(): void {
    const s = this.state;
    for (let i = 0; i < STATE_SIZE; i++) {
      const value = s[i];
      const tooLarge =
        (i >= RATES && i < RATES + 3 && Math.abs(value) > LARGEST_RATE_RADPS) ||
        (i >= VELOCITY && i < VELOCITY + 3 && Math.abs(value) > LARGEST_SPEED_MPS);
      if (!Number.isFinite(value) || tooLarge) {
        this.stopped = {
          tick: this.tickIndex,
          time_s: this.time_s,
          reason: 'diverged',
          what: `${STATE_NAMES[i]} = ${value}`,
        };
        return;
      }
    }
  }

  /** Writes this tick's row in the order of SIGNAL_NAMES. */
  private observe(time_s: number, sticks: Sticks): void {
    const { state: s, signals: out, pilot, dynamics, windField } = this;
    const axes = [pilot.roll, pilot.pitch, pilot.yaw] as const;
    let k = 0;
    out[k++] = time_s;
    for (let i = 0; i < 3; i++) out[k++] = pilot.setpoint_dps[i];
    out[k++] = pilot.throttle;
    for (let i = 0; i < 3; i++) out[k++] = s[RATES + i] * DEG_PER_RAD;
    for (let i = 0; i < 3; i++) out[k++] = this.gyro.sample_dps[i];
    for (let i = 0; i < 4; i++) out[k++] = pilot.command_us[i];
    for (let i = 0; i < 4; i++) out[k++] = s[ROTOR_SPEED + i] * RPM_PER_RAD_PER_S;
    for (let i = 0; i < 10; i++) out[k++] = s[i];
    out[k++] = windField.sample.north_mps;
    out[k++] = windField.sample.east_mps;
    out[k++] = windField.sample.down_mps;
    out[k++] = dynamics.batteryVoltage_V;
    out[k++] = dynamics.batteryCurrent_A;
    for (let i = 0; i < 3; i++) out[k++] = axes[i].p_us;
    for (let i = 0; i < 3; i++) out[k++] = axes[i].i_us;
    for (let i = 0; i < 3; i++) out[k++] = axes[i].d_us;
    for (let i = 0; i < 3; i++) out[k++] = axes[i].ff_us;
    for (let i = 0; i < 3; i++) out[k++] = axes[i].output_us;
    for (let i = 0; i < 4; i++) out[k++] = dynamics.rotors.thrust_N[i];
    for (let i = 0; i < 4; i++) out[k++] = this.heat_W[i];
    for (let i = 0; i < 4; i++) out[k++] = this.winding_K[i];
    for (let i = 0; i < 4; i++) out[k++] = sticks.armed ? pilot.mixer.saturated[i] : 0;
    for (let i = 0; i < 4; i++) out[k++] = this.struck[i];
    out[k++] = pilot.mixer.attitudeKept;
    out[k++] = pilot.mixer.yawKept;
    out[k++] = pilot.mixer.collectiveShift_us;
    out[k++] = s[CHARGE];
    out[k++] = this.touching ? 1 : 0;
    out[k] = sticks.armed ? 1 : 0;
  }

  // --- Beginning, changing, saving ------------------------------------------------------------------------

  private begin(start: Start): void {
    const s = this.state;
    const { craft, scene } = this;
    s.fill(0);
    const heading = scene.start.heading_deg * RAD_PER_DEG;
    s[POSITION] = scene.start.position_m[0];
    s[POSITION + 1] = scene.start.position_m[1];
    s[CHARGE] = craft.startCharge;
    this.winding_K.fill(this.ambient_K);
    if (start.kind === 'ground') {
      // Legs reach below the body origin; a hair above the ground, so that the first steps settle it.
      s[POSITION + 2] = scene.start.position_m[2] - (craft.legHeight_m - craft.centreOfMass_m[2]) - 0.002;
      s.set(quaternionFromEuler(0, 0, heading), ATTITUDE);
      this.queue.force(new Float64Array(4).fill(craft.escMin_us));
    } else {
      s.set(this.trim.state.subarray(RATES), RATES);
      s[CHARGE] = craft.startCharge;
      s[POSITION + 2] = scene.start.position_m[2] - start.height_m;
      const roll = start.kind === 'free-air' ? (start.roll_deg ?? 0) * RAD_PER_DEG : 0;
      const pitch = start.kind === 'free-air' ? (start.pitch_deg ?? 0) * RAD_PER_DEG : 0;
      s.set(quaternionFromEuler(roll, pitch, heading), ATTITUDE);
      this.queue.force(this.trim.command_us);
      this.dynamics.duty.set(this.trim.duty);
      this.pilot.command_us.set(this.trim.command_us);
    }
    this.dynamics.prepare(s);
    this.dynamics.derivative(s, this.rate);
    this.resetSensors();
  }

  private resetSensors(): void {
    this.gyro.reset(this.state, RATES);
    // At rest and in hover alike the accelerometer long felt the support of 1 g.
    const q = this.state.subarray(ATTITUDE, ATTITUDE + 4);
    const down = rotateToWorld([q[0], -q[1], -q[2], -q[3]], [0, 0, -GRAVITY_MPS2]);
    this.specificForce_mps2.set(down);
    this.accelerometer.reset(this.specificForce_mps2);
    this.pilot.reset(this.state, this.gyro.sample_dps, this.currentCraft.build.gyro.bias_dps);
  }

  private newContact(): ContactWorld {
    const c = this.currentCraft;
    return new ContactWorld({
      scene: this.scene,
      mass_kg: c.mass_kg,
      inertiaDiagonal_kgm2: [c.inertia[0], c.inertia[4], c.inertia[8]],
      rotorPositions_m: [0, 1, 2, 3].map((i) => Array.from(c.rotorPosition_m.subarray(3 * i, 3 * i + 3))),
      propellerRadius_m: c.rotor.radius_m,
      legHeight_m: c.legHeight_m - c.centreOfMass_m[2],
      legHalfTrack_m: c.legHalfTrack_m,
    });
  }

  /** Goes on with other mass properties; the body origin keeps its place and motion. */
  private changeCraft(build: Build): void {
    const old = this.currentCraft;
    const next = compileCraft(build);
    const s = this.state;
    const moved = [0, 1, 2].map((axis) => next.centreOfMass_m[axis] - old.centreOfMass_m[axis]);
    const q = s.subarray(ATTITUDE, ATTITUDE + 4);
    const shift = rotateToWorld(q, moved);
    const [p, qr, r] = [s[RATES], s[RATES + 1], s[RATES + 2]];
    const turning = rotateToWorld(q, [
      qr * moved[2] - r * moved[1],
      r * moved[0] - p * moved[2],
      p * moved[1] - qr * moved[0],
    ]);
    for (let axis = 0; axis < 3; axis++) {
      s[POSITION + axis] += shift[axis];
      s[VELOCITY + axis] += turning[axis];
    }
    this.currentCraft = next;
    this.dynamics.craft = next;
    this.contact = this.newContact();
  }

  private applyEffects(): void {
    const { dynamics, effects } = this;
    for (let i = 0; i < 4; i++) {
      dynamics.rotors.thrustShare[i] = effects.thrustShare[i];
      dynamics.torqueShare[i] = effects.torqueShare[i];
      this.gyro.imbalance[i] = effects.imbalance[i];
    }
    dynamics.deadCells = Math.min(effects.deadCells, this.currentCraft.cells);
    this.gyro.vibrationScale = this.vibrationSetting * effects.vibrationScale;
    this.gyro.mountResonance_Hz = effects.mountResonance_Hz;
    this.gyro.mountDamping = effects.mountDamping;
  }

  /** Everything that the next tick depends on; `load` of the same setup's flight continues bit for bit. */
  save(): Float64Array {
    const out = new SnapshotWriter();
    out.put(this.tickIndex);
    out.put(this.dropped ? 1 : 0);
    out.putAll(this.state);
    out.putAll([...this.phase_rad, ...this.heat_W, ...this.winding_K, ...this.struck]);
    out.putAll([...this.before, ...this.specificForce_mps2]);
    out.put(this.lastSend_s);
    out.put(this.touching ? 1 : 0);
    out.putAll(this.dynamics.motorCurrent_A);
    out.putAll(this.dynamics.rotors.torque_Nm);
    out.putAll(this.dynamics.rotors.thrust_N);
    out.putAll([this.dynamics.batteryVoltage_V, this.dynamics.batteryCurrent_A]);
    out.putAll(this.signals);
    for (const part of this.parts()) part.save(out);
    return out.finish();
  }

  /**
   * Restores a snapshot of a flight with the same setup. Gains, wind, noise and faults changed in flight are
   * the caller's to set again first.
   */
  load(snapshot: Float64Array): void {
    const from = new SnapshotReader(snapshot);
    this.tickIndex = from.take();
    const dropped = from.take() === 1;
    if (dropped && !this.dropped) this.dropPayload();
    from.takeInto(this.state);
    for (const part of [this.phase_rad, this.heat_W, this.winding_K]) from.takeInto(part);
    for (let i = 0; i < 4; i++) this.struck[i] = this.dynamics.stopped[i] = from.take();
    from.takeInto(this.before);
    from.takeInto(this.specificForce_mps2);
    this.lastSend_s = from.take();
    this.touching = from.take() === 1;
    from.takeInto(this.dynamics.motorCurrent_A);
    from.takeInto(this.dynamics.rotors.torque_Nm);
    from.takeInto(this.dynamics.rotors.thrust_N);
    this.dynamics.batteryVoltage_V = from.take();
    this.dynamics.batteryCurrent_A = from.take();
    from.takeInto(this.signals);
    for (const part of this.parts()) part.load(from);
    from.finish();
    this.stopped = null;
  }

  private parts() {
    return [
      this.gyro,
      this.accelerometer,
      this.pilot,
      this.queue,
      this.windField,
      this.contact,
      this.delayStream,
    ];
  }
}

function normalise(s: Float64Array): void {
  const w = s[ATTITUDE];
  const x = s[ATTITUDE + 1];
  const y = s[ATTITUDE + 2];
  const z = s[ATTITUDE + 3];
  const scale = 1 / Math.sqrt(w * w + x * x + y * y + z * z);
  s[ATTITUDE] = w * scale;
  s[ATTITUDE + 1] = x * scale;
  s[ATTITUDE + 2] = y * scale;
  s[ATTITUDE + 3] = z * scale;
}
