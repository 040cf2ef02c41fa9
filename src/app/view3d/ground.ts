/** The ground: two tones to the horizon, a grid that fades, water, markings, far ridges. */
import {
  BufferAttribute,
  BufferGeometry,
  Group,
  LineBasicMaterial,
  LineSegments,
  Matrix4,
  Mesh,
  MeshBasicMaterial,
  Quaternion,
  Vector3,
} from 'three';
import type { Marking, Scene, Solid } from '../../craft/scene.ts';
import { headingToThree, sizeToThree, toThree } from './axes.ts';
import { Facets } from './facets.ts';
import { BLENDED_UNDER, LAYER } from './layers.ts';
import type { ViewPalette } from './palette.ts';
import { isWater } from './siteModel.ts';

const GROUND_M = 2000;
const GRID = { step_m: 5, reach_m: 60, piece_m: 20, alpha: 0.8 };
const FINE_GRID = { step_m: 1, reach_m: 8, piece_m: 4, alpha: 0.45 };
/** Above this the fine grid is gone, m. */
const FINE_UP_TO_M = 7;
const RIDGE_M = 640;
const RIDGES = 40;
const RIPPLES = 90;
const UP = new Vector3(0, 1, 0);

export class GroundModel {
  readonly group = new Group();
  /** Things that go along with the eye: plain, ridge; and with the craft: grids. */
  private readonly plain: Mesh;
  private readonly ridge: Mesh | null;
  private readonly grid: LineSegments;
  private readonly fine: LineSegments;

  constructor(scene: Scene, palette: ViewPalette) {
    const half = GROUND_M / 2;
    const square = [
      new Vector3(-half, 0, half),
      new Vector3(half, 0, half),
      new Vector3(half, 0, -half),
      new Vector3(-half, 0, -half),
    ];
    this.plain = flat(new Facets().polygon(square, palette.ground), LAYER.ground);
    this.plain.userData.plain = true;
    this.ridge = scene.ground.tone === 'hall' ? null : ridge(palette);
    this.grid = grid(GRID, palette.grid);
    this.fine = grid(FINE_GRID, palette.grid);
    if (this.ridge !== null) this.group.add(this.ridge);
    this.group.add(this.plain);
    for (const solid of scene.solids) {
      if (isWater(solid)) this.group.add(...water(solid, palette));
    }
    if (scene.markings.length > 0) this.group.add(markings(scene.markings, palette));
    this.group.add(this.grid, this.fine);
  }

  follow(eye: Vector3, craft: Vector3): void {
    this.plain.position.set(eye.x, 0, eye.z);
    this.ridge?.position.set(eye.x, 0, eye.z);
    snap(this.grid, craft, GRID.step_m);
    snap(this.fine, craft, FINE_GRID.step_m);
    const share = Math.max(0, 1 - craft.y / FINE_UP_TO_M);
    this.fine.visible = share > 0.02;
    if (this.fine.material instanceof LineBasicMaterial) this.fine.material.opacity = share;
  }
}

function snap(grid: LineSegments, craft: Vector3, step_m: number): void {
  grid.position.set(Math.round(craft.x / step_m) * step_m, 0, Math.round(craft.z / step_m) * step_m);
}

/** Flat on the ground: drawn in order, never tested for depth, so that nothing flickers. */
function flat(facets: Facets, layer: number): Mesh {
  const mesh = new Mesh(
    facets.build(false),
    new MeshBasicMaterial({ vertexColors: true, depthTest: false, depthWrite: false }),
  );
  mesh.renderOrder = layer;
  mesh.frustumCulled = false;
  return mesh;
}

/** Lines that fade by a share of their own; blended, yet drawn before the solids. */
function fadingLines(points: readonly number[], rgba: readonly number[], layer: number): LineSegments {
  const geometry = new BufferGeometry();
  geometry.setAttribute('position', new BufferAttribute(new Float32Array(points), 3));
  geometry.setAttribute('color', new BufferAttribute(new Float32Array(rgba), 4));
  const lines = new LineSegments(
    geometry,
    new LineBasicMaterial({
      vertexColors: true,
      ...BLENDED_UNDER,
      depthTest: false,
    }),
  );
  lines.renderOrder = layer;
  lines.frustumCulled = false;
  return lines;
}

