/**
 * From sticks to rate setpoints and collective: pure rate control, self-levelling, height hold, the mooring.
 * Then the rate loops and the mixer. One call a tick.
 */
import type { Craft } from '../craft/compile.ts';
import type { Gains } from '../craft/gains.ts';
import { HeightHold, Mooring } from '../control/assists.ts';
import { Levelling } from '../control/levelling.ts';
import { Mixer } from '../control/mixer.ts';
import { RatePid } from '../control/ratePid.ts';
import { limit } from '../math/limit.ts';
import { headingOf } from '../math/quaternion.ts';
import type { SnapshotReader, SnapshotWriter, Stateful } from '../math/snapshot.ts';
import { ATTITUDE, POSITION, VELOCITY } from '../physics/state.ts';

/** What the hands and switches say in one tick. */
export interface Sticks {
  /** −1…1: right side down, nose up, nose right; throttle 0…1. */
  roll: number;
  pitch: number;
  yaw: number;
  throttle: number;
  armed: boolean;
  levelling: boolean;
  heightHold: boolean;
  /** The bench's mooring: holds height and place; sticks only add rate to what it asks for. */
  moored: boolean;
}

export const NEUTRAL_STICKS: Readonly<Sticks> = {
  roll: 0,
  pitch: 0,
  yaw: 0,
  throttle: 0,
  armed: false,
  levelling: false,
  heightHold: false,
  moored: false,
};

/** Used where the gains file says nothing of levelling. */
export const DEFAULT_LEVELLING = { attitude_per_s: 5, maxAngle_deg: 35 };
const DEFAULT_RESET_THROTTLE = 0.03;

export class Pilot implements Stateful {
  readonly setpoint_dps = new Float64Array(3);
  readonly roll: RatePid;
  readonly pitch: RatePid;
  readonly yaw: RatePid;
  readonly mixer: Mixer;
  readonly levelling = new Levelling();
  readonly heightHold = new HeightHold();
  readonly mooring = new Mooring();
  /** Commands of the last tick as they leave the controller: limited and quantised, µs. */
  readonly command_us = new Float64Array(4);
  /** Collective of the last tick as a share of the command range. */
  throttle = 0;
  private wasArmed = false;
  private wasMoored = false;

  constructor(
    private craft: Craft,
    private gains: Gains,
    /** Share of battery voltage that hovers, full pack, still air. */
    private readonly hoverDuty: number,
  ) {
    this.roll = new RatePid(gains, 'roll');
    this.pitch = new RatePid(gains, 'pitch');
    this.yaw = new RatePid(gains, 'yaw');
    this.mixer = new Mixer(craft, gains.desaturation ?? 'attitude-first');
    this.command_us.fill(craft.escMin_us);
  }

  setGains(gains: Gains): void {
    this.gains = gains;
    for (const axis of [this.roll, this.pitch, this.yaw]) axis.setGains(gains);
    this.mixer.desaturation = gains.desaturation ?? 'attitude-first';
  }

  /** Starts the estimate from a known attitude with the gyro's bias calibrated at rest. */
  reset(state: Float64Array, gyro_dps: Float64Array, bias_dps: ArrayLike<number>): void {
    const [w, x, y, z] = [state[ATTITUDE], state[ATTITUDE + 1], state[ATTITUDE + 2], state[ATTITUDE + 3]];
    this.levelling.reset(2 * (x * z - w * y), 2 * (y * z + w * x), 1 - 2 * (x * x + y * y), bias_dps);
    this.roll.reset(gyro_dps[0]);
    this.pitch.reset(gyro_dps[1]);
    this.yaw.reset(gyro_dps[2]);
    this.heightHold.reset();
  }

  /** One tick: estimate, setpoints, rate loops, mixer, quantised commands. */
  tick(
    sticks: Sticks,
    gyro_dps: Float64Array,
    accel_mps2: Float64Array,
    state: Float64Array,
    dt_s: number,
  ): void {
    this.levelling.estimate(gyro_dps, accel_mps2, dt_s);
    this.switchOver(sticks, gyro_dps, state);
    this.setpoints(sticks, state, dt_s);
    const collective_us = this.collective(sticks, state, dt_s);
    this.rateLoops(gyro_dps, sticks);
    if (!sticks.armed) {
      this.command_us.fill(this.craft.escMin_us);
      this.throttle = 0;
      return;
    }
    this.mixer.mix(collective_us, this.roll.output_us, this.pitch.output_us, this.yaw.output_us);
    this.quantise();
    const { escMin_us, escMax_us } = this.craft;
    this.throttle = (collective_us - escMin_us) / (escMax_us - escMin_us);
  }

  private switchOver(sticks: Sticks, gyro_dps: Float64Array, state: Float64Array): void {
    if (sticks.armed && !this.wasArmed) {
      this.roll.reset(gyro_dps[0]);
      this.pitch.reset(gyro_dps[1]);
      this.yaw.reset(gyro_dps[2]);
      this.heightHold.reset();
    }
    if (sticks.moored && !this.wasMoored) {
      this.mooring.moorAt(state[POSITION], state[POSITION + 1], headingOf(state, ATTITUDE));
      this.heightHold.holdAt(state[POSITION + 2]);
    }
    this.wasArmed = sticks.armed;
    this.wasMoored = sticks.moored;
  }

