/**
 * Self-levelling outer loop. The attitude estimate is the direction of "down" in body axes, carried on by the
 * gyro and drawn slowly to the accelerometer with an integral of the gyro's bias (Mahony, Hamel, Pflimlin
 * 2008, passive complementary filter on the gravity direction). Rate setpoints turn the estimate to the
 * wanted tilt along the shortest way, so an inverted craft rights itself.
 */
import { DEG_PER_RAD, GRAVITY_MPS2, RAD_PER_DEG } from '../math/angles.ts';
import type { SnapshotReader, SnapshotWriter, Stateful } from '../math/snapshot.ts';

/** Pull of the accelerometer, 1/s, and of the bias integral, 1/s². */
const PROPORTIONAL_PER_S = 0.25;
const INTEGRAL_PER_S2 = 0.01;
/** The accelerometer is believed only near 1 g. */
const BELIEVED_SHARE = 0.35;

export class Levelling implements Stateful {
  /** Estimated unit vector "down" in body axes. */
  readonly down = new Float64Array([0, 0, 1]);
  /** Estimated gyro bias, deg/s. */
  readonly bias_dps = new Float64Array(3);
  /** Rate setpoints of the last call, deg/s. */
  roll_dps = 0;
  pitch_dps = 0;
  yaw_dps = 0;

  /** Starts from a known attitude (row of the rotation body to world) and a bias calibrated at rest. */
  reset(downX: number, downY: number, downZ: number, bias_dps: ArrayLike<number>): void {
    this.down[0] = downX;
    this.down[1] = downY;
    this.down[2] = downZ;
    for (let i = 0; i < 3; i++) this.bias_dps[i] = bias_dps[i];
  }

  /** One tick of the estimate. */
  estimate(gyro_dps: Float64Array, accel_mps2: Float64Array, tick_s: number): void {
    const d = this.down;
    const a = accel_mps2;
    const size = Math.sqrt(a[0] * a[0] + a[1] * a[1] + a[2] * a[2]);
    let ex = 0;
    let ey = 0;
    let ez = 0;
    if (Math.abs(size / GRAVITY_MPS2 - 1) < BELIEVED_SHARE) {
      // Measured down is against the specific force; the error turns the estimate to it.
      const mx = -a[0] / size;
      const my = -a[1] / size;
      const mz = -a[2] / size;
      ex = my * d[2] - mz * d[1];
      ey = mz * d[0] - mx * d[2];
      ez = mx * d[1] - my * d[0];
    }
    const b = this.bias_dps;
    const bleed = INTEGRAL_PER_S2 * DEG_PER_RAD * tick_s;
    b[0] -= bleed * ex;
    b[1] -= bleed * ey;
    b[2] -= bleed * ez;
    const p = (gyro_dps[0] - b[0]) * RAD_PER_DEG + PROPORTIONAL_PER_S * ex;
    const q = (gyro_dps[1] - b[1]) * RAD_PER_DEG + PROPORTIONAL_PER_S * ey;
    const r = (gyro_dps[2] - b[2]) * RAD_PER_DEG + PROPORTIONAL_PER_S * ez;
    // A world-fixed direction in turning body axes: ḋ = d × ω.
    const x = d[0] + tick_s * (d[1] * r - d[2] * q);
    const y = d[1] + tick_s * (d[2] * p - d[0] * r);
    const z = d[2] + tick_s * (d[0] * q - d[1] * p);
    const length = Math.sqrt(x * x + y * y + z * z);
    d[0] = x / length;
    d[1] = y / length;
    d[2] = z / length;
  }

  /** Rate setpoints that turn the estimate to the wanted roll and pitch. */
  steer(roll_deg: number, pitch_deg: number, yawRate_dps: number, attitude_per_s: number): void {
    const d = this.down;
    const roll = roll_deg * RAD_PER_DEG;
    const pitch = pitch_deg * RAD_PER_DEG;
    const wx = -Math.sin(pitch);
    const wy = Math.cos(pitch) * Math.sin(roll);
    const wz = Math.cos(pitch) * Math.cos(roll);
    let cx = wy * d[2] - wz * d[1];
    let cy = wz * d[0] - wx * d[2];
    let cz = wx * d[1] - wy * d[0];
    const cross = Math.sqrt(cx * cx + cy * cy + cz * cz);
    const dot = wx * d[0] + wy * d[1] + wz * d[2];
    const angle_deg = Math.atan2(cross, dot) * DEG_PER_RAD;
    if (cross < 1e-6) {
      // Level already, or exactly upside down: then any way is the shortest; roll is the customary one.
      cx = dot < 0 ? 1 : 0;
      cy = 0;
      cz = 0;
    } else {
      cx /= cross;
      cy /= cross;
      cz /= cross;
    }
    const rate = attitude_per_s * angle_deg;
    this.roll_dps = rate * cx;
    this.pitch_dps = rate * cy;
    this.yaw_dps = rate * cz + yawRate_dps;
  }

  save(out: SnapshotWriter): void {
    out.putAll(this.down);
    out.putAll(this.bias_dps);
    out.putAll([this.roll_dps, this.pitch_dps, this.yaw_dps]);
  }

  load(from: SnapshotReader): void {
    from.takeInto(this.down);
    from.takeInto(this.bias_dps);
    this.roll_dps = from.take();
    this.pitch_dps = from.take();
    this.yaw_dps = from.take();
  }
}
