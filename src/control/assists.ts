/**
 * The bench's own assists, which know the true state as no real controller does: height hold for keys and
 * touch, and the mooring, which holds height and place for trials. They give collective and wanted tilt; the
 * craft's own loops do the rest.
 */
import { DEG_PER_RAD, GRAVITY_MPS2 } from '../math/angles.ts';
import { limit } from '../math/limit.ts';
import type { SnapshotReader, SnapshotWriter, Stateful } from '../math/snapshot.ts';

/** Climb rate at full stick, m/s. */
const CLIMB_MPS = 2.5;
const HEIGHT_PER_S = 1.4;
const CLIMB_PER_S = 3.2;
const CLIMB_INTEGRAL_PER_S2 = 1.6;
const PLACE_PER_S = 0.75;
const SPEED_PER_S = 1.5;
const SPEED_INTEGRAL_PER_S2 = 0.55;
const LARGEST_SPEED_MPS = 3;
const LARGEST_ACCELERATION_MPS2 = 6;
/** Throttle stick around its middle that means "hold". */
const HOLD_BAND = 0.06;

export class HeightHold implements Stateful {
  /** Height to hold as a down coordinate, m; NaN until the stick was first centred. */
  private wantedDown_m = NaN;
  private integral_mps2 = 0;

  reset(): void {
    this.wantedDown_m = NaN;
    this.integral_mps2 = 0;
  }

  /** Holds this height from now on. */
  holdAt(down_m: number): void {
    this.wantedDown_m = down_m;
  }

  /** Height that is held, as a down coordinate; NaN when none. */
  get heldDown_m(): number {
    return this.wantedDown_m;
  }

  /**
   * Share of battery voltage for all motors.
   * @param stick 0…1; the middle holds, the ends climb or sink
   * @param cosTilt cosine of the craft's tilt
   * @param hoverDuty share that hovers in still air on a full pack
   */
  duty(
    stick: number,
    down_m: number,
    vd_mps: number,
    cosTilt: number,
    hoverDuty: number,
    dt_s: number,
  ): number {
    const deflection = 2 * stick - 1;
    let sink_mps: number;
    if (Math.abs(deflection) > HOLD_BAND) {
      const share = (Math.abs(deflection) - HOLD_BAND) / (1 - HOLD_BAND);
      sink_mps = -Math.sign(deflection) * share * CLIMB_MPS;
      this.wantedDown_m = down_m;
    } else {
      if (Number.isNaN(this.wantedDown_m)) this.wantedDown_m = down_m;
      sink_mps = limit(HEIGHT_PER_S * (this.wantedDown_m - down_m), CLIMB_MPS);
    }
    const error = vd_mps - sink_mps;
    this.integral_mps2 = limit(this.integral_mps2 + CLIMB_INTEGRAL_PER_S2 * error * dt_s, 5);
    const up_mps2 = limit(CLIMB_PER_S * error + this.integral_mps2, 8);
    // Thrust goes nearly with the square of the voltage share.
    return hoverDuty * Math.sqrt(Math.max(0.05, (1 + up_mps2 / GRAVITY_MPS2) / Math.max(0.4, cosTilt)));
  }

  save(out: SnapshotWriter): void {
    out.put(this.wantedDown_m);
    out.put(this.integral_mps2);
  }

  load(from: SnapshotReader): void {
    this.wantedDown_m = from.take();
    this.integral_mps2 = from.take();
  }
}

export class Mooring implements Stateful {
  /** Wanted tilt of the last call, deg. */
  roll_deg = 0;
  pitch_deg = 0;
  yawRate_dps = 0;
  private north_m = 0;
  private east_m = 0;
  private heading_rad = 0;
  private integralNorth = 0;
  private integralEast = 0;

  /** Moors at this place and heading. */
  moorAt(north_m: number, east_m: number, heading_rad: number): void {
    this.north_m = north_m;
    this.east_m = east_m;
    this.heading_rad = heading_rad;
    this.integralNorth = 0;
    this.integralEast = 0;
  }

  /** Wanted tilt and yaw rate from the true place, velocity and heading. */
  steer(
    north_m: number,
    east_m: number,
    vn_mps: number,
    ve_mps: number,
    heading_rad: number,
    maxAngle_deg: number,
    dt_s: number,
  ): void {
    let wantedNorth = PLACE_PER_S * (this.north_m - north_m);
    let wantedEast = PLACE_PER_S * (this.east_m - east_m);
    const speed = Math.sqrt(wantedNorth * wantedNorth + wantedEast * wantedEast);
    if (speed > LARGEST_SPEED_MPS) {
      wantedNorth *= LARGEST_SPEED_MPS / speed;
      wantedEast *= LARGEST_SPEED_MPS / speed;
    }
    const errorNorth = wantedNorth - vn_mps;
    const errorEast = wantedEast - ve_mps;
    const most = LARGEST_ACCELERATION_MPS2;
    this.integralNorth = limit(this.integralNorth + SPEED_INTEGRAL_PER_S2 * errorNorth * dt_s, most);
    this.integralEast = limit(this.integralEast + SPEED_INTEGRAL_PER_S2 * errorEast * dt_s, most);
    const an = limit(SPEED_PER_S * errorNorth + this.integralNorth, most);
    const ae = limit(SPEED_PER_S * errorEast + this.integralEast, most);
    const c = Math.cos(heading_rad);
    const s = Math.sin(heading_rad);
    const forward = c * an + s * ae;
    const right = -s * an + c * ae;
    this.pitch_deg = limit(-Math.atan(forward / GRAVITY_MPS2) * DEG_PER_RAD, maxAngle_deg);
    this.roll_deg = limit(Math.atan(right / GRAVITY_MPS2) * DEG_PER_RAD, maxAngle_deg);
    const turn = Math.atan2(
      Math.sin(this.heading_rad - heading_rad),
      Math.cos(this.heading_rad - heading_rad),
    );
    this.yawRate_dps = limit(1.2 * turn * DEG_PER_RAD, 45);
  }

  save(out: SnapshotWriter): void {
    out.putAll([this.roll_deg, this.pitch_deg, this.yawRate_dps, this.north_m, this.east_m]);
    out.putAll([this.heading_rad, this.integralNorth, this.integralEast]);
  }

  load(from: SnapshotReader): void {
    this.roll_deg = from.take();
    this.pitch_deg = from.take();
    this.yawRate_dps = from.take();
    this.north_m = from.take();
    this.east_m = from.take();
    this.heading_rad = from.take();
    this.integralNorth = from.take();
    this.integralEast = from.take();
  }
}
