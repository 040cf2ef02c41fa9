/** The site's solids with quiet edges and height lines, and the place where the pilot stands. */
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
  Quaternion,
  Vector3,
} from 'three';
import type { Scene, Solid } from '../../craft/scene.ts';
import { headingToThree, sizeToThree, toThree } from './axes.ts';
import { Facets } from './facets.ts';
import { LAYER } from './layers.ts';
import type { ViewPalette } from './palette.ts';
import { SolidSpace } from './solids.ts';

const UP = new Vector3(0, 1, 0);
const ONE = new Vector3(1, 1, 1);
/** Lines around upright faces, so that height can be read off them. */
const COURSE_M = 2;
const COURSED: readonly Solid['look'][] = ['wall', 'pier', 'rock'];
/** Share of a solid's own colour in a course line: a little less than its darkest side shows. */
const COURSE_SHARE = 0.44;

export class SiteModel {
  readonly group = new Group();
  /** What stands: the scene's solids without its water, and last the pilot. */
  readonly space: SolidSpace;
  /** A mesh for each of them, in the same order. */
  readonly meshes: readonly Mesh[];
  readonly pilot: Mesh;

  constructor(scene: Scene, palette: ViewPalette) {
    const standing = scene.solids.filter((solid) => !isWater(solid));
    this.pilot = pilotMesh(scene, palette);
    this.space = new SolidSpace([...standing, pilotSolid(scene)]);
    this.meshes = [...standing.map((solid) => solidMesh(solid, palette)), this.pilot];
    this.group.add(...this.meshes);
  }

  /** The same in a few pieces instead of two a solid: for WebGL, which pays by the piece. */
  merged(): Group {
    const standing = this.meshes.filter((mesh) => mesh !== this.pilot);
    const edges = standing.flatMap((mesh) => mesh.children.filter((child) => child instanceof LineSegments));
    const group = new Group();
    if (standing.length > 0) {
      const faces = new Mesh(joined(standing.map((mesh) => mesh.geometry)), standing[0].material);
      const lines = new LineSegments(joined(edges.map((edge) => edge.geometry)), edges[0].material);
      for (const part of [faces, lines]) {
        part.renderOrder = LAYER.solid;
        part.frustumCulled = false;
        group.add(part);
      }
    }
    return group.add(this.pilot);
  }
}

/** Geometries of places and colours in one. */
function joined(all: readonly BufferGeometry[]): BufferGeometry {
  const geometry = new BufferGeometry();
  for (const name of ['position', 'color']) {
    const parts = all.map((one) => one.getAttribute(name).array);
    const whole = new Float32Array(parts.reduce((sum, part) => sum + part.length, 0));
    let at = 0;
    for (const part of parts) {
      whole.set(part, at);
      at += part.length;
    }
    geometry.setAttribute(name, new BufferAttribute(whole, 3));
  }
  return geometry;
}

/** Water is drawn as a sheet on the ground (ground.ts). */
export function isWater(solid: Solid): boolean {
  return solid.look === 'water' && !solid.collides;
}

function pilotSolid(scene: Scene): Solid {
  const [north, east, down] = scene.pilot_m;
  const size_m: Solid['size_m'] = [0.5, 0.5, 1.7];
  return {
    name: 'pilot',
    centre_m: [north, east, down + 0.85],
    size_m,
    heading_deg: 0,
    look: 'wall',
    collides: false,
  };
}

function placement(solid: Solid): Matrix4 {
  const place = toThree(new Vector3(), ...solid.centre_m);
  const turn = new Quaternion().setFromAxisAngle(UP, headingToThree((solid.heading_deg * Math.PI) / 180));
  return new Matrix4().compose(place, turn, ONE);
}