function grid(kind: typeof GRID, color: number): LineSegments {
  const { step_m, reach_m, piece_m, alpha } = kind;
  const points: number[] = [];
  const rgba: number[] = [];
  const tint = new MeshBasicMaterial({ color }).color;
  const corner = (x: number, z: number) => {
    points.push(x, 0, z);
    const share = Math.max(0, 1 - Math.hypot(x, z) / reach_m);
    rgba.push(tint.r, tint.g, tint.b, alpha * share);
  };
  for (let across = -reach_m; across <= reach_m; across += step_m) {
    for (let along = -reach_m; along < reach_m; along += piece_m) {
      const end = Math.min(reach_m, along + piece_m);
      if (Math.hypot(across, Math.min(Math.abs(along), Math.abs(end))) >= reach_m) continue;
      corner(across, along);
      corner(across, end);
      corner(along, across);
      corner(end, across);
    }
  }
  return fadingLines(points, rgba, LAYER.grid);
}

/** Far hills all around: a heading to hold on to. The same ones everywhere. */
function ridge(palette: ViewPalette): Mesh {
  const facets = new Facets();
  const height = (i: number) =>
    10 + 9 * Math.sin((i / RIDGES) * 2 * Math.PI * 3 + 1) + 6 * Math.sin((i / RIDGES) * 2 * Math.PI * 7);
  const at = (i: number, y: number) => {
    const angle = (2 * Math.PI * i) / RIDGES;
    return new Vector3(RIDGE_M * Math.sin(angle), y, -RIDGE_M * Math.cos(angle));
  };
  for (let i = 0; i < RIDGES; i++) {
    const next = (i + 1) % RIDGES;
    facets.polygon([at(i, 0), at(next, 0), at(next, height(next)), at(i, height(i))], palette.ridge);
  }
  const mesh = flat(facets, LAYER.far);
  if (mesh.material instanceof MeshBasicMaterial) mesh.material.fog = false;
  return mesh;
}

function water(solid: Solid, palette: ViewPalette): [Mesh, LineSegments] {
  const place = toThree(new Vector3(), solid.centre_m[0], solid.centre_m[1], 0);
  const size = sizeToThree(new Vector3(), ...solid.size_m);
  const turn = new Quaternion().setFromAxisAngle(UP, headingToThree((solid.heading_deg * Math.PI) / 180));
  const matrix = new Matrix4().compose(place, turn, new Vector3(1, 1, 1));
  const at = (x: number, z: number) => new Vector3(x * size.x, 0, z * size.z).applyMatrix4(matrix);
  const sheet = new Facets().polygon(
    [at(-0.5, 0.5), at(0.5, 0.5), at(0.5, -0.5), at(-0.5, -0.5)],
    palette.solids.water,
  );
  const points: number[] = [];
  const rgba: number[] = [];
  const tint = new MeshBasicMaterial({ color: palette.ripple }).color;
  const long = size.x >= size.z;
  for (let i = 1; i <= RIPPLES; i++) {
    const [u, v] = [((i * 0.7549) % 1) - 0.5, ((i * 0.5698) % 1) - 0.5];
    const half = (0.6 + ((i * 0.37) % 1) * 1.6) / (long ? size.x : size.z);
    const [a, b] = long ? [at(u - half, v), at(u + half, v)] : [at(u, v - half), at(u, v + half)];
    points.push(a.x, 0, a.z, b.x, 0, b.z);
    rgba.push(tint.r, tint.g, tint.b, 0.9, tint.r, tint.g, tint.b, 0.9);
  }
  return [flat(sheet, LAYER.water), fadingLines(points, rgba, LAYER.water + 0.5)];
}

function markings(all: readonly Marking[], palette: ViewPalette): Mesh {
  const facets = new Facets();
  // Paths lie under paint.
  const ordered = [...all].sort((a, b) => (a.tone === b.tone ? 0 : a.tone === 'path' ? -1 : 1));
  for (const one of ordered) {
    const places = one.line_m.map(([north, east]) => toThree(new Vector3(), north, east, 0));
    const color = palette.markings[one.tone];
    for (let i = 0; i + 1 < places.length; i++) {
      const along = new Vector3().subVectors(places[i + 1], places[i]).normalize();
      const side = new Vector3(along.z, 0, -along.x).multiplyScalar(one.width_m / 2);
      const [a, b] = [places[i], places[i + 1]];
      facets.polygon(
        [a.clone().sub(side), b.clone().sub(side), b.clone().add(side), a.clone().add(side)],
        color,
      );
      if (i > 0 && one.width_m > 0.5) facets.polygon(roundAt(a, one.width_m / 2), color);
    }
  }
  return flat(facets, LAYER.marking);
}

function roundAt(centre: Vector3, radius: number): Vector3[] {
  return Array.from({ length: 10 }, (_, i) => {
    const angle = (-2 * Math.PI * i) / 10;
    return new Vector3(centre.x + radius * Math.cos(angle), 0, centre.z + radius * Math.sin(angle));
  });
}
