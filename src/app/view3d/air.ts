/** What moves with the air: streaks, and an arrow beside the craft. */
import {
  BufferAttribute,
  BufferGeometry,
  ConeGeometry,
  CylinderGeometry,
  Group,
  LineBasicMaterial,
  LineSegments,
  Mesh,
  MeshBasicMaterial,
  Vector3,
} from 'three';
import type { ViewPalette } from './palette.ts';

const STREAKS = 46;
const BOX_M = 9;
/** Length of a streak as time of flight, s. */
const STREAK_S = 0.09;

export class AirModel {
  readonly streaks: LineSegments;
  readonly arrow = new Group();
  private readonly places = new Float32Array(3 * STREAKS);
  private readonly positions = new Float32Array(6 * STREAKS);
  private readonly shaft: Mesh;
  private readonly head: Mesh;
  private readonly direction = new Vector3();

  constructor(palette: ViewPalette) {
    const geometry = new BufferGeometry();
    geometry.setAttribute('position', new BufferAttribute(this.positions, 3));
    this.streaks = new LineSegments(
      geometry,
      new LineBasicMaterial({ color: palette.wind, transparent: true, opacity: 0.55 }),
    );
    this.streaks.frustumCulled = false;
    // A low-discrepancy scatter: even, and the same each time.
    for (let i = 0; i < STREAKS; i++) {
      for (let axis = 0; axis < 3; axis++) {
        this.places[3 * i + axis] = (((i + 1) * [0.8192, 0.671, 0.5497][axis]) % 1) * 2 * BOX_M - BOX_M;
      }
    }
    const material = new MeshBasicMaterial({ color: palette.wind });
    this.shaft = new Mesh(new CylinderGeometry(0.01, 0.01, 1, 5), material);
    this.head = new Mesh(new ConeGeometry(0.035, 0.09, 6), material);
    this.arrow.add(this.shaft, this.head);
  }

  /** Moves with wind `velocity` (three's axes) around the craft at `centre`. */
  update(
    centre: Vector3,
    velocity: Vector3,
    reach: number,
    dt_s: number,
    streaks: boolean,
    arrow: boolean,
  ): void {
    const speed = velocity.length();
    this.streaks.visible = streaks && speed > 0.3;
    if (this.streaks.visible) this.moveStreaks(centre, velocity, dt_s);
    this.arrow.visible = arrow && speed > 0.2;
    if (!this.arrow.visible) return;
    const length = Math.min(2.4, 0.11 * speed) * Math.max(0.6, reach * 2);
    this.direction.copy(velocity).divideScalar(speed);
    this.arrow.position.copy(centre).setY(centre.y + reach * 1.5);
    this.arrow.quaternion.setFromUnitVectors(UP, this.direction);
    this.shaft.scale.set(1, length, 1);
    this.shaft.position.y = -length / 2;
    this.head.position.y = 0.04;
  }

  private moveStreaks(centre: Vector3, velocity: Vector3, dt_s: number): void {
    const v = [velocity.x, velocity.y, velocity.z];
    const c = [centre.x, centre.y, centre.z];
    for (let i = 0; i < STREAKS; i++) {
      for (let axis = 0; axis < 3; axis++) {
        const k = 3 * i + axis;
        // World places, wrapped into a box around the craft.
        let place = this.places[k] + v[axis] * dt_s - c[axis];
        place = place - 2 * BOX_M * Math.floor((place + BOX_M) / (2 * BOX_M)) + c[axis];
        this.places[k] = place;
        this.positions[6 * i + axis] = place;
        this.positions[6 * i + 3 + axis] = place - v[axis] * STREAK_S;
      }
      if (this.positions[6 * i + 1] < 0.05) this.positions[6 * i + 4] = this.positions[6 * i + 1] = 0.05;
    }
    this.streaks.geometry.getAttribute('position').needsUpdate = true;
  }
}

const UP = new Vector3(0, 1, 0);
