/** What helps to judge height and way: shadow and ring on what lies below, a pole with metres, the trail. */
import {
  BufferAttribute,
  BufferGeometry,
  Color,
  LineBasicMaterial,
  LineSegments,
  Mesh,
  MeshBasicMaterial,
  Vector3,
} from 'three';
import { Facets } from './facets.ts';
import { BLENDED_UNDER, LAYER } from './layers.ts';
import type { ViewPalette } from './palette.ts';

const SHADOW_SIDES = 20;
/** Metres that the pole can count. */
const POLE_MARKS = 60;
const MARK_M = 0.1;
const TRAIL_POINTS = 240;
const TRAIL_EVERY_S = 0.06;
/** A longer way between two frames is a restart or a rewind: the trail begins anew. */
const JUMP_M = 4;
/** Above the surface, so that it lies on it. */
const LIFT_M = 0.012;

export class HeightMarks {
  readonly shadow: Mesh;
  readonly ring: LineSegments;
  readonly pole: LineSegments;

  constructor(
    private readonly reach_m: number,
    palette: ViewPalette,
  ) {
    const ring = Array.from({ length: SHADOW_SIDES }, (_, i) => {
      const angle = (-2 * Math.PI * i) / SHADOW_SIDES;
      return new Vector3(reach_m * Math.cos(angle), 0, reach_m * Math.sin(angle));
    });
    this.shadow = new Mesh(
      new Facets()
        .polygon(
          ring.map((p) => p.clone().multiplyScalar(0.72)),
          palette.shadow,
        )
        .build(false),
      new MeshBasicMaterial({
        vertexColors: true,
        ...BLENDED_UNDER,
        polygonOffset: true,
        polygonOffsetFactor: -2,
        polygonOffsetUnits: -2,
      }),
    );
    this.ring = lines(
      ring.flatMap((from, i) => {
        const to = ring[(i + 1) % SHADOW_SIDES];
        return [from.x, 0, from.z, to.x, 0, to.z];
      }),
      palette.mark,
      0.4,
    );
    const marks: number[] = [0, 0, 0, 0, 1, 0];
    for (let m = 1; m <= POLE_MARKS; m++) {
      const half = m % 5 === 0 ? 2 * MARK_M : MARK_M;
      marks.push(-half, m, 0, half, m, 0, 0, m, -half, 0, m, half);
    }
    this.pole = lines(marks, palette.mark, 0.55);
    this.shadow.renderOrder = this.ring.renderOrder = this.pole.renderOrder = LAYER.solid + 0.5;
  }

  /** For a craft at `place` over a surface at height `floor_m`. */
  update(place: Vector3, floor_m: number): void {
    const { shadow, ring, pole, reach_m } = this;
    const height = Math.max(0, place.y - floor_m);
    const y = floor_m + LIFT_M;
    shadow.position.set(place.x, y, place.z);
    const spread = 1 + 0.05 * height;
    shadow.scale.set(spread, 1, spread);
    if (shadow.material instanceof MeshBasicMaterial) shadow.material.opacity = 0.36 / (1 + 0.14 * height);
    ring.position.set(place.x, y, place.z);
    ring.visible = pole.visible = height > 1.2 * reach_m;
    if (!pole.visible) return;
    pole.position.set(place.x, floor_m, place.z);
    // The first two points are the pole, then four a metre.
    const top = pole.geometry.getAttribute('position');
    top.setY(1, height);
    top.needsUpdate = true;
    pole.geometry.setDrawRange(0, 2 + 4 * Math.min(POLE_MARKS, Math.floor(height - 0.3)));
  }
}

function lines(points: readonly number[], color: number, opacity: number): LineSegments {
  const geometry = new BufferGeometry();
  geometry.setAttribute('position', new BufferAttribute(new Float32Array(points), 3));
  const one = new LineSegments(geometry, new LineBasicMaterial({ color, transparent: true, opacity }));
  one.frustumCulled = false;
  return one;
}

/** The way of the last quarter minute, fading. */
export class Trail {
  readonly lines: LineSegments;
  private readonly places = new Float32Array(3 * TRAIL_POINTS);
  private readonly positions = new Float32Array(6 * (TRAIL_POINTS - 1));
  private count = 0;
  private since_s = 0;

  constructor(palette: ViewPalette) {
    const tint = new Color(palette.thrust);
    const rgba = new Float32Array(8 * (TRAIL_POINTS - 1));
    for (let i = 0; i < 2 * (TRAIL_POINTS - 1); i++) {
      const age = Math.ceil(i / 2) / (TRAIL_POINTS - 1);
      rgba.set([tint.r, tint.g, tint.b, 0.7 * (1 - age)], 4 * i);
    }
    const geometry = new BufferGeometry();
    geometry.setAttribute('position', new BufferAttribute(this.positions, 3));
    geometry.setAttribute('color', new BufferAttribute(rgba, 4));
    geometry.setDrawRange(0, 0);
    this.lines = new LineSegments(
      geometry,
      new LineBasicMaterial({ vertexColors: true, transparent: true, depthWrite: false }),
    );
    this.lines.frustumCulled = false;
    this.lines.renderOrder = LAYER.air;
  }

  /** Newest place first. */
  update(place: Vector3, dt_s: number, visible: boolean): void {
    this.lines.visible = visible;
    const { places } = this;
    const jump = Math.hypot(place.x - places[0], place.y - places[1], place.z - places[2]);
    if (this.count > 0 && jump > JUMP_M) this.count = 0;
    this.since_s += dt_s;
    if (this.count === 0 || this.since_s >= TRAIL_EVERY_S) {
      places.copyWithin(3, 0, 3 * (TRAIL_POINTS - 1));
      this.count = Math.min(TRAIL_POINTS, this.count + 1);
      this.since_s = 0;
    }
    places[0] = place.x;
    places[1] = place.y;
    places[2] = place.z;
    if (!visible) return;
    for (let i = 0; i + 1 < this.count; i++) {
      for (let k = 0; k < 6; k++) this.positions[6 * i + k] = places[3 * i + k];
    }
    this.lines.geometry.setDrawRange(0, 2 * Math.max(0, this.count - 1));
    this.lines.geometry.getAttribute('position').needsUpdate = true;
  }
}
