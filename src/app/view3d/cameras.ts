/** Four ways to look: chase, on board, from the pilot's standing place, free. */
import type { Quaternion} from 'three';
import { PerspectiveCamera, Vector3 } from 'three';
import { toThree } from './axes.ts';

export type CameraName = 'chase' | 'onboard' | 'pilot' | 'free';
export const CAMERAS: readonly CameraName[] = ['chase', 'onboard', 'pilot', 'free'];

const FOV_DEG = 52;
/** Chase camera follows with this time constant, s. */
const FOLLOW_S = 0.18;

export class CameraRig {
  readonly camera = new PerspectiveCamera(FOV_DEG, 1, 0.06, 1200);
  name: CameraName = 'chase';
  private turn_rad = 0;
  private lift_rad = 0.35;
  private zoom = 1;
  private heading_rad = 0;
  private settled = false;
  private readonly goal = new Vector3();
  private readonly look = new Vector3();
  private readonly forward = new Vector3();
  private readonly pilot = new Vector3();

  setPilot(north: number, east: number, down: number): void {
    toThree(this.pilot, north, east, down);
  }

  choose(name: CameraName): void {
    this.name = name;
    this.settled = false;
    if (name !== 'free') {
      this.turn_rad = 0;
      this.lift_rad = 0.35;
    }
  }

  /** Free look: radians of turn and lift, factor of distance. */
  drag(turn: number, lift: number): void {
    this.turn_rad += turn;
    this.lift_rad = Math.max(-1.2, Math.min(1.5, this.lift_rad + lift));
  }

  zoomBy(factor: number): void {
    this.zoom = Math.max(0.3, Math.min(8, this.zoom * factor));
  }

  /** Places the camera for the craft at `position` and `attitude`; `reach` is its size, m. */
  update(position: Vector3, attitude: Quaternion, reach: number, dt_s: number): void {
    const { camera, forward, goal, look } = this;
    forward.set(0, 0, -1).applyQuaternion(attitude);
    const flat = Math.hypot(forward.x, forward.z);
    if (flat > 0.2) this.heading_rad = Math.atan2(forward.x, -forward.z);
    camera.up.set(0, 1, 0);
    let fov = FOV_DEG;
    if (this.name === 'onboard') {
      camera.up.set(0, 1, 0).applyQuaternion(attitude);
      camera.position
        .copy(position)
        .addScaledVector(forward, reach * 0.62)
        .addScaledVector(camera.up, reach * 0.16);
      look.copy(camera.position).addScaledVector(forward, 10).addScaledVector(camera.up, -1);
      fov = 78;
    } else if (this.name === 'pilot') {
      camera.position.copy(this.pilot);
      look.copy(position);
      const distance = this.pilot.distanceTo(position);
      // Eyes rest on the craft: it keeps a readable size until it is far away.
      fov = Math.max(9, Math.min(58, (2 * Math.atan((reach * 6) / Math.max(1, distance)) * 180) / Math.PI));
    } else {
      const heading = this.name === 'free' ? this.turn_rad : this.heading_rad + this.turn_rad;
      const distance = reach * 6.2 * this.zoom;
      const flatDistance = distance * Math.cos(this.lift_rad);
      goal.set(
        position.x - Math.sin(heading) * flatDistance,
        Math.max(0.15, position.y + distance * Math.sin(this.lift_rad)),
        position.z + Math.cos(heading) * flatDistance,
      );
      const share = this.settled && this.name === 'chase' ? 1 - Math.exp(-dt_s / FOLLOW_S) : 1;
      camera.position.lerp(goal, share);
      look.copy(position).setY(position.y + reach * 0.2);
    }
    this.settled = true;
    camera.lookAt(look);
    if (Math.abs(camera.fov - fov) > 0.05) {
      camera.fov = fov;
      camera.updateProjectionMatrix();
    }
    camera.updateMatrixWorld();
  }
}
