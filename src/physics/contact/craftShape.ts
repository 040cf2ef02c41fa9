/**
 * What of the craft can touch something: spheres at the feet, the motors, the rims of the discs, along the
 * arms and at the hull. Spheres are quick, and they have no edges that catch.
 */
import { Body, Quaternion, Sphere, Vec3 } from 'cannon-es';

const FOOT_RADIUS_M = 0.008;
const TIP_RADIUS_M = 0.004;
/** Motor, arm and hull against the propeller's radius; common practice, no source. */
const MOTOR_PER_RADIUS = 0.11;
const ARM_PER_RADIUS = 0.07;
const HULL_PER_RADIUS = 0.32;
/** Directions from each hub, seen from the middle of the craft, in which a rim sphere stands. */
const RIM_ANGLES_DEG = [0, 60, -60, 120, -120];
/** Shares of an arm's length at which a sphere stands. */
const ARM_SHARES = [0.4, 0.7];

export interface CraftShape {
  readonly mass_kg: number;
  readonly inertiaDiagonal_kgm2: readonly [number, number, number];
  /** 4 × xyz from the centre of mass, body axes, FL, FR, RL, RR. */
  readonly rotorPositions_m: readonly (readonly number[])[];
  readonly propellerRadius_m: number;
  /** Sole of a foot below the centre of mass, and feet from the middle fore and aft and to each side, m. */
  readonly legHeight_m: number;
  readonly legHalfTrack_m: number;
}

interface Ball {
  readonly x: number;
  readonly y: number;
  readonly z: number;
  readonly radius_m: number;
}

/** The craft as a cannon-es body that holds, for one step, only the spheres that may touch, swollen by a skin. */
export class CraftBody {
  readonly body: Body;
  /** Body-axes centres, xyz, and radii of all spheres. */
  readonly centres_m: Float64Array;
  readonly radii_m: Float64Array;
  /** Radius about the centre of mass that holds every sphere. */
  readonly bound_m: number;
  private readonly spheres: readonly Sphere[];
  private readonly offsets: readonly Vec3[];
  private readonly upright = new Quaternion();

  constructor(shape: CraftShape) {
    const balls = ballsOf(shape);
    this.body = new Body({ mass: shape.mass_kg, linearDamping: 0, angularDamping: 0 });
    this.centres_m = Float64Array.from(balls.flatMap((ball) => [ball.x, ball.y, ball.z]));
    this.radii_m = Float64Array.from(balls.map((ball) => ball.radius_m));
    this.bound_m = Math.max(...balls.map((ball) => Math.hypot(ball.x, ball.y, ball.z) + ball.radius_m));
    this.spheres = balls.map((ball) => new Sphere(ball.radius_m));
    this.offsets = balls.map((ball) => new Vec3(ball.x, ball.y, ball.z));
    for (const sphere of this.spheres) sphere.body = this.body;
    const [ix, iy, iz] = shape.inertiaDiagonal_kgm2;
    this.body.inertia.set(ix, iy, iz);
    this.body.invInertia.set(1 / ix, 1 / iy, 1 / iz);
  }

  /** No sphere at all. */
  clear(): void {
    this.body.shapes.length = 0;
    this.body.shapeOffsets.length = 0;
    this.body.shapeOrientations.length = 0;
    this.body.aabbNeedsUpdate = true;
  }

  /** Sphere `i`, swollen by `skin_m` so that contacts are found a step before they close. */
  include(i: number, skin_m: number): void {
    const { body } = this;
    const sphere = this.spheres[i];
    sphere.radius = this.radii_m[i] + skin_m;
    sphere.boundingSphereRadius = sphere.radius;
    body.shapes.push(sphere);
    body.shapeOffsets.push(this.offsets[i]);
    body.shapeOrientations.push(this.upright);
    body.boundingRadius = this.bound_m + skin_m;
  }
}

function ballsOf(shape: CraftShape): Ball[] {
  const { legHalfTrack_m: t, legHeight_m, propellerRadius_m: R } = shape;
  const balls: Ball[] = [{ x: 0, y: 0, z: 0, radius_m: Math.min(HULL_PER_RADIUS * R, 0.4 * legHeight_m) }];
  for (const sx of [1, -1]) {
    for (const sy of [1, -1]) {
      balls.push({ x: sx * t, y: sy * t, z: legHeight_m - FOOT_RADIUS_M, radius_m: FOOT_RADIUS_M });
    }
  }
  for (const [x, y, z] of shape.rotorPositions_m) {
    balls.push({ x, y, z, radius_m: MOTOR_PER_RADIUS * R });
    for (const share of ARM_SHARES) {
      balls.push({ x: share * x, y: share * y, z: share * z, radius_m: ARM_PER_RADIUS * R });
    }
    for (const degrees of RIM_ANGLES_DEG) {
      const angle = Math.atan2(y, x) + (degrees * Math.PI) / 180;
      balls.push({ x: x + R * Math.cos(angle), y: y + R * Math.sin(angle), z, radius_m: TIP_RADIUS_M });
    }
  }
  return balls;
}
