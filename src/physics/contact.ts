/**
 * Contact with ground and scene through cannon-es, at a clean border. Free flight never comes here. Close to
 * something solid one step of the body's motion is done by cannon-es: it gets pose, velocities and the free
 * accelerations (gravity, thrust, drag and the gyroscopic term are in them, which its own integrator leaves
 * out), finds the contacts and moves the body; the impulses are our own (contact/impulseSolver.ts says why).
 * Nothing stays from step to step: the outcome depends on the arguments alone, so a snapshot needs nothing of
 * it.
 *
 * Energy never grows through a contact: kinetic energy after the step is bounded by what it was plus the work
 * of the free forces over the step; Newton's restitution at several contacts with friction can exceed that,
 * and the surplus is taken from the velocities.
 */
import { Body, ContactMaterial, Material, Plane, SAPBroadphase, Vec3, World } from 'cannon-es';
import type { Scene } from '../craft/scene.ts';
import type { SnapshotReader, SnapshotWriter, Stateful } from '../math/snapshot.ts';
import { CraftBody, type CraftShape } from './contact/craftShape.ts';
import { ImpulseSolver } from './contact/impulseSolver.ts';
import { Obstacle } from './contact/obstacle.ts';
import { ATTITUDE, POSITION, RATES, VELOCITY } from './state.ts';

export interface ContactOptions extends CraftShape {
  readonly scene: Scene;
}

/** A blade this close to something has struck it, m. */
const STRIKE_M = 0.004;
/** Points of a disc's rim that are tried against solids; against the ground its lowest point is exact. */
const RIM_POINTS = 12;
/** How far beyond the craft's own bound `near` begins, m: more than any craft moves in one step. */
const MARGIN_M = 0.05;
/** Spheres are swollen by this and the way of one step, m. */
const SKIN_M = 0.002;
/** A pressed body left slower than this by a step stands still (static friction), m/s and rad/s. */
const STILL_MPS = 5e-5;
const STILL_RADPS = 2e-4;
/**
 * Overlap deeper than this cannot come from motion, only from where the craft was put: it is pushed out at
 * this speed.
 */
const PUT_INSIDE_M = 0.005;
const PUSH_OUT_MPS = 0.5;

/** Places of the velocities and body rates in a state. */
const MOTION = [VELOCITY, VELOCITY + 1, VELOCITY + 2, RATES, RATES + 1, RATES + 2] as const;

export class ContactWorld implements Stateful {
  /** 1 where a rotor's disc struck something in the last step, FL, FR, RL, RR. */
  readonly struck = new Uint8Array(4);
  /** Names of what the craft touched in the last step: "ground" or a solid's name. */
  readonly touching: string[] = [];

  private readonly world: World;
  private readonly solver: ImpulseSolver;
  private readonly shape: CraftBody;
  private readonly obstacles: readonly Obstacle[];
  /** Obstacles whose box the craft's bound reached when `near` last looked. */
  private readonly close: Obstacle[] = [];
  private readonly waters: readonly Obstacle[];
  private readonly names = new Map<number, string>();
  private readonly reach_m: number;
  // Clearance found last and where: nothing can be near until the craft moved that far.
  private readonly checkedAt = new Float64Array(3);
  private clearance_m = -1;
  private readonly turned = new Vec3();
  private readonly rotation = new Float64Array(9);
  /** Arguments of the last step that ended where it began: the same ones give the same end. */
  private readonly held = new Float64Array(20).fill(NaN);

  constructor(private readonly options: ContactOptions) {
    const { scene } = options;
    this.shape = new CraftBody(options);
    this.reach_m = this.shape.bound_m + MARGIN_M;
    this.solver = new ImpulseSolver(this.shape.body);
    this.solver.friction = scene.ground.friction;
    this.solver.restitution = scene.ground.restitution;
    // Gravity comes with the free accelerations, friction from our solver.
    const material = new Material();
    this.world = new World({ gravity: new Vec3(0, 0, 0), allowSleep: false });
    this.world.addContactMaterial(new ContactMaterial(material, material, { friction: 0 }));
    this.world.broadphase = new SAPBroadphase(this.world);
    this.world.solver = this.solver;
    const ground = new Body({ mass: 0, shape: new Plane() });
    // A cannon plane faces +z; the ground faces up, −z.
    ground.quaternion.setFromAxisAngle(new Vec3(1, 0, 0), Math.PI);
    this.names.set(ground.id, 'ground');
    this.obstacles = scene.solids.filter((solid) => solid.collides).map((solid) => new Obstacle(solid));
    this.waters = scene.solids
      .filter((solid) => solid.look === 'water' && !solid.collides)
      .map((solid) => new Obstacle(solid));
    for (const one of this.obstacles) this.names.set(one.body.id, one.name);
    for (const body of [ground, ...this.obstacles.map((one) => one.body), this.shape.body]) {
      body.material = material;
      this.world.addBody(body);
    }
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
    this.close.length = 0;
    for (const one of this.obstacles) {
      const distance = one.boundDistance(x, y, z);
      if (distance < clear) clear = distance;
      if (distance < this.reach_m) this.close.push(one);
    }
    this.clearance_m = clear - this.reach_m;
    this.checkedAt[0] = x;
    this.checkedAt[1] = y;
    this.checkedAt[2] = z;
    return this.clearance_m <= 0;
  }

