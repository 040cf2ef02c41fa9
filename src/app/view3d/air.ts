/** What moves with the air: streaks around the craft, and an arrow above it. */
import {
  BufferAttribute,
  BufferGeometry,
  Color,
  Group,
  LineBasicMaterial,
  LineSegments,
  Matrix4,
  Mesh,
  MeshBasicMaterial,
  Vector3,
} from 'three';
import { Facets } from './facets.ts';
import { LAYER } from './layers.ts';
import type { ViewPalette } from './palette.ts';

const STREAKS = 130;
/** Half size of the box around the craft in which streaks live, m. */
const BOX_M = 5.5;
/** Length of a streak as time of flight, s. */
const STREAK_S = 0.11;
/** Slower air has neither streaks nor an arrow, m/s. */
const LEAST_MPS = 0.3;
const ARROW_M_PER_MPS = 0.075;
const LOWEST_M = 0.06;
const UP = new Vector3(0, 1, 0);

export class AirModel {
  readonly streaks: LineSegments;
  readonly arrow = new Group();
  private readonly places = new Float32Array(3 * STREAKS);
  private readonly positions = new Float32Array(6 * STREAKS);
  private readonly shades = new Float32Array(8 * STREAKS);
  private readonly shaft: Mesh;
  private readonly head: Mesh;
  private readonly direction = new Vector3();

  constructor(
    private readonly reach_m: number,
    palette: ViewPalette,
  ) {
    // A low-discrepancy scatter: even, and the same each time.
    for (let i = 0; i < STREAKS; i++) {
      for (let axis = 0; axis < 3; axis++) {
        this.places[3 * i + axis] = (((i + 1) * [0.8192, 0.671, 0.5497][axis]) % 1) * 2 * BOX_M - BOX_M;
      }
    }
    const tint = new Color(palette.wind);
    for (let i = 0; i < 2 * STREAKS; i++) this.shades.set([tint.r, tint.g, tint.b, 0], 4 * i);
    const geometry = new BufferGeometry();
    geometry.setAttribute('position', new BufferAttribute(this.positions, 3));
    geometry.setAttribute('color', new BufferAttribute(this.shades, 4));
    this.streaks = new LineSegments(
      geometry,
      new LineBasicMaterial({ vertexColors: true, transparent: true, depthWrite: false }),
    );
    this.streaks.frustumCulled = false;
    this.streaks.renderOrder = LAYER.air;
    const plain = new MeshBasicMaterial({ vertexColors: true });
    const thin = 0.03 * reach_m;
    const along = new Matrix4().setPosition(0, 0.5, 0);
    this.shaft = new Mesh(
      new Facets().box(along, new Vector3(thin, 1, thin), palette.wind).build(false),
      plain,
    );
    this.head = new Mesh(new Facets().prism(along, 0.38, 0, 1, 6, palette.wind).build(false), plain);
    this.head.scale.setScalar(0.2 * reach_m);
    this.arrow.add(this.shaft, this.head);
    this.arrow.traverse((part) => {
      part.renderOrder = LAYER.craft;
    });
  }

  /** Moves with wind `velocity` (three's axes) around the craft at `centre`. */
  update(
    centre: Vector3,
    velocity: Vector3,
    dt_s: number,
    shows: { readonly streaks: boolean; readonly wind: boolean },
  ): void {
    const speed = velocity.length();
    this.streaks.visible = shows.streaks && speed > LEAST_MPS;
    if (this.streaks.visible) this.moveStreaks(centre, velocity, speed, dt_s);
    this.arrow.visible = shows.wind && speed > LEAST_MPS;
    if (!this.arrow.visible) return;
    const head = 0.2 * this.reach_m;
    const length = head + ARROW_M_PER_MPS * speed * Math.max(0.5, 2.2 * this.reach_m);
    this.direction.copy(velocity).divideScalar(speed);
    this.arrow.position
      .copy(centre)
      .setY(centre.y + 1.35 * this.reach_m)
      .addScaledVector(this.direction, -length / 2);
    this.arrow.quaternion.setFromUnitVectors(UP, this.direction);
    this.shaft.scale.y = length - head;
    this.head.position.y = length - head;
  }

  private moveStreaks(centre: Vector3, velocity: Vector3, speed: number, dt_s: number): void {
    const { places, positions, shades } = this;
    const v = [velocity.x, velocity.y, velocity.z];
    const c = [centre.x, centre.y, centre.z];
    const strength = Math.min(0.8, 0.25 + 0.06 * speed);
    for (let i = 0; i < STREAKS; i++) {
      let out = 0;
      for (let axis = 0; axis < 3; axis++) {
        const k = 3 * i + axis;
        // World places, wrapped into the box around the craft.
        let place = places[k] + v[axis] * dt_s - c[axis];
        place -= 2 * BOX_M * Math.floor((place + BOX_M) / (2 * BOX_M));
        out = Math.max(out, Math.abs(place) / BOX_M);
        place += c[axis];
        places[k] = place;
        positions[6 * i + axis] = place;
        positions[6 * i + 3 + axis] = place - v[axis] * STREAK_S;
      }
      // They come and go at the box's walls, and none is drawn in the ground.
      const fade = positions[6 * i + 1] < LOWEST_M ? 0 : Math.min(1, 3 * (1 - out));
      shades[8 * i + 3] = strength * fade;
      shades[8 * i + 7] = 0;
    }
    this.streaks.geometry.getAttribute('position').needsUpdate = true;
    this.streaks.geometry.getAttribute('color').needsUpdate = true;
  }
}
