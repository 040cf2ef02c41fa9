/**
 * Geometry of the scene's solids as the view needs it, in the bench's axes: which hides which (for a painter
 * without a depth buffer), what lies under a place, how far one can see.
 */
import type { Solid } from '../../craft/scene.ts';

const PLANES = 6;

/** A box turned about the vertical: its planes (outward normal and offset) and corners. */
interface Block {
  readonly centre: readonly [number, number, number];
  readonly half: readonly [number, number, number];
  readonly cos: number;
  readonly sin: number;
  /** 6 × (normal n, e, d, offset): a point is outside a plane where normal · p > offset. */
  readonly planes: Float64Array;
  readonly corners: Float64Array;
}

function blockOf(solid: Solid): Block {
  const heading = (solid.heading_deg * Math.PI) / 180;
  const [cos, sin] = [Math.cos(heading), Math.sin(heading)];
  const half = solid.size_m.map((size) => size / 2) as [number, number, number];
  const centre = solid.centre_m;
  const axes = [
    [cos, sin, 0],
    [-sin, cos, 0],
    [0, 0, 1],
  ];
  const planes = new Float64Array(4 * PLANES);
  axes.forEach((axis, k) => {
    const middle = axis[0] * centre[0] + axis[1] * centre[1] + axis[2] * centre[2];
    planes.set([axis[0], axis[1], axis[2], middle + half[k]], 8 * k);
    planes.set([-axis[0], -axis[1], -axis[2], half[k] - middle], 8 * k + 4);
  });
  const corners = new Float64Array(24);
  for (let i = 0; i < 8; i++) {
    const [a, b, c] = [i & 1, i & 2, i & 4].map((bit, k) => (bit === 0 ? -half[k] : half[k]));
    corners.set([centre[0] + cos * a - sin * b, centre[1] + sin * a + cos * b, centre[2] + c], 3 * i);
  }
  return { centre, half, cos, sin, planes, corners };
}

function outside(planes: Float64Array, k: number, p: ArrayLike<number>, at = 0): number {
  return (
    planes[4 * k] * p[at] + planes[4 * k + 1] * p[at + 1] + planes[4 * k + 2] * p[at + 2] - planes[4 * k + 3]
  );
}

/** Planes of `one` that have all of `other` on their outer side, a bit each. */
function separating(one: Block, other: Block): number {
  let bits = 0;
  for (let k = 0; k < PLANES; k++) {
    let least = Infinity;
    for (let i = 0; i < 8; i++) least = Math.min(least, outside(one.planes, k, other.corners, 3 * i));
    if (least >= -1e-6) bits |= 1 << k;
  }
  return bits;
}

/**
 * Which of two bodies may hide the other, from planes between them: `planes` of the first with the second
 * outside, the `seen` ones with the eye outside as well. Where the eye is on the second's side of such a plane
 * the first hides nothing of the second; where planes say both, neither hides the other.
 * @returns 1: draw the first before the second, −1 the other way round, 0 either.
 */
function drawnFirst(planes: number, seen: number, planesOfOther: number, seenOfOther: number): number {
  const first = (planes & seen) | (planesOfOther & ~seenOfOther);
  const second = (planes & ~seen) | (planesOfOther & seenOfOther);
  return first !== 0 && second === 0 ? 1 : second !== 0 && first === 0 ? -1 : 0;
}

export class SolidSpace {
  private readonly blocks: readonly Block[];
  /** Row i, column j: planes of i that have j outside. */
  private readonly between: Uint8Array;
  private readonly seen: Uint8Array;
  /** Rank bookkeeping of `order`. */
  private readonly waits: Int16Array;
  private readonly before: Uint8Array;
  private readonly distance: Float64Array;

  constructor(solids: readonly Solid[]) {
    const count = solids.length;
    this.blocks = solids.map(blockOf);
    this.between = new Uint8Array(count * count);
    this.seen = new Uint8Array(count);
    this.waits = new Int16Array(count + 1);
    this.before = new Uint8Array((count + 1) * (count + 1));
    this.distance = new Float64Array(count + 1);
    for (let i = 0; i < count; i++) {
      for (let j = 0; j < count; j++) {
        if (i !== j) this.between[i * count + j] = separating(this.blocks[i], this.blocks[j]);
      }
    }
  }