  /**
   * One step with contact, from pose and velocities in `state` and the free accelerations there. When
   * something was touched it writes pose and velocities back; otherwise `state` stays as it was and the step
   * is the free flight's. Call it only where `near(state)` said yes.
   * @param linear_mps2 world axes, gravity included
   * @param angular_radps2 body axes, gyroscopic term included
   * @returns whether anything was touched
   */
  step(state: Float64Array, dt: number, linear_mps2: Float64Array, angular_radps2: Float64Array): boolean {
    if (this.isHeld(state, dt, linear_mps2, angular_radps2)) return true;
    this.touching.length = 0;
    this.held[0] = NaN;
    this.turn(state);
    const struck = this.findStrikes(state);
    const skin_m = SKIN_M + this.wayOfStep(state, dt, linear_mps2);
    if (!this.gatherSpheres(state, skin_m) && !struck) return false;
    this.handOver(state, linear_mps2, angular_radps2, skin_m);
    const { body } = this.shape;
    const energy = this.kineticEnergy() + this.freeSpinWork(state, dt, angular_radps2);
    const from = body.position.clone();
    this.world.step(dt);
    this.nameTouched();
    if (this.touching.length === 0 && !struck) return false;
    this.pushOut(dt);
    this.boundEnergy(energy, from, linear_mps2);
    if (this.touching.length > 0 && this.stood(state) && this.standsStill()) {
      this.hold(state, dt, linear_mps2, angular_radps2);
      return true;
    }
    this.takeBack(state);
    return true;
  }

  /** Longest way of any point of the craft in one step, m. */
  private wayOfStep(state: Float64Array, dt: number, linear: Float64Array): number {
    const speed = Math.hypot(state[VELOCITY], state[VELOCITY + 1], state[VELOCITY + 2]);
    const rate = Math.hypot(state[RATES], state[RATES + 1], state[RATES + 2]);
    const gained = Math.hypot(linear[0], linear[1], linear[2]) * dt;
    return (speed + gained + rate * this.shape.bound_m) * dt;
  }

  /** Gives the body the spheres within `skin_m` of ground or a close solid; returns whether there is one. */
  private gatherSpheres(state: Float64Array, skin_m: number): boolean {
    const { rotation: r, close, shape } = this;
    const { centres_m: c, radii_m } = shape;
    shape.clear();
    for (let i = 0, k = 0; i < radii_m.length; i++, k += 3) {
      const z = state[POSITION + 2] + r[6] * c[k] + r[7] * c[k + 1] + r[8] * c[k + 2];
      let gap = -z;
      if (close.length > 0) {
        const x = state[POSITION] + r[0] * c[k] + r[1] * c[k + 1] + r[2] * c[k + 2];
        const y = state[POSITION + 1] + r[3] * c[k] + r[4] * c[k + 1] + r[5] * c[k + 2];
        for (const one of close) gap = Math.min(gap, one.distance(x, y, z));
      }
      if (gap <= radii_m[i] + skin_m) shape.include(i, skin_m);
    }
    return shape.body.shapes.length > 0;
  }

