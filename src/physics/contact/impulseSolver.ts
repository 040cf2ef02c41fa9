/**
 * Contact impulses for one body among fixed ones, in cannon-es's place for a solver: it takes the contacts
 * that cannon-es found. cannon-es's own solver is not used: version 0.20.0 bounds each contact's friction
 * impulse by μ·m·g as if that were an impulse, whatever presses the contact and however short the step, and
 * its restitution fades with the step (a fall on e = 0.3 came back with 0.02 at 0.5 ms).
 *
 * Projected Gauss–Seidel over velocities: each contact's normal velocity is at least what closes its gap in
 * this step, or −e times the approach when it strikes (Newton); friction lies in Coulomb's disc, at most μ
 * times the normal impulse. Catto, "Iterative Dynamics with Temporal Coherence" (2005), for the method.
 */
import { ContactEquation, Solver, Vec3, type Body } from 'cannon-es';

/** Slower approaches end without a bounce, m/s: above what gravity adds in one step. */
const BOUNCE_FROM_MPS = 0.08;
const ROUNDS = 120;
/** Rounds end when no contact's velocity changed by more than this, m/s. */
const SETTLED_MPS = 1e-9;

/** Numbers of one row: direction, arm × direction, I⁻¹ of that. */
const ROW = 9;
const ROWS = 3;

export class ImpulseSolver extends Solver {
  friction = 0;
  restitution = 0;
  /** How much the craft's spheres are swollen, m. */
  skin_m = 0;
  /** Bodies pressed in the last solve, each once, with the place of one contact. */
  readonly pressed: { body: Body; x: number; y: number }[] = [];
  /** Deepest overlap found, m (positive), and the way out of it. */
  depth_m = 0;
  readonly wayOut = new Vec3();

  private rows = new Float64Array(0);
  /** Inverse of each row's effective mass, and impulse so far. */
  private perMass = new Float64Array(0);
  private impulse = new Float64Array(0);
  private wanted = new Float64Array(0);
  private readonly velocity = new Float64Array(6);
  private readonly free = new Float64Array(6);
  private readonly arm = new Vec3();
  private readonly normal = new Vec3();
  private readonly tangents = [new Vec3(), new Vec3()] as const;
  private readonly turned = new Vec3();

  constructor(private readonly craft: Body) {
    super();
  }

  override solve(dt: number): number {
    this.pressed.length = 0;
    this.depth_m = 0;
    const contacts = this.equations.filter((one) => one instanceof ContactEquation);
    if (contacts.length === 0) return 0;
    this.makeRoom(contacts.length);
    const { craft, velocity } = this;
    // Velocities at the end of the step without contact.
    const perMass = craft.invMass * dt;
    craft.invInertiaWorld.vmult(craft.torque, this.turned);
    velocity[0] = craft.velocity.x + craft.force.x * perMass;
    velocity[1] = craft.velocity.y + craft.force.y * perMass;
    velocity[2] = craft.velocity.z + craft.force.z * perMass;
    velocity[3] = craft.angularVelocity.x + this.turned.x * dt;
    velocity[4] = craft.angularVelocity.y + this.turned.y * dt;
    velocity[5] = craft.angularVelocity.z + this.turned.z * dt;
    this.free.set(velocity);
    contacts.forEach((contact, i) => this.prepare(contact, i, dt));
    let rounds = 0;
    while (rounds < ROUNDS && this.round(contacts.length) > SETTLED_MPS) rounds++;
    this.apply(contacts);
    return rounds;
  }

  private makeRoom(contacts: number): void {
    if (this.impulse.length >= ROWS * contacts) return;
    this.rows = new Float64Array(ROWS * ROW * contacts * 2);
    this.perMass = new Float64Array(ROWS * contacts * 2);
    this.impulse = new Float64Array(ROWS * contacts * 2);
    this.wanted = new Float64Array(contacts * 2);
  }

  private prepare(contact: ContactEquation, i: number, dt: number): void {
    const { craft, arm, normal, tangents } = this;
    const first = contact.bi === craft;
    // The normal points out of the obstacle, the arm to the sphere without its skin.
    normal.copy(contact.ni);
    if (first) normal.negate(normal);
    arm.copy(first ? contact.ri : contact.rj);
    const other = first ? contact.bj : contact.bi;
    const far = first ? contact.rj : contact.ri;
    const gap =
      normal.x * (craft.position.x + arm.x - other.position.x - far.x) +
      normal.y * (craft.position.y + arm.y - other.position.y - far.y) +
      normal.z * (craft.position.z + arm.z - other.position.z - far.z) +
      this.skin_m;
    arm.addScaledVector(this.skin_m, normal, arm);
    if (-gap > this.depth_m) {
      this.depth_m = -gap;
      this.wayOut.copy(normal);
    }
    normal.tangents(tangents[0], tangents[1]);
    this.fillRow(ROWS * i, normal);
    this.fillRow(ROWS * i + 1, tangents[0]);
    this.fillRow(ROWS * i + 2, tangents[1]);
    arm.cross(normal, this.turned);
    const approach = normal.dot(craft.velocity) + this.turned.dot(craft.angularVelocity);
    const strikes = approach < -BOUNCE_FROM_MPS && gap + dt * this.rowVelocity(ROWS * i) <= 0;
    this.wanted[i] = strikes ? -this.restitution * approach : -Math.max(0, gap) / dt;
  }