function solidMesh(solid: Solid, palette: ViewPalette): Mesh {
  const matrix = placement(solid);
  const size = sizeToThree(new Vector3(), ...solid.size_m);
  const color = palette.solids[solid.look];
  const mesh = new Mesh(
    new Facets().box(matrix, size, color).build(),
    // Faces a hair back, so that their edges stay whole.
    new MeshBasicMaterial({
      vertexColors: true,
      polygonOffset: true,
      polygonOffsetFactor: 1,
      polygonOffsetUnits: 1,
    }),
  );
  mesh.renderOrder = LAYER.solid;
  mesh.add(edges(solid, size, matrix, palette));
  return mesh;
}

function edges(solid: Solid, size: Vector3, matrix: Matrix4, palette: ViewPalette): LineSegments {
  const points: number[] = [];
  const colors: number[] = [];
  const point = new Vector3();
  const edge = new Color(palette.edge);
  const course = new Color(palette.solids[solid.look]).multiplyScalar(COURSE_SHARE);
  const faces: number[] = [];
  const line = (color: Color, ...ends: readonly (readonly [number, number, number])[]) => {
    for (let i = 0; i + 1 < ends.length; i += 2) faces.push(facesOf(ends[i]) & facesOf(ends[i + 1]));
    for (const [x, y, z] of ends) {
      point.set((x * size.x) / 2, (y * size.y) / 2, (z * size.z) / 2).applyMatrix4(matrix);
      points.push(point.x, point.y, point.z);
      colors.push(color.r, color.g, color.b);
    }
  };
  const around = (color: Color, y: number) => {
    line(
      color,
      [-1, y, -1],
      [1, y, -1],
      [1, y, -1],
      [1, y, 1],
      [1, y, 1],
      [-1, y, 1],
      [-1, y, 1],
      [-1, y, -1],
    );
  };
  around(edge, 1);
  around(edge, -1);
  for (const x of [-1, 1]) for (const z of [-1, 1]) line(edge, [x, -1, z], [x, 1, z]);
  if (COURSED.includes(solid.look)) {
    const bottom = -(solid.centre_m[2] + size.y / 2);
    for (let y = Math.ceil((bottom + 0.5) / COURSE_M) * COURSE_M; y < bottom + size.y - 0.5; y += COURSE_M) {
      around(course, ((y - bottom) / size.y) * 2 - 1);
    }
  }
  const geometry = new BufferGeometry();
  geometry.setAttribute('position', new BufferAttribute(new Float32Array(points), 3));
  geometry.setAttribute('color', new BufferAttribute(new Float32Array(colors), 3));
  geometry.userData.faces = new Uint8Array(faces);
  const lines = new LineSegments(geometry, new LineBasicMaterial({ vertexColors: true }));
  lines.renderOrder = LAYER.solid;
  return lines;
}

/** Faces of the unit box on which a point lies, in the bits of SolidSpace.facesSeen. */
function facesOf([x, y, z]: readonly [number, number, number]): number {
  return (
    (z === -1 ? 1 : 0) |
    (z === 1 ? 2 : 0) |
    (x === 1 ? 4 : 0) |
    (x === -1 ? 8 : 0) |
    (y === -1 ? 16 : 0) |
    (y === 1 ? 32 : 0)
  );
}

/** A figure where the pilot stands, feet on the ground below the eyes. */
function pilotMesh(scene: Scene, palette: ViewPalette): Mesh {
  const [north, east, down] = scene.pilot_m;
  const eyes = -down;
  const feet = Math.max(0, eyes - 1.7);
  const facets = new Facets();
  const part = (y: number) => new Matrix4().setPosition(toThree(new Vector3(), north, east, -(feet + y)));
  facets.prism(part(0.42), 0.13, 0.17, 0.84, 6, palette.hull);
  facets.prism(part(1.12), 0.17, 0.24, 0.56, 6, palette.thrust);
  facets.prism(part(1.55), 0.12, 0.1, 0.26, 6, palette.arm);
  const mesh = new Mesh(facets.build(), new MeshBasicMaterial({ vertexColors: true }));
  mesh.renderOrder = LAYER.solid;
  return mesh;
}
