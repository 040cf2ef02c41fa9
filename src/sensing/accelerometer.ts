/**
 * Accelerometer at the centre of mass as the controller gets it: specific force in body axes through a
 * first-order bandwidth, white noise of the stated density (variance as in gyro.ts), bias, full scale,
 * resolution. Vibration is left to the gyro: levelling averages over far longer than a turn.
 */
import type { Craft } from '../craft/compile.ts';
import { RandomStream } from '../math/random.ts';
import type { SnapshotReader, SnapshotWriter, Stateful } from '../math/snapshot.ts';

export class Accelerometer implements Stateful {
  /** Latest sample, m/s², x, y, z; a craft at rest on level ground shows z = −g. */
  readonly sample_mps2 = new Float64Array(3);
  noiseScale = 1;
  private readonly filtered_mps2 = new Float64Array(3);
  private readonly blend: number;
  private readonly sigma_mps2: number;
  private readonly streams: RandomStream[];

  constructor(
    private readonly craft: Craft,
    step_s: number,
    sample_s: number,
    seed: number,
  ) {
    const part = craft.build.accelerometer;
    this.blend = part.bandwidth_Hz === 0 ? 1 : 1 - Math.exp(-2 * Math.PI * part.bandwidth_Hz * step_s);
    const noiseBandwidth_Hz =
      part.bandwidth_Hz === 0 ? 1 / (2 * sample_s) : (Math.PI / 2) * part.bandwidth_Hz;
    this.sigma_mps2 = part.noise_mps2_per_rtHz * Math.sqrt(noiseBandwidth_Hz);
    this.streams = ['x', 'y', 'z'].map((axis) => new RandomStream(seed, `accelerometer.noise.${axis}`));
  }

  reset(specificForce_mps2: Float64Array): void {
    this.filtered_mps2.set(specificForce_mps2);
  }

  /** Moves the analogue side on by one integration step. */
  advance(specificForce_mps2: Float64Array): void {
    for (let axis = 0; axis < 3; axis++) {
      this.filtered_mps2[axis] += this.blend * (specificForce_mps2[axis] - this.filtered_mps2[axis]);
    }
  }

  /** Samples into `sample_mps2`. */
  sample(): void {
    const part = this.craft.build.accelerometer;
    for (let axis = 0; axis < 3; axis++) {
      const value =
        this.filtered_mps2[axis] +
        part.bias_mps2[axis] +
        this.noiseScale * this.sigma_mps2 * this.streams[axis].gaussian();
      const limited = Math.max(-part.fullScale_mps2, Math.min(part.fullScale_mps2, value));
      this.sample_mps2[axis] =
        part.resolution_mps2 === 0
          ? limited
          : Math.round(limited / part.resolution_mps2) * part.resolution_mps2;
    }
  }

  save(out: SnapshotWriter): void {
    out.putAll(this.sample_mps2);
    out.putAll(this.filtered_mps2);
    out.put(this.noiseScale);
    for (const stream of this.streams) stream.save(out);
  }

  load(from: SnapshotReader): void {
    from.takeInto(this.sample_mps2);
    from.takeInto(this.filtered_mps2);
    this.noiseScale = from.take();
    for (const stream of this.streams) stream.load(from);
  }
}