  private fillRow(row: number, direction: Vec3): void {
    const { rows, arm, craft, turned } = this;
    const at = row * ROW;
    rows[at] = direction.x;
    rows[at + 1] = direction.y;
    rows[at + 2] = direction.z;
    arm.cross(direction, turned);
    rows[at + 3] = turned.x;
    rows[at + 4] = turned.y;
    rows[at + 5] = turned.z;
    craft.invInertiaWorld.vmult(turned, turned);
    rows[at + 6] = turned.x;
    rows[at + 7] = turned.y;
    rows[at + 8] = turned.z;
    this.perMass[row] =
      craft.invMass + rows[at + 3] * rows[at + 6] + rows[at + 4] * rows[at + 7] + rows[at + 5] * rows[at + 8];
    this.impulse[row] = 0;
  }

  private rowVelocity(row: number): number {
    const { rows, velocity } = this;
    const at = row * ROW;
    return (
      rows[at] * velocity[0] +
      rows[at + 1] * velocity[1] +
      rows[at + 2] * velocity[2] +
      rows[at + 3] * velocity[3] +
      rows[at + 4] * velocity[4] +
      rows[at + 5] * velocity[5]
    );
  }

  private push(row: number, impulse: number): void {
    const { rows, velocity, craft } = this;
    const at = row * ROW;
    const scaled = impulse * craft.invMass;
    this.impulse[row] += impulse;
    velocity[0] += scaled * rows[at];
    velocity[1] += scaled * rows[at + 1];
    velocity[2] += scaled * rows[at + 2];
    velocity[3] += impulse * rows[at + 6];
    velocity[4] += impulse * rows[at + 7];
    velocity[5] += impulse * rows[at + 8];
  }

  /** One pass over all contacts; returns the largest change of a contact's velocity, m/s. */
  private round(contacts: number): number {
    const { impulse, perMass } = this;
    let largest = 0;
    for (let i = 0; i < contacts; i++) {
      const row = ROWS * i;
      const missing = (this.wanted[i] - this.rowVelocity(row)) / perMass[row];
      const change = Math.max(-impulse[row], missing);
      if (change !== 0) this.push(row, change);
      largest = Math.max(largest, Math.abs(change) * perMass[row]);
      const bound = this.friction * impulse[row];
      const a = impulse[row + 1] - this.rowVelocity(row + 1) / perMass[row + 1];
      const b = impulse[row + 2] - this.rowVelocity(row + 2) / perMass[row + 2];
      const size = Math.sqrt(a * a + b * b);
      const share = size > bound ? bound / size : 1;
      const along = a * share - impulse[row + 1];
      const across = b * share - impulse[row + 2];
      if (along !== 0) this.push(row + 1, along);
      if (across !== 0) this.push(row + 2, across);
      largest = Math.max(largest, Math.abs(along) * perMass[row + 1], Math.abs(across) * perMass[row + 2]);
    }
    return largest;
  }

  /** Hands the change of velocity to the body (force · dt is added by cannon-es's own step) and notes what was pressed. */
  private apply(contacts: readonly ContactEquation[]): void {
    const { craft, velocity, free, pressed } = this;
    contacts.forEach((contact, i) => {
      if (this.impulse[ROWS * i] <= 0) return;
      const first = contact.bi === craft;
      const body = first ? contact.bj : contact.bi;
      if (pressed.some((one) => one.body === body)) return;
      const arm = first ? contact.ri : contact.rj;
      pressed.push({ body, x: craft.position.x + arm.x, y: craft.position.y + arm.y });
    });
    craft.velocity.x += velocity[0] - free[0];
    craft.velocity.y += velocity[1] - free[1];
    craft.velocity.z += velocity[2] - free[2];
    craft.angularVelocity.x += velocity[3] - free[3];
    craft.angularVelocity.y += velocity[4] - free[4];
    craft.angularVelocity.z += velocity[5] - free[5];
  }
}
