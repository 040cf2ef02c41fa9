/**
 * Contact with ground and scene through cannon-es, at a clean border. Free flight never comes here. Near
 * something solid one step of the body's motion is done by cannon-es: it gets pose, velocities and the free
 * accelerations (gravity, thrust, drag and the gyroscopic term are in them, which its own integrator leaves
 * out), finds contacts, solves them with friction, and hands pose and velocities back. Nothing stays in it
 * from step to step.
 *
 * Energy never grows through a contact: kinetic energy after the step is bounded by what it was plus the work
 * of the free forces over the step's real displacement; a solver's surplus is taken from the velocities.
 */
import {
  Body,
  Box,
  ContactMaterial,
  GSSolver,
  Material,
  Plane,
  Quaternion,
  SAPBroadphase,
  Sphere,
  Vec3,
  World,
} from 'cannon-es';
import type { Scene, Solid } from '../craft/scene.ts';
import { GRAVITY_MPS2, RAD_PER_DEG } from '../math/angles.ts';
import type { SnapshotReader, SnapshotWriter, Stateful } from '../math/snapshot.ts';
import { ATTITUDE, POSITION, RATES, VELOCITY } from './state.ts';

export interface ContactOptions {
  readonly scene: Scene;
  readonly mass_kg: number;
  readonly inertiaDiagonal_kgm2: readonly [number, number, number];
  /** 4 × xyz from the centre of mass, body axes, FL, FR, RL, RR. */
  readonly rotorPositions_m: readonly (readonly number[])[];
  readonly propellerRadius_m: number;
  /** Foot below the centre of mass, and feet from the middle, m. */
  readonly legHeight_m: number;
  readonly legHalfTrack_m: number;
}

const FOOT_RADIUS_M = 0.008;
const MOTOR_RADIUS_M = 0.014;
const TIP_RADIUS_M = 0.004;
/** Points of a disc's rim that are tried against solids. */
const RIM_POINTS = 8;
/** A craft slower than this, pressed down, for this many steps, is at rest and stays where it is. */
const REST_SPEED_MPS = 0.03;
const REST_RATE_RADPS = 0.15;
const REST_STEPS = 60;
/** Free acceleration that wakes it: less than this share of weight presses it down. */
const PRESSED_MPS2 = 0.5;

interface Obstacle {
  readonly name: string;
  readonly body: Body;
  /** Half sizes and inverse heading for the point test. */
  readonly half: readonly [number, number, number];
  readonly centre: readonly [number, number, number];
  readonly cos: number;
  readonly sin: number;
  /** Half extents of the upright box around it. */
  readonly reach: readonly [number, number, number];
}

export class ContactWorld implements Stateful {
  /** 1 where a rotor's disc struck something in the last step. */
  readonly struck = new Uint8Array(4);
  /** Names of what the craft touched in the last step: "ground" or a solid's name. */
  readonly touching: string[] = [];

  private readonly world: World;
  private readonly craft: Body;
  private readonly obstacles: Obstacle[];
  private readonly bodyNames = new Map<number, string>();
  private readonly bound_m: number;
  private stillSteps = 0;
  // Clearance found last and where: nothing can be near until the craft moved that far.
  private readonly checkedAt = new Float64Array(3);
  private clearance_m = -1;
  private readonly turned = new Vec3();

  constructor(private readonly options: ContactOptions) {
    const { scene } = options;
    this.bound_m = boundOf(options);
    // Gravity comes with the free accelerations; cannon-es bounds friction by this weight all the same.
    this.world = new World({ gravity: new Vec3(0, 0, 0), frictionGravity: new Vec3(0, 0, GRAVITY_MPS2) });
    this.world.broadphase = new SAPBroadphase(this.world);
    this.world.allowSleep = false;
    const solver = this.world.solver;
    if (solver instanceof GSSolver) solver.iterations = 30;
    const ground = new Material('ground');
    const craftMaterial = new Material('craft');
    this.world.addContactMaterial(
      new ContactMaterial(ground, craftMaterial, {
        friction: scene.ground.friction,
        restitution: scene.ground.restitution,
        contactEquationStiffness: 2e5 * options.mass_kg,
        contactEquationRelaxation: 6,
        frictionEquationStiffness: 2e5 * options.mass_kg,
        frictionEquationRelaxation: 6,
      }),
    );
    const floor = new Body({ mass: 0, material: ground, shape: new Plane() });
    // A cannon plane faces +z; the ground here faces up, −z.
    floor.quaternion.setFromAxisAngle(new Vec3(1, 0, 0), Math.PI);
    this.world.addBody(floor);
    this.bodyNames.set(floor.id, 'ground');
    this.obstacles = scene.solids.filter((solid) => solid.collides).map((solid) => obstacle(solid, ground));
    for (const one of this.obstacles) {
      this.world.addBody(one.body);
      this.bodyNames.set(one.body.id, one.name);
    }
    this.craft = craftBody(options, craftMaterial);
    this.world.addBody(this.craft);
  }