  private handOver(state: Float64Array, linear: Float64Array, angular: Float64Array, skin_m: number): void {
    const { turned } = this;
    const { body } = this.shape;
    const { mass_kg, inertiaDiagonal_kgm2: inertia } = this.options;
    this.solver.skin_m = skin_m;
    body.position.set(state[POSITION], state[POSITION + 1], state[POSITION + 2]);
    body.quaternion.set(state[ATTITUDE + 1], state[ATTITUDE + 2], state[ATTITUDE + 3], state[ATTITUDE]);
    body.velocity.set(state[VELOCITY], state[VELOCITY + 1], state[VELOCITY + 2]);
    turned.set(state[RATES], state[RATES + 1], state[RATES + 2]);
    body.quaternion.vmult(turned, body.angularVelocity);
    body.force.set(linear[0] * mass_kg, linear[1] * mass_kg, linear[2] * mass_kg);
    turned.set(angular[0] * inertia[0], angular[1] * inertia[1], angular[2] * inertia[2]);
    body.quaternion.vmult(turned, body.torque);
    body.updateInertiaWorld(true);
  }

  private takeBack(state: Float64Array): void {
    const { turned } = this;
    const { body } = this.shape;
    state[POSITION] = body.position.x;
    state[POSITION + 1] = body.position.y;
    state[POSITION + 2] = body.position.z;
    const q = body.quaternion;
    state[ATTITUDE] = q.w;
    state[ATTITUDE + 1] = q.x;
    state[ATTITUDE + 2] = q.y;
    state[ATTITUDE + 3] = q.z;
    state[VELOCITY] = body.velocity.x;
    state[VELOCITY + 1] = body.velocity.y;
    state[VELOCITY + 2] = body.velocity.z;
    body.quaternion.conjugate().vmult(body.angularVelocity, turned);
    state[RATES] = turned.x;
    state[RATES + 1] = turned.y;
    state[RATES + 2] = turned.z;
  }

  // --- Energy -------------------------------------------------------------------------------------------

  private kineticEnergy(): number {
    const { turned } = this;
    const { body } = this.shape;
    const [ix, iy, iz] = this.options.inertiaDiagonal_kgm2;
    body.quaternion.conjugate().vmult(body.angularVelocity, turned);
    return (
      0.5 * this.options.mass_kg * body.velocity.lengthSquared() +
      0.5 * (ix * turned.x * turned.x + iy * turned.y * turned.y + iz * turned.z * turned.z)
    );
  }

  /**
   * What the free torque adds over the step without contact. The gyroscopic term does no work at first order;
   * what an explicit step makes of it at second order is left out, so that it cannot feed a spinning body.
   */
  private freeSpinWork(state: Float64Array, dt: number, angular: Float64Array): number {
    const [ix, iy, iz] = this.options.inertiaDiagonal_kgm2;
    const p = state[RATES];
    const q = state[RATES + 1];
    const r = state[RATES + 2];
    const outerP = ix * angular[0] + (iz - iy) * q * r;
    const outerQ = iy * angular[1] + (ix - iz) * r * p;
    const outerR = iz * angular[2] + (iy - ix) * p * q;
    return (
      dt * (outerP * p + outerQ * q + outerR * r) +
      0.5 * dt * dt * ((outerP * outerP) / ix + (outerQ * outerQ) / iy + (outerR * outerR) / iz)
    );
  }

  /** Takes from the velocities what the contacts gave beyond the work of the free forces. */
  private boundEnergy(energy: number, from: Vec3, linear: Float64Array): void {
    const { body } = this.shape;
    const work =
      linear[0] * (body.position.x - from.x) +
      linear[1] * (body.position.y - from.y) +
      linear[2] * (body.position.z - from.z);
    const allowed = Math.max(0, energy + this.options.mass_kg * work);
    const after = this.kineticEnergy();
    if (after <= allowed) return;
    const scale = Math.sqrt(allowed / after);
    body.velocity.scale(scale, body.velocity);
    body.angularVelocity.scale(scale, body.angularVelocity);
  }

  /** Out of a solid in which the craft was put; its own motion never gets it that deep. */
  private pushOut(dt: number): void {
    const { depth_m, wayOut } = this.solver;
    if (depth_m < PUT_INSIDE_M) return;
    const { position } = this.shape.body;
    position.addScaledVector(Math.min(PUSH_OUT_MPS * dt, depth_m), wayOut, position);
  }

  // --- Rest ---------------------------------------------------------------------------------------------

  /** Began the step as slow as a craft that stands: one that lands in it still has its way to go. */
  private stood(state: Float64Array): boolean {
    const speed = Math.hypot(state[VELOCITY], state[VELOCITY + 1], state[VELOCITY + 2]);
    const rate = Math.hypot(state[RATES], state[RATES + 1], state[RATES + 2]);
    return speed < STILL_MPS && rate < STILL_RADPS;
  }