  private setpoints(sticks: Sticks, state: Float64Array, dt_s: number): void {
    const { maxRate_dps } = this.gains;
    const { attitude_per_s, maxAngle_deg } = this.gains.levelling ?? DEFAULT_LEVELLING;
    const sp = this.setpoint_dps;
    if (sticks.moored) {
      this.mooring.steer(
        state[POSITION],
        state[POSITION + 1],
        state[VELOCITY],
        state[VELOCITY + 1],
        headingOf(state, ATTITUDE),
        maxAngle_deg,
        dt_s,
      );
      const { roll_deg, pitch_deg, yawRate_dps } = this.mooring;
      this.levelling.steer(roll_deg, pitch_deg, yawRate_dps, attitude_per_s);
      // Sticks add rate on top of the mooring's: an excitation for identification.
      this.levelling.roll_dps += sticks.roll * maxRate_dps.roll;
      this.levelling.pitch_dps += sticks.pitch * maxRate_dps.pitch;
      this.levelling.yaw_dps += sticks.yaw * maxRate_dps.yaw;
    } else if (sticks.levelling) {
      this.levelling.steer(
        sticks.roll * maxAngle_deg,
        sticks.pitch * maxAngle_deg,
        sticks.yaw * maxRate_dps.yaw,
        attitude_per_s,
      );
    } else {
      sp[0] = sticks.roll * maxRate_dps.roll;
      sp[1] = sticks.pitch * maxRate_dps.pitch;
      sp[2] = sticks.yaw * maxRate_dps.yaw;
      return;
    }
    sp[0] = limit(this.levelling.roll_dps, maxRate_dps.roll);
    sp[1] = limit(this.levelling.pitch_dps, maxRate_dps.pitch);
    sp[2] = limit(this.levelling.yaw_dps, maxRate_dps.yaw);
  }

  /** Collective command, µs. */
  private collective(sticks: Sticks, state: Float64Array, dt_s: number): number {
    const { escMin_us, escIdle_us, escMax_us } = this.craft;
    if (!sticks.moored && !sticks.heightHold) {
      return escIdle_us + sticks.throttle * (escMax_us - escIdle_us);
    }
    const x = state[ATTITUDE + 1];
    const y = state[ATTITUDE + 2];
    const cosTilt = 1 - 2 * (x * x + y * y);
    const stick = sticks.moored ? 0.5 : sticks.throttle;
    const duty = this.heightHold.duty(
      stick,
      state[POSITION + 2],
      state[VELOCITY + 2],
      cosTilt,
      this.hoverDuty,
      dt_s,
    );
    return Math.max(escIdle_us, Math.min(escMax_us, escMin_us + duty * (escMax_us - escMin_us)));
  }

  private rateLoops(gyro_dps: Float64Array, sticks: Sticks): void {
    const low = this.gains.integratorReset_throttle ?? DEFAULT_RESET_THROTTLE;
    const held = !sticks.armed || (!sticks.moored && sticks.throttle < low);
    const attitudeShort = this.mixer.attitudeKept < 1 ? 1 : 0;
    const yawShort = this.mixer.yawKept < 1 ? 1 : 0;
    const sp = this.setpoint_dps;
    this.roll.update(sp[0], gyro_dps[0], held, attitudeShort * Math.sign(this.roll.output_us));
    this.pitch.update(sp[1], gyro_dps[1], held, attitudeShort * Math.sign(this.pitch.output_us));
    this.yaw.update(sp[2], gyro_dps[2], held, yawShort * Math.sign(this.yaw.output_us));
  }

  private quantise(): void {
    const step = this.craft.escResolution_us;
    for (let i = 0; i < 4; i++) {
      const command = this.mixer.command_us[i];
      this.command_us[i] = step === 0 ? command : Math.round(command / step) * step;
    }
  }

  save(out: SnapshotWriter): void {
    out.putAll(this.setpoint_dps);
    out.putAll(this.command_us);
    out.putAll([this.throttle, this.wasArmed ? 1 : 0, this.wasMoored ? 1 : 0]);
    out.putAll([this.mixer.attitudeKept, this.mixer.yawKept]);
    for (const part of this.parts()) part.save(out);
  }

  load(from: SnapshotReader): void {
    from.takeInto(this.setpoint_dps);
    from.takeInto(this.command_us);
    this.throttle = from.take();
    this.wasArmed = from.take() === 1;
    this.wasMoored = from.take() === 1;
    this.mixer.attitudeKept = from.take();
    this.mixer.yawKept = from.take();
    for (const part of this.parts()) part.load(from);
  }

  private parts(): Stateful[] {
    return [this.roll, this.pitch, this.yaw, this.levelling, this.heightHold, this.mooring];
  }
}
