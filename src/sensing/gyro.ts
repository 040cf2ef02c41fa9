/**
 * The rate gyro as the controller gets it: body rates turned into sensor axes, first-order sensor bandwidth,
 * pure delay, white noise of the stated density as it leaves that bandwidth, vibration lines of the rotors
 * evaluated at the sampling instant (so that aliasing is real), bias and its random walk, full scale and
 * resolution.
 *
 * White noise of one-sided density N through a first-order bandwidth f_b has variance N²·(π/2)·f_b (equivalent
 * noise bandwidth); without a bandwidth it is white at the sampling rate f_s, σ = N·√(f_s/2).
 */
import type { Craft } from '../craft/compile.ts';
import { DEG_PER_RAD } from '../math/angles.ts';
import { RandomStream } from '../math/random.ts';
import type { SnapshotReader, SnapshotWriter, Stateful } from '../math/snapshot.ts';

/** Blade-pass line over the once-per-turn line; common practice, no source. */
const BLADE_PASS_SHARE = 0.4;
/** Phase between the three axes' vibration, so that they are not in step. */
const AXIS_PHASE_RAD = [0, 2.1, 4.2];

export class Gyro implements Stateful {
  /** Latest sample, deg/s, roll, pitch, yaw. */
  readonly sample_dps = new Float64Array(3);
  /** Noise and vibration can be scaled in flight; 1 is the build's own. */
  noiseScale = 1;
  vibrationScale = 1;
  readonly imbalance = new Float64Array([1, 1, 1, 1]);
  /** Resonance of a loose mount; 0: as stiff as the airframe. */
  mountResonance_Hz = 0;
  mountDamping = 1;
  private readonly filtered_dps = new Float64Array(3);
  private readonly noise_dps = new Float64Array(3);
  private readonly drift_dps = new Float64Array(3);
  private readonly history_dps: Float64Array;
  private head = 0;
  private readonly delaySteps: number;
  private readonly delayPart: number;
  private readonly blend: number;
  private readonly blendOld: number;
  private readonly noiseCorrelation: number;
  private readonly noiseStep_dps: number;
  private readonly driftStep_dps: number;
  private readonly noiseStreams: RandomStream[];
  private readonly driftStreams: RandomStream[];
  private readonly lastRate_dps = new Float64Array(3);

  /**
   * @param step_s integration step
   * @param sample_s sampling period, the controller's tick
   * @param hoverSpeed_radps speed at which the build's vibration amplitudes hold
   */
  constructor(
    private readonly craft: Craft,
    step_s: number,
    sample_s: number,
    private readonly hoverSpeed_radps: number,
    seed: number,
  ) {
    const gyro = craft.build.gyro;
    const steps = gyro.delay_s / step_s;
    this.delaySteps = Math.floor(steps + 1e-9);
    this.delayPart = Math.max(0, steps - this.delaySteps);
    this.history_dps = new Float64Array(3 * (this.delaySteps + 2));
    const x = 2 * Math.PI * gyro.bandwidth_Hz * step_s;
    // Exact for an input that is linear over the step (first-order hold).
    this.blend = gyro.bandwidth_Hz === 0 ? 1 : 1 - (1 - Math.exp(-x)) / x;
    this.blendOld = gyro.bandwidth_Hz === 0 ? 0 : (1 - Math.exp(-x)) / x - Math.exp(-x);
    const N = gyro.noise_dps_per_rtHz;
    if (gyro.bandwidth_Hz === 0) {
      this.noiseCorrelation = 0;
      this.noiseStep_dps = N * Math.sqrt(1 / (2 * sample_s));
    } else {
      // The filtered noise sampled every sample_s is an Ornstein–Uhlenbeck sequence; drawn exactly.
      this.noiseCorrelation = Math.exp(-2 * Math.PI * gyro.bandwidth_Hz * sample_s);
      const sigma = N * Math.sqrt((Math.PI / 2) * gyro.bandwidth_Hz);
      this.noiseStep_dps = sigma * Math.sqrt(1 - this.noiseCorrelation ** 2);
    }
    this.driftStep_dps = (gyro.drift_dps_per_rts ?? 0) * Math.sqrt(sample_s);
    this.noiseStreams = ['roll', 'pitch', 'yaw'].map((axis) => new RandomStream(seed, `gyro.noise.${axis}`));
    this.driftStreams = ['roll', 'pitch', 'yaw'].map((axis) => new RandomStream(seed, `gyro.drift.${axis}`));
    this.settleNoise();
  }

  /** Starts the noise in its stationary state. */
  private settleNoise(): void {
    const scale = Math.sqrt(1 - this.noiseCorrelation ** 2);
    for (let axis = 0; axis < 3; axis++) {
      this.noise_dps[axis] = (this.noiseStep_dps / scale) * this.noiseStreams[axis].gaussian();
    }
  }

  /** Takes the body rates at the start of a flight as long settled. */
  reset(state: Float64Array, rates: number): void {
    for (let axis = 0; axis < 3; axis++) {
      const rate = this.mounted(state, rates, axis);
      this.filtered_dps[axis] = rate;
      this.lastRate_dps[axis] = rate;
    }
    for (let i = 0; i < this.history_dps.length; i++) this.history_dps[i] = this.filtered_dps[i % 3];
  }