  /** Could the craft touch anything at this state? Allocates nothing; mostly one distance. */
  near(state: Float64Array): boolean {
    const x = state[POSITION];
    const y = state[POSITION + 1];
    const z = state[POSITION + 2];
    if (this.clearance_m > 0) {
      const dx = x - this.checkedAt[0];
      const dy = y - this.checkedAt[1];
      const dz = z - this.checkedAt[2];
      if (dx * dx + dy * dy + dz * dz < this.clearance_m * this.clearance_m) return false;
    }
    let clear = -z;
    for (const one of this.obstacles) {
      const ax = Math.max(0, Math.abs(x - one.centre[0]) - one.reach[0]);
      const ay = Math.max(0, Math.abs(y - one.centre[1]) - one.reach[1]);
      const az = Math.max(0, Math.abs(z - one.centre[2]) - one.reach[2]);
      clear = Math.min(clear, Math.sqrt(ax * ax + ay * ay + az * az));
    }
    this.clearance_m = clear - this.bound_m;
    this.checkedAt[0] = x;
    this.checkedAt[1] = y;
    this.checkedAt[2] = z;
    return this.clearance_m <= 0;
  }

  /**
   * One step with contact, from pose and velocities in `state` and the free accelerations there; writes them
   * back when something was touched.
   * @param linear_mps2 world axes, gravity included
   * @param angular_radps2 body axes, gyroscopic term included
   * @returns whether anything was touched
   */
  step(state: Float64Array, dt: number, linear_mps2: Float64Array, angular_radps2: Float64Array): boolean {
    const body = this.craft;
    this.struck.fill(0);
    this.touching.length = 0;
    this.findStrikes(state);
    if (this.atRest(state, linear_mps2)) {
      state.fill(0, VELOCITY, VELOCITY + 3);
      state.fill(0, RATES, RATES + 3);
      this.touching.push('ground');
      return true;
    }
    this.handOver(state, linear_mps2, angular_radps2);
    const before = this.kineticEnergy();
    const from = [body.position.x, body.position.y, body.position.z];
    this.world.step(dt);
    if (!this.noteContacts()) {
      this.stillSteps = 0;
      return this.struck.some((one) => one !== 0) && this.takeBack(state);
    }
    this.boundEnergy(before, from, linear_mps2, dt);
    this.takeBack(state);
    this.countStill(state, linear_mps2);
    return true;
  }

  private handOver(state: Float64Array, linear: Float64Array, angular: Float64Array): void {
    const { craft: body, turned } = this;
    const { mass_kg, inertiaDiagonal_kgm2: inertia } = this.options;
    body.position.set(state[POSITION], state[POSITION + 1], state[POSITION + 2]);
    body.quaternion.set(state[ATTITUDE + 1], state[ATTITUDE + 2], state[ATTITUDE + 3], state[ATTITUDE]);
    body.velocity.set(state[VELOCITY], state[VELOCITY + 1], state[VELOCITY + 2]);
    turned.set(state[RATES], state[RATES + 1], state[RATES + 2]);
    body.quaternion.vmult(turned, body.angularVelocity);
    body.previousPosition.copy(body.position);
    body.interpolatedPosition.copy(body.position);
    body.force.set(linear[0] * mass_kg, linear[1] * mass_kg, linear[2] * mass_kg);
    turned.set(angular[0] * inertia[0], angular[1] * inertia[1], angular[2] * inertia[2]);
    body.quaternion.vmult(turned, body.torque);
    body.aabbNeedsUpdate = true;
    body.updateInertiaWorld(true);
  }