  private standsStill(): boolean {
    const { body } = this.shape;
    return (
      body.velocity.lengthSquared() < STILL_MPS * STILL_MPS &&
      body.angularVelocity.lengthSquared() < STILL_RADPS * STILL_RADPS &&
      this.solver.depth_m < PUT_INSIDE_M
    );
  }

  /** Keeps the pose, without motion; remembers what led to it once that was without motion too. */
  private hold(state: Float64Array, dt: number, linear: Float64Array, angular: Float64Array): void {
    const moved = MOTION.some((at) => state[at] !== 0);
    for (const at of MOTION) state[at] = 0;
    if (moved) return;
    this.held[0] = dt;
    for (let i = 0; i < 13; i++) this.held[1 + i] = state[i];
    for (let i = 0; i < 3; i++) {
      this.held[14 + i] = linear[i];
      this.held[17 + i] = angular[i];
    }
  }

  private isHeld(state: Float64Array, dt: number, linear: Float64Array, angular: Float64Array): boolean {
    const { held } = this;
    if (held[0] !== dt) return false;
    for (let i = 0; i < 13; i++) if (held[1 + i] !== state[i]) return false;
    for (let i = 0; i < 3; i++) {
      if (held[14 + i] !== linear[i] || held[17 + i] !== angular[i]) return false;
    }
    return true;
  }

  // --- What was touched -----------------------------------------------------------------------------------

  private nameTouched(): void {
    for (const { body, x, y } of this.solver.pressed) {
      const name = this.names.get(body.id) ?? 'ground';
      const water = name === 'ground' ? this.waters.find((one) => one.covers(x, y)) : undefined;
      this.touching.push(water?.name ?? name);
    }
  }

  /** Marks the rotors whose disc's rim lies in the ground or in a solid. */
  private findStrikes(state: Float64Array): boolean {
    const { rotation: r, close, struck } = this;
    const R = this.options.propellerRadius_m;
    // The lowest point of a circle lies below its centre by R times the sine of its tilt.
    const sag = R * Math.sqrt(r[6] * r[6] + r[7] * r[7]);
    let any = false;
    for (let i = 0; i < 4; i++) {
      const hub = this.options.rotorPositions_m[i];
      const down = state[POSITION + 2] + r[6] * hub[0] + r[7] * hub[1] + r[8] * hub[2];
      struck[i] = down + sag > -STRIKE_M || (close.length > 0 && this.rimInSolid(state, hub)) ? 1 : 0;
      any ||= struck[i] === 1;
    }
    return any;
  }

  private rimInSolid(state: Float64Array, hub: readonly number[]): boolean {
    const { rotation: r, close } = this;
    const R = this.options.propellerRadius_m;
    for (let k = 0; k < RIM_POINTS; k++) {
      const bx = hub[0] + R * Math.cos((2 * Math.PI * k) / RIM_POINTS);
      const by = hub[1] + R * Math.sin((2 * Math.PI * k) / RIM_POINTS);
      const x = state[POSITION] + r[0] * bx + r[1] * by + r[2] * hub[2];
      const y = state[POSITION + 1] + r[3] * bx + r[4] * by + r[5] * hub[2];
      const z = state[POSITION + 2] + r[6] * bx + r[7] * by + r[8] * hub[2];
      for (const one of close) if (one.distance(x, y, z) < STRIKE_M) return true;
    }
    return false;
  }

  /** Body to world, row by row, from the quaternion in `state`. */
  private turn(state: Float64Array): void {
    const r = this.rotation;
    const w = state[ATTITUDE];
    const x = state[ATTITUDE + 1];
    const y = state[ATTITUDE + 2];
    const z = state[ATTITUDE + 3];
    r[0] = 1 - 2 * (y * y + z * z);
    r[1] = 2 * (x * y - w * z);
    r[2] = 2 * (x * z + w * y);
    r[3] = 2 * (x * y + w * z);
    r[4] = 1 - 2 * (x * x + z * z);
    r[5] = 2 * (y * z - w * x);
    r[6] = 2 * (x * z - w * y);
    r[7] = 2 * (y * z + w * x);
    r[8] = 1 - 2 * (x * x + y * y);
  }

  /** Nothing to keep: the outcome of a step depends on its arguments alone. */
  save(_out: SnapshotWriter): void {
    return;
  }

  load(_from: SnapshotReader): void {
    this.clearance_m = -1;
  }
}