  /**
   * Indices of the solids, and their count for a ball (the craft) among them, from what is hidden to what
   * hides, seen from `eye`. Exact wherever no three things hide each other in a ring.
   */
  order(eye: ArrayLike<number>, ball: ArrayLike<number>, into: number[]): number[] {
    const count = this.blocks.length;
    const size = count + 1;
    const { waits, before, distance, seen, between } = this;
    waits.fill(0);
    before.fill(0);
    for (let i = 0; i < count; i++) seen[i] = this.facesSeen(i, eye);
    for (let i = 0; i < size; i++) {
      const c = i < count ? this.blocks[i].centre : ball;
      distance[i] = Math.hypot(c[0] - eye[0], c[1] - eye[1], c[2] - eye[2]);
      for (let j = i + 1; j < size; j++) {
        const first =
          j < count
            ? drawnFirst(between[i * count + j], seen[i], between[j * count + i], seen[j])
            : drawnFirst(this.planesBeside(i, ball), seen[i], 0, 0);
        if (first === 0) continue;
        const [a, b] = first > 0 ? [i, j] : [j, i];
        before[a * size + b] = 1;
        waits[b]++;
      }
    }
    into.length = 0;
    while (into.length < size) this.take(into, size);
    return into;
  }

  /** Moves the next one into the order: of those that wait for none (or in a ring, of all) the farthest. */
  private take(into: number[], size: number): void {
    const { waits, before, distance } = this;
    let next = -1;
    for (let i = 0; i < size; i++) {
      if (waits[i] < 0) continue;
      const better = next < 0 ? -1 : Math.min(1, waits[i]) - Math.min(1, waits[next]);
      if (better < 0 || (better === 0 && distance[i] > distance[next])) next = i;
    }
    into.push(next);
    waits[next] = -1;
    for (let j = 0; j < size; j++) if (before[next * size + j] === 1 && waits[j] > 0) waits[j]--;
  }

  /** Planes of solid `i` that have a place outside; the nearest one when it is inside. */
  private planesBeside(i: number, place: ArrayLike<number>): number {
    const { planes } = this.blocks[i];
    let bits = 0;
    let best = 0;
    for (let k = 0; k < PLANES; k++) {
      if (outside(planes, k, place) > 0) bits |= 1 << k;
      if (outside(planes, k, place) > outside(planes, best, place)) best = k;
    }
    return bits === 0 ? 1 << best : bits;
  }

  /** Faces of solid `i` that are seen from `eye`, a bit each: north 1, south 2, east 4, west 8, below 16, top 32. */
  facesSeen(i: number, eye: ArrayLike<number>): number {
    let bits = 0;
    for (let k = 0; k < PLANES; k++) if (outside(this.blocks[i].planes, k, eye) > 0) bits |= 1 << k;
    return bits;
  }

  /** Height (down, m) of the highest top under a place; 0 is the ground. */
  topBelow(north: number, east: number, down: number): number {
    let top = 0;
    for (const { centre, half, cos, sin } of this.blocks) {
      const height = centre[2] - half[2];
      if (height < down - 0.01 || height >= top) continue;
      const [dn, de] = [north - centre[0], east - centre[1]];
      if (Math.abs(cos * dn + sin * de) < half[0] && Math.abs(cos * de - sin * dn) < half[1]) top = height;
    }
    return top;
  }

  /** Share of the way from `from` to `to` (north, east, down) that is clear of solids by `margin_m`. */
  clearShare(from: ArrayLike<number>, to: ArrayLike<number>, margin_m: number): number {
    let share = 1;
    for (const block of this.blocks) share = Math.min(share, entry(block, from, to, margin_m));
    return share;
  }
}

/** Where a way enters a box swollen by `margin_m`, as a share of it; 1 when it does not, or began inside. */
function entry(block: Block, from: ArrayLike<number>, to: ArrayLike<number>, margin_m: number): number {
  let enters = -Infinity;
  let leaves = Infinity;
  for (let k = 0; k < PLANES; k++) {
    const a = outside(block.planes, k, from) - margin_m;
    const b = outside(block.planes, k, to) - margin_m;
    if (a > 0 && b > 0) return 1;
    if (a > 0 && b <= 0) enters = Math.max(enters, a / (a - b));
    else if (a <= 0 && b > 0) leaves = Math.min(leaves, a / (a - b));
  }
  return enters > -Infinity && enters <= leaves ? Math.max(0, enters) : 1;
}