  private takeBack(state: Float64Array): true {
    const { craft: body, turned } = this;
    state[POSITION] = body.position.x;
    state[POSITION + 1] = body.position.y;
    state[POSITION + 2] = body.position.z;
    const q = body.quaternion;
    const scale = 1 / Math.sqrt(q.x * q.x + q.y * q.y + q.z * q.z + q.w * q.w);
    state[ATTITUDE] = q.w * scale;
    state[ATTITUDE + 1] = q.x * scale;
    state[ATTITUDE + 2] = q.y * scale;
    state[ATTITUDE + 3] = q.z * scale;
    state[VELOCITY] = body.velocity.x;
    state[VELOCITY + 1] = body.velocity.y;
    state[VELOCITY + 2] = body.velocity.z;
    body.quaternion.conjugate().vmult(body.angularVelocity, turned);
    state[RATES] = turned.x;
    state[RATES + 1] = turned.y;
    state[RATES + 2] = turned.z;
    return true;
  }

  private kineticEnergy(): number {
    const { craft: body, turned } = this;
    const [ix, iy, iz] = this.options.inertiaDiagonal_kgm2;
    body.quaternion.conjugate().vmult(body.angularVelocity, turned);
    return (
      0.5 * this.options.mass_kg * body.velocity.lengthSquared() +
      0.5 * (ix * turned.x * turned.x + iy * turned.y * turned.y + iz * turned.z * turned.z)
    );
  }

  /** Takes from the velocities what the solver gave beyond the work of the free forces. */
  private boundEnergy(before: number, from: readonly number[], linear: Float64Array, dt: number): void {
    const body = this.craft;
    const work =
      this.options.mass_kg *
      (linear[0] * (body.position.x - from[0]) +
        linear[1] * (body.position.y - from[1]) +
        linear[2] * (body.position.z - from[2]));
    // The torque's work over the mean of the rates before and after is of order dt and taken from forces
    // that also turn; its magnitude bounds it.
    const spun = Math.abs(body.torque.dot(body.angularVelocity)) * dt;
    const allowed = Math.max(0, before + work + spun);
    const after = this.kineticEnergy();
    if (after <= allowed) return;
    const scale = Math.sqrt(allowed / after);
    body.velocity.scale(scale, body.velocity);
    body.angularVelocity.scale(scale, body.angularVelocity);
  }

  private noteContacts(): boolean {
    for (const contact of this.world.contacts) {
      const other = contact.bi === this.craft ? contact.bj : contact.bi;
      const name = this.bodyNames.get(other.id);
      if (name !== undefined && !this.touching.includes(name)) this.touching.push(name);
    }
    return this.touching.length > 0;
  }

  private countStill(state: Float64Array, linear: Float64Array): void {
    const speed = Math.hypot(state[VELOCITY], state[VELOCITY + 1], state[VELOCITY + 2]);
    const rate = Math.hypot(state[RATES], state[RATES + 1], state[RATES + 2]);
    const still = speed < REST_SPEED_MPS && rate < REST_RATE_RADPS && linear[2] > PRESSED_MPS2;
    this.stillSteps = still ? this.stillSteps + 1 : 0;
  }

  /** At rest: was still for a while and is still pressed down harder than pushed aside. */
  private atRest(state: Float64Array, linear: Float64Array): boolean {
    if (this.stillSteps < REST_STEPS) return false;
    const aside = Math.hypot(linear[0], linear[1]);
    const speed = Math.hypot(state[VELOCITY], state[VELOCITY + 1], state[VELOCITY + 2]);
    const holds =
      linear[2] > PRESSED_MPS2 && aside < this.options.scene.ground.friction * linear[2] && speed < 0.2;
    if (!holds) this.stillSteps = 0;
    return holds;
  }

  /** Marks the rotors whose disc's rim lies in the ground or in a solid. */
  private findStrikes(state: Float64Array): void {
    const w = state[ATTITUDE];
    const x = state[ATTITUDE + 1];
    const y = state[ATTITUDE + 2];
    const z = state[ATTITUDE + 3];
    const r00 = 1 - 2 * (y * y + z * z);
    const r01 = 2 * (x * y - w * z);
    const r02 = 2 * (x * z + w * y);
    const r10 = 2 * (x * y + w * z);
    const r11 = 1 - 2 * (x * x + z * z);
    const r12 = 2 * (y * z - w * x);
    const r20 = 2 * (x * z - w * y);
    const r21 = 2 * (y * z + w * x);
    const r22 = 1 - 2 * (x * x + y * y);
    for (let i = 0; i < 4; i++) {
      const hub = this.options.rotorPositions_m[i];
      for (let k = 0; k < RIM_POINTS; k++) {
        const angle = (2 * Math.PI * k) / RIM_POINTS;
        const bx = hub[0] + this.options.propellerRadius_m * Math.cos(angle);
        const by = hub[1] + this.options.propellerRadius_m * Math.sin(angle);
        const bz = hub[2];
        const px = state[POSITION] + r00 * bx + r01 * by + r02 * bz;
        const py = state[POSITION + 1] + r10 * bx + r11 * by + r12 * bz;
        const pz = state[POSITION + 2] + r20 * bx + r21 * by + r22 * bz;
        if (pz > -TIP_RADIUS_M || this.insideSolid(px, py, pz)) {
          this.struck[i] = 1;
          break;
        }
      }
    }
  }