  /** Moves the analogue side on by one integration step to the body rates now in `state` at `rates`. */
  advance(state: Float64Array, rates: number): void {
    const size = this.delaySteps + 2;
    this.head = (this.head + 1) % size;
    for (let axis = 0; axis < 3; axis++) {
      const rate = this.mounted(state, rates, axis);
      const old = this.filtered_dps[axis];
      const next = old + this.blend * (rate - old) + this.blendOld * (this.lastRate_dps[axis] - old);
      this.lastRate_dps[axis] = rate;
      this.filtered_dps[axis] = next;
      this.history_dps[3 * this.head + axis] = next;
    }
  }

  private mounted(state: Float64Array, rates: number, axis: number): number {
    const m = this.craft.gyroMounting;
    return (
      DEG_PER_RAD *
      (m[3 * axis] * state[rates] + m[3 * axis + 1] * state[rates + 1] + m[3 * axis + 2] * state[rates + 2])
    );
  }

  /**
   * Samples into `sample_dps`.
   * @param rotorPhase_rad turned angle of each rotor now
   * @param state flight state, @param speeds offset of the rotor speeds in it
   */
  sample(rotorPhase_rad: Float64Array, state: Float64Array, speeds: number): void {
    const gyro = this.craft.build.gyro;
    const size = this.delaySteps + 2;
    const newer = (this.head - this.delaySteps + 2 * size) % size;
    const older = (newer - 1 + size) % size;
    for (let axis = 0; axis < 3; axis++) {
      this.noise_dps[axis] =
        this.noiseCorrelation * this.noise_dps[axis] +
        this.noiseStep_dps * this.noiseStreams[axis].gaussian();
      if (this.driftStep_dps > 0) {
        this.drift_dps[axis] += this.driftStep_dps * this.driftStreams[axis].gaussian();
      }
      const delayed =
        (1 - this.delayPart) * this.history_dps[3 * newer + axis] +
        this.delayPart * this.history_dps[3 * older + axis];
      const value =
        delayed +
        gyro.bias_dps[axis] +
        this.drift_dps[axis] +
        this.noiseScale * this.noise_dps[axis] +
        this.vibration(axis, rotorPhase_rad, state, speeds);
      this.sample_dps[axis] = this.quantised(value);
    }
  }

  /** Sum of the rotors' lines at this instant, after the sensor's own bandwidth, deg/s. */
  private vibration(axis: number, phase: Float64Array, state: Float64Array, speeds: number): number {
    const gyro = this.craft.build.gyro;
    const amplitude = gyro.vibration_dps === undefined ? 0 : gyro.vibration_dps[axis];
    if (amplitude === 0 || this.vibrationScale === 0) return 0;
    const blades = this.craft.rotor.blades;
    let sum = 0;
    for (let i = 0; i < 4; i++) {
      const speed = state[speeds + i];
      const relative = speed / this.hoverSpeed_radps;
      const turn = this.transmitted(speed) * Math.sin(phase[i] + AXIS_PHASE_RAD[axis] + i);
      const pass =
        BLADE_PASS_SHARE *
        this.transmitted(blades * speed) *
        Math.sin(blades * phase[i] + AXIS_PHASE_RAD[axis] + 2 * i);
      sum += this.imbalance[i] * relative * relative * (turn + pass);
    }
    return this.vibrationScale * amplitude * sum;
  }

  /** Gain of mount and sensor at angular frequency `w`, rad/s; a mount passes vibration as a second-order base. */
  private transmitted(w: number): number {
    if (this.mountResonance_Hz === 0) return this.throughBandwidth(w);
    const ratio = w / (2 * Math.PI * this.mountResonance_Hz);
    const damping = 2 * this.mountDamping * ratio;
    const stiff = 1 - ratio * ratio;
    const mount = Math.sqrt((1 + damping * damping) / (stiff * stiff + damping * damping));
    return mount * this.throughBandwidth(w);
  }

  /** Gain of the first-order bandwidth at angular frequency `w`, rad/s. */
  private throughBandwidth(w: number): number {
    const bandwidth = this.craft.build.gyro.bandwidth_Hz;
    if (bandwidth === 0) return 1;
    const ratio = w / (2 * Math.PI * bandwidth);
    return 1 / Math.sqrt(1 + ratio * ratio);
  }

  private quantised(value_dps: number): number {
    const gyro = this.craft.build.gyro;
    const limited = Math.max(-gyro.fullScale_dps, Math.min(gyro.fullScale_dps, value_dps));
    if (gyro.resolution_dps === 0) return limited;
    return Math.round(limited / gyro.resolution_dps) * gyro.resolution_dps;
  }

  save(out: SnapshotWriter): void {
    for (const part of [this.sample_dps, this.filtered_dps, this.noise_dps, this.drift_dps]) out.putAll(part);
    out.putAll(this.history_dps);
    out.putAll(this.lastRate_dps);
    out.putAll(this.imbalance);
    out.put(this.head);
    out.put(this.noiseScale);
    out.put(this.vibrationScale);
    for (const stream of [...this.noiseStreams, ...this.driftStreams]) stream.save(out);
  }

  load(from: SnapshotReader): void {
    for (const part of [this.sample_dps, this.filtered_dps, this.noise_dps, this.drift_dps])
      from.takeInto(part);
    from.takeInto(this.history_dps);
    from.takeInto(this.lastRate_dps);
    from.takeInto(this.imbalance);
    this.head = from.take();
    this.noiseScale = from.take();
    this.vibrationScale = from.take();
    for (const stream of [...this.noiseStreams, ...this.driftStreams]) stream.load(from);
  }
}
