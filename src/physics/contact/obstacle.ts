/** Solids of the scene as cannon-es boxes, with the cheap distances that decide whether to look closer. */
import { Body, Box, Quaternion, Vec3 } from 'cannon-es';
import type { Solid } from '../../craft/scene.ts';
import { RAD_PER_DEG } from '../../math/angles.ts';

/** A box turned about the vertical only. Lengths in m, world axes north, east, down. */
export class Obstacle {
  readonly name: string;
  readonly body: Body;
  private readonly centre: readonly [number, number, number];
  private readonly half: readonly [number, number, number];
  private readonly cos: number;
  private readonly sin: number;
  /** Half extents of the upright box along north, east, down that holds it. */
  private readonly reach: readonly [number, number, number];

  constructor(solid: Solid) {
    const [sx, sy, sz] = solid.size_m;
    const heading = solid.heading_deg * RAD_PER_DEG;
    this.name = solid.name;
    this.centre = solid.centre_m;
    this.half = [sx / 2, sy / 2, sz / 2];
    this.cos = Math.cos(heading);
    this.sin = Math.sin(heading);
    this.reach = [
      Math.abs(this.cos) * this.half[0] + Math.abs(this.sin) * this.half[1],
      Math.abs(this.sin) * this.half[0] + Math.abs(this.cos) * this.half[1],
      this.half[2],
    ];
    this.body = new Body({ mass: 0, shape: new Box(new Vec3(...this.half)) });
    this.body.position.set(...solid.centre_m);
    this.body.quaternion.copy(new Quaternion().setFromAxisAngle(new Vec3(0, 0, 1), heading));
  }

  /** Distance from a point to the upright box around the solid: at most the distance to the solid; 0 inside. */
  boundDistance(x: number, y: number, z: number): number {
    const ax = Math.max(0, Math.abs(x - this.centre[0]) - this.reach[0]);
    const ay = Math.max(0, Math.abs(y - this.centre[1]) - this.reach[1]);
    const az = Math.max(0, Math.abs(z - this.centre[2]) - this.reach[2]);
    return Math.sqrt(ax * ax + ay * ay + az * az);
  }

  /** Distance from a point to the solid; 0 inside. */
  distance(x: number, y: number, z: number): number {
    const dx = x - this.centre[0];
    const dy = y - this.centre[1];
    const ax = Math.max(0, Math.abs(this.cos * dx + this.sin * dy) - this.half[0]);
    const ay = Math.max(0, Math.abs(this.cos * dy - this.sin * dx) - this.half[1]);
    const az = Math.max(0, Math.abs(z - this.centre[2]) - this.half[2]);
    return Math.sqrt(ax * ax + ay * ay + az * az);
  }

  /** Whether a place on the ground lies under or over it. */
  covers(x: number, y: number): boolean {
    return this.distance(x, y, this.centre[2]) === 0;
  }
}
