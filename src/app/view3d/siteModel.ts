/** The site: ground with a grid that fades, solids with quiet edges, the pilot's place. */
import type {
  Vector3} from 'three';
import {
  BoxGeometry,
  BufferAttribute,
  BufferGeometry,
  CylinderGeometry,
  EdgesGeometry,
  Group,
  LineBasicMaterial,
  LineSegments,
  Mesh,
  MeshBasicMaterial,
  MeshLambertMaterial,
  PlaneGeometry
} from 'three';
import type { Scene } from '../../craft/scene.ts';
import { toThree } from './axes.ts';
import type { ViewPalette } from './palette.ts';

const GROUND_M = 900;
const GRID_REACH_M = 100;
const GRID_STEP_M = 5;

/** `userData.layer` tells the canvas painter what lies flat under what. */
export const LAYER_GROUND = 0;
export const LAYER_FLAT = 1;
export const LAYER_THINGS = 2;

export function siteModel(scene: Scene, palette: ViewPalette): Group {
  const group = new Group();
  const ground = new Mesh(
    new PlaneGeometry(GROUND_M, GROUND_M),
    new MeshBasicMaterial({ color: palette.ground }),
  );
  ground.rotation.x = -Math.PI / 2;
  ground.position.y = -0.02;
  ground.userData.layer = LAYER_GROUND;
  group.add(ground, grid(palette));
  for (const solid of scene.solids) {
    const [sx, sy, sz] = solid.size_m;
    const geometry = new BoxGeometry(sy, sz, sx);
    const water = solid.look === 'water';
    const color = palette.solids[solid.look];
    const mesh = new Mesh(
      geometry,
      water ? new MeshBasicMaterial({ color }) : new MeshLambertMaterial({ color, flatShading: true }),
    );
    toThree(mesh.position, solid.centre_m[0], solid.centre_m[1], solid.centre_m[2]);
    mesh.rotation.y = (-solid.heading_deg * Math.PI) / 180;
    mesh.userData.layer = water ? LAYER_FLAT : LAYER_THINGS;
    group.add(mesh);
    if (!water) {
      const edges = new LineSegments(
        new EdgesGeometry(geometry),
        new LineBasicMaterial({ color: palette.edge }),
      );
      mesh.add(edges);
    }
  }
  group.add(pilot(scene, palette));
  return group;
}

function grid(palette: ViewPalette): LineSegments {
  const points: number[] = [];
  for (let m = -GRID_REACH_M; m <= GRID_REACH_M; m += GRID_STEP_M) {
    // In pieces, so that each can fade by its own distance.
    for (let along = -GRID_REACH_M; along < GRID_REACH_M; along += 20) {
      points.push(m, 0, along, m, 0, along + 20, along, 0, m, along + 20, 0, m);
    }
  }
  const geometry = new BufferGeometry();
  geometry.setAttribute('position', new BufferAttribute(new Float32Array(points), 3));
  const lines = new LineSegments(geometry, new LineBasicMaterial({ color: palette.grid }));
  lines.userData.layer = LAYER_FLAT;
  return lines;
}

/** A small post where the pilot stands. */
function pilot(scene: Scene, palette: ViewPalette): Mesh {
  const [north, east, down] = scene.pilot_m;
  const height = Math.max(0.5, -down);
  const post = new Mesh(
    new CylinderGeometry(0.12, 0.2, height, 6),
    new MeshLambertMaterial({ color: palette.arm, flatShading: true }),
  );
  toThree(post.position as Vector3, north, east, -height / 2);
  post.userData.layer = LAYER_THINGS;
  post.userData.pilot = true;
  return post;
}
