/** Four ways to look: chase, on board, from the pilot's standing place, free. */
import { PerspectiveCamera, Vector3, type Quaternion } from 'three';
import { fromThree, toThree } from './axes.ts';
import type { SolidSpace } from './solids.ts';

export type CameraName = 'chase' | 'onboard' | 'pilot' | 'free';
export const CAMERAS: readonly CameraName[] = ['chase', 'onboard', 'pilot', 'free'];

const FOV_DEG = 52;
const ONBOARD_FOV_DEG = 82;
/** The pilot's eyes rest on the craft: the angle of view closes with distance, within these. */
const PILOT_FOV_DEG = { least: 15, most: 58 };
const PILOT_SEES_REACHES = 6.5;
/** Chase camera follows with this time constant, s. */
const FOLLOW_S = 0.16;
/** Distance of chase and free camera in the craft's reaches. */
const AWAY_REACHES = 5.8;
/** The craft stands a little above the middle, so that what is under it is seen: in reaches. */
const LOOKS_BELOW = 0.35;
const FIRST_LIFT_RAD = 0.33;
/** The camera keeps this far from walls and ground, m. */
const MARGIN_M = 0.2;
const LOWEST_M = 0.15;

export class CameraRig {
  readonly camera = new PerspectiveCamera(FOV_DEG, 1, 0.05, 1500);
  name: CameraName = 'chase';
  private turn_rad = 0;
  private lift_rad = FIRST_LIFT_RAD;
  private zoom = 1;
  private heading_rad = 0;
  private settled = false;
  private readonly goal = new Vector3();
  private readonly look = new Vector3();
  private readonly forward = new Vector3();
  private readonly pilot = new Vector3();
  private readonly from = new Float64Array(3);
  private readonly to = new Float64Array(3);

  setPilot(north: number, east: number, down: number): void {
    toThree(this.pilot, north, east, down);
    this.settled = false;
  }

  choose(name: CameraName): void {
    // The free view begins where the chase view stood.
    if (name === 'free' && this.name !== 'free') this.turn_rad += this.heading_rad;
    if (name !== 'free') {
      this.turn_rad = 0;
      this.lift_rad = FIRST_LIFT_RAD;
    }
    this.name = name;
    this.settled = false;
  }

  /** Radians of turn and lift, by pointer or keys. */
  drag(turn: number, lift: number): void {
    this.turn_rad += turn;
    this.lift_rad = Math.max(-1.2, Math.min(1.5, this.lift_rad + lift));
  }

  zoomBy(factor: number): void {
    this.zoom = Math.max(0.3, Math.min(12, this.zoom * factor));
  }

  /** Places the camera for the craft at `position` and `attitude`; `reach_m` is its size. */
  update(position: Vector3, attitude: Quaternion, reach_m: number, space: SolidSpace, dt_s: number): void {
    const { camera, forward } = this;
    forward.set(0, 0, -1).applyQuaternion(attitude);
    if (Math.hypot(forward.x, forward.z) > 0.2) this.heading_rad = Math.atan2(forward.x, -forward.z);
    camera.up.set(0, 1, 0);
    if (this.name === 'onboard') this.onBoard(position, attitude, reach_m);
    else if (this.name === 'pilot') this.fromPilot(position, reach_m);
    else this.around(position, reach_m, space, dt_s);
    this.settled = true;
    camera.lookAt(this.look);
    camera.updateMatrixWorld();
  }

  private onBoard(position: Vector3, attitude: Quaternion, reach_m: number): void {
    const { camera, forward, look } = this;
    camera.up.applyQuaternion(attitude);
    camera.position
      .copy(position)
      .addScaledVector(forward, reach_m * 0.45)
      .addScaledVector(camera.up, reach_m * 0.12);
    look.copy(camera.position).addScaledVector(forward, 10).addScaledVector(camera.up, -0.8);
    this.setFov(ONBOARD_FOV_DEG);
  }

  private fromPilot(position: Vector3, reach_m: number): void {
    const { camera, look } = this;
    camera.position.copy(this.pilot);
    look.copy(position);
    // Standing where the craft is: look ahead instead of into it.
    const distance = this.pilot.distanceTo(position);
    if (distance < 0.2) look.z -= 1;
    const angle = (2 * Math.atan((reach_m * PILOT_SEES_REACHES) / Math.max(1, distance)) * 180) / Math.PI;
    this.setFov(Math.max(PILOT_FOV_DEG.least, Math.min(PILOT_FOV_DEG.most, angle)));
  }

  private around(position: Vector3, reach_m: number, space: SolidSpace, dt_s: number): void {
    const { camera, goal, look } = this;
    const heading = this.name === 'free' ? this.turn_rad : this.heading_rad + this.turn_rad;
    const distance = reach_m * AWAY_REACHES * this.zoom;
    const flat = distance * Math.cos(this.lift_rad);
    goal.set(
      position.x - Math.sin(heading) * flat,
      Math.max(LOWEST_M, position.y + distance * Math.sin(this.lift_rad)),
      position.z + Math.cos(heading) * flat,
    );
    const share = this.settled && this.name === 'chase' ? 1 - Math.exp(-dt_s / FOLLOW_S) : 1;
    camera.position.lerp(goal, share);
    // Walls between eye and craft bring the eye nearer.
    fromThree(this.from, position);
    fromThree(this.to, camera.position);
    const clear = space.clearShare(this.from, this.to, MARGIN_M);
    if (clear < 1) camera.position.lerpVectors(position, camera.position, Math.max(0.12, clear));
    look.copy(position).setY(position.y - reach_m * LOOKS_BELOW);
    this.setFov(FOV_DEG);
  }

  private setFov(degrees: number): void {
    if (Math.abs(this.camera.fov - degrees) < 0.05) return;
    this.camera.fov = degrees;
    this.camera.updateProjectionMatrix();
  }
}