  private insideSolid(px: number, py: number, pz: number): boolean {
    for (const one of this.obstacles) {
      const dx = px - one.centre[0];
      const dy = py - one.centre[1];
      if (
        Math.abs(one.cos * dx + one.sin * dy) < one.half[0] + TIP_RADIUS_M &&
        Math.abs(one.cos * dy - one.sin * dx) < one.half[1] + TIP_RADIUS_M &&
        Math.abs(pz - one.centre[2]) < one.half[2] + TIP_RADIUS_M
      ) {
        return true;
      }
    }
    return false;
  }

  save(out: SnapshotWriter): void {
    out.put(this.stillSteps);
  }

  load(from: SnapshotReader): void {
    this.stillSteps = from.take();
    this.clearance_m = -1;
  }
}

/** Radius around the centre of mass that holds the whole craft. */
function boundOf(options: ContactOptions): number {
  const tips = options.rotorPositions_m.map((p) => Math.hypot(p[0], p[1], p[2]) + options.propellerRadius_m);
  const foot = Math.hypot(options.legHalfTrack_m * Math.SQRT2, options.legHeight_m);
  return Math.max(...tips, foot) + 0.05;
}

function obstacle(solid: Solid, material: Material): Obstacle {
  const [sx, sy, sz] = solid.size_m;
  const half = [sx / 2, sy / 2, sz / 2] as const;
  const body = new Body({ mass: 0, material, shape: new Box(new Vec3(half[0], half[1], half[2])) });
  body.position.set(...solid.centre_m);
  const heading = solid.heading_deg * RAD_PER_DEG;
  body.quaternion.copy(new Quaternion().setFromAxisAngle(new Vec3(0, 0, 1), heading));
  const cos = Math.cos(heading);
  const sin = Math.sin(heading);
  const reach = [
    Math.abs(cos) * half[0] + Math.abs(sin) * half[1],
    Math.abs(sin) * half[0] + Math.abs(cos) * half[1],
    half[2],
  ] as const;
  return { name: solid.name, body, half, centre: solid.centre_m, cos, sin, reach };
}

/** Feet, motors, the rims of the discs and a hull, all spheres: quick and without edges to catch on. */
function craftBody(options: ContactOptions, material: Material): Body {
  const body = new Body({ mass: options.mass_kg, material, linearDamping: 0, angularDamping: 0 });
  const foot = new Sphere(FOOT_RADIUS_M);
  for (const sx of [1, -1]) {
    for (const sy of [1, -1]) {
      const t = options.legHalfTrack_m;
      body.addShape(foot, new Vec3(sx * t, sy * t, options.legHeight_m - FOOT_RADIUS_M));
    }
  }
  const motor = new Sphere(MOTOR_RADIUS_M);
  const tip = new Sphere(TIP_RADIUS_M);
  for (const [x, y, z] of options.rotorPositions_m.map((p) => [p[0], p[1], p[2]])) {
    body.addShape(motor, new Vec3(x, y, z));
    for (let k = 0; k < 4; k++) {
      const angle = Math.atan2(y, x) + (k * Math.PI) / 2;
      const r = options.propellerRadius_m;
      body.addShape(tip, new Vec3(x + r * Math.cos(angle), y + r * Math.sin(angle), z));
    }
  }
  body.addShape(new Sphere(Math.min(0.04, 0.4 * options.legHeight_m)), new Vec3(0, 0, 0));
  const [ix, iy, iz] = options.inertiaDiagonal_kgm2;
  body.inertia.set(ix, iy, iz);
  body.invInertia.set(1 / ix, 1 / iy, 1 / iz);
  body.fixedRotation = false;
  return body;
}
