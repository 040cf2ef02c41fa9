/**
 * The craft drawn from its build's own geometry: arms to the rotor positions, discs to the diameter, legs,
 * payload, nose. A changed arm length shows. The group's axes are the body's (axes.ts), its origin the centre
 * of mass.
 */
import {
  BufferAttribute,
  BufferGeometry,
  DoubleSide,
  Group,
  LineBasicMaterial,
  LineSegments,
  Matrix4,
  Mesh,
  MeshBasicMaterial,
  Quaternion,
  Vector3,
} from 'three';
import { CORNERS, type Build } from '../../craft/build.ts';
import { GRAVITY_MPS2 } from '../../math/angles.ts';
import { headingToThree, sizeToThree, toThree } from './axes.ts';
import { Facets, shadeTurned } from './facets.ts';
import { LAYER } from './layers.ts';
import type { ViewPalette } from './palette.ts';

/**
 * Blades are drawn turning slower than they do, and never so fast that they seem to stand or run backwards on
 * a screen of 30 frames a second.
 */
const SLOW_MOTION = 0.06;
const FASTEST_DRAWN_RADPS = 44;
/** Rotor speed at which the blades are a haze, rad/s. */
const HAZE_RADPS = 250;
const DISC_SIDES = 24;
const UP = new Vector3(0, 1, 0);
const ONE = new Vector3(1, 1, 1);

interface RotorParts {
  readonly disc: MeshBasicMaterial;
  readonly rim: LineBasicMaterial;
  readonly blades: Mesh;
  readonly haze: MeshBasicMaterial;
  readonly arrow: Group;
  readonly shaft: Mesh;
  readonly head: Mesh;
  readonly sense: number;
}

export class CraftModel {
  readonly group = new Group();
  /** From the centre of mass to the outermost rim, m: cameras keep their distance by it. */
  readonly reach_m: number;
  private readonly hull: Mesh;
  private readonly payload: Mesh | null;
  private readonly rotors: readonly RotorParts[];
  private readonly thrustScale_m_per_N: number;

  constructor(
    build: Build,
    private readonly palette: ViewPalette,
    /** Write shaded colours for WebGL; the canvas painter shades for itself. */
    private readonly writesColors: boolean,
  ) {
    const com = build.airframe.centreOfMass_m;
    const at = (p: readonly number[]) => toThree(new Vector3(), p[0] - com[0], p[1] - com[1], p[2] - com[2]);
    const rotors = CORNERS.map(
      (corner) => build.rotors.find((one) => one.corner === corner) ?? build.rotors[0],
    );
    const radius = build.propeller.diameter_m / 2;
    const hubs = rotors.map((rotor) => at(rotor.position_m));
    this.reach_m = Math.max(...hubs.map((hub) => Math.hypot(hub.x, hub.z))) + radius;
    this.thrustScale_m_per_N = (0.62 * this.reach_m * 4) / (build.airframe.mass_kg * GRAVITY_MPS2);
    this.hull = this.solidMesh(this.hullFacets(build, at, hubs, radius));
    this.payload = build.payload === undefined ? null : this.solidMesh(this.payloadFacets(build.payload, at));
    this.group.add(this.hull);
    if (this.payload !== null) this.group.add(this.payload);
    this.rotors = rotors.map((rotor, i) =>
      this.rotorParts(hubs[i], radius, build.propeller.blades ?? 2, rotor.spin === 'cw' ? 1 : -1),
    );
    this.group.traverse((part) => {
      part.renderOrder = LAYER.craft;
    });
  }

  /** Rotor speeds rad/s, thrusts N; `dt_s` since the last call. `struck`: rotors with broken blades. */
  update(
    speeds_radps: ArrayLike<number>,
    thrusts_N: ArrayLike<number>,
    dt_s: number,
    shows: { readonly thrust: boolean; readonly loaded: boolean; readonly struck?: ArrayLike<number> },
  ): void {
    shadeTurned(this.hull.geometry, this.group.quaternion, this.writesColors);
    if (this.payload !== null) {
      this.payload.visible = shows.loaded;
      shadeTurned(this.payload.geometry, this.group.quaternion, this.writesColors);
    }
    this.rotors.forEach((rotor, i) => {
      const speed = Math.abs(speeds_radps[i]);
      // Clockwise seen from above is a negative turn about three's y.
      const drawn = Math.min(FASTEST_DRAWN_RADPS, SLOW_MOTION * speed);
      rotor.blades.rotation.y += headingToThree(rotor.sense * drawn * dt_s);
      const haze = Math.min(1, speed / HAZE_RADPS);
      rotor.disc.opacity = 0.05 + 0.17 * haze;
      rotor.rim.opacity = 0.25 + 0.3 * haze;
      rotor.haze.opacity = 1 - 0.7 * haze;
      const whole = shows.struck === undefined || shows.struck[i] < 0.5;
      rotor.blades.scale.set(whole ? 1 : 0.55, 1, whole ? 1 : 0.55);
      this.drawThrust(rotor, shows.thrust ? thrusts_N[i] * this.thrustScale_m_per_N : 0);
    });
  }

  private drawThrust(rotor: RotorParts, length_m: number): void {
    rotor.arrow.visible = Math.abs(length_m) > 0.04 * this.reach_m;
    if (!rotor.arrow.visible) return;
    const head = Math.min(0.1 * this.reach_m, Math.abs(length_m));
    rotor.arrow.scale.y = Math.sign(length_m);
    rotor.shaft.scale.y = Math.max(0.001, Math.abs(length_m) - head);
    rotor.head.position.y = Math.abs(length_m) - head;
    rotor.head.scale.setScalar(head);
  }

  private solidMesh(facets: Facets): Mesh {
    return new Mesh(facets.build(), new MeshBasicMaterial({ vertexColors: true }));
  }

  private hullFacets(
    build: Build,
    at: (p: readonly number[]) => Vector3,
    hubs: readonly Vector3[],
    radius: number,
  ): Facets {
    const { palette } = this;
    const facets = new Facets();
    const middle = at([0, 0, 0]);
    const arm = Math.min(...hubs.map((hub) => Math.hypot(hub.x - middle.x, hub.z - middle.z)));
    const body = 0.34 * arm;
    const thick = 0.3 * body;
    const moved = (dx: number, dy: number, dz: number) =>
      new Matrix4().setPosition(middle.x + dx, middle.y + dy, middle.z + dz);
    facets.prism(moved(0, 0, 0), body, body, thick, 8, palette.hull);
    facets.frustum(
      moved(0, 0.95 * thick, 0.1 * body),
      0.55 * body,
      0.8 * body,
      0.34 * body,
      0.5 * body,
      0.9 * thick,
      palette.hull,
    );
    // Nose: a wedge ahead of the body, and both front motors in its tone.
    const nose = new Matrix4()
      .makeRotationX(-Math.PI / 2)
      .setPosition(middle.x, middle.y, middle.z - 1.32 * body);
    facets.prism(nose, 0.42 * body, 0, 0.9 * body, 4, palette.nose);
    hubs.forEach((hub, i) => {
      const front = CORNERS[i].startsWith('F');
      beam(facets, middle, hub.clone().setY(hub.y - 0.1 * radius), 0.11 * body + 0.02 * arm, palette.arm);
      const motor = new Matrix4().setPosition(hub.x, hub.y - 0.05 * radius, hub.z);
      facets.prism(
        motor,
        0.13 * radius,
        0.12 * radius,
        0.19 * radius,
        8,
        front ? palette.nose : palette.hull,
      );
    });
    this.addLegs(facets, build, middle);
    return facets;
  }

  private addLegs(facets: Facets, build: Build, middle: Vector3): void {
    const { palette } = this;
    const height = build.airframe.legs?.height_m ?? 0.35 * build.propeller.diameter_m;
    const half = build.airframe.legs?.halfTrack_m ?? 0.3 * this.reach_m;
    const width = 0.022 * this.reach_m;
    for (const side of [1, -1]) {
      for (const end of [1, -1]) {
        const foot = new Vector3(side * half, middle.y - height + width / 2, end * half);
        const knee = new Vector3(middle.x + side * half * 0.4, middle.y, middle.z + end * half * 0.4);
        beam(facets, knee, foot, width, palette.arm);
        facets.prism(new Matrix4().setPosition(foot), 1.1 * width, 0.9 * width, width, 6, palette.hull);
      }
    }
  }

  private payloadFacets(
    payload: NonNullable<Build['payload']>,
    at: (p: readonly number[]) => Vector3,
  ): Facets {
    const size = sizeToThree(new Vector3(), ...payload.size_m);
    return new Facets().box(new Matrix4().setPosition(at(payload.position_m)), size, this.palette.payload);
  }

  private rotorParts(hub: Vector3, radius: number, blades: number, sense: number): RotorParts {
    const { palette } = this;
    const soft = { vertexColors: true, transparent: true, depthWrite: false, side: DoubleSide };
    const disc = new MeshBasicMaterial(soft);
    const ring = circle(radius, DISC_SIDES);
    const plate = new Mesh(new Facets().polygon(ring, palette.disc).build(false), disc);
    const rim = new LineBasicMaterial({ color: palette.disc, transparent: true });
    const edge = new LineSegments(closedLine(ring), rim);
    const haze = new MeshBasicMaterial(soft);
    const turning = new Mesh(bladeFacets(radius, blades, sense, palette.blade).build(false), haze);
    turning.position.y = 0.06 * radius;
    const arrow = new Group();
    const plain = new MeshBasicMaterial({ vertexColors: true });
    const thin = 0.02 * this.reach_m;
    const shaft = new Mesh(
      new Facets()
        .box(new Matrix4().setPosition(0, 0.5, 0), new Vector3(thin, 1, thin), palette.thrust)
        .build(),
      plain,
    );
    const head = new Mesh(
      new Facets().prism(new Matrix4().setPosition(0, 0.5, 0), 0.36, 0, 1, 6, palette.thrust).build(),
      plain,
    );
    head.scale.setScalar(0.1 * this.reach_m);
    arrow.add(shaft, head);
    arrow.position.y = 0.12 * radius;
    const rotor = new Group();
    rotor.position.copy(hub);
    rotor.add(plate, edge, turning, arrow);
    this.group.add(rotor);
    return { disc, rim, blades: turning, haze, arrow, shaft, head, sense };
  }
}

function circle(radius: number, sides: number): Vector3[] {
  return Array.from({ length: sides }, (_, i) => {
    const angle = (-2 * Math.PI * i) / sides;
    return new Vector3(radius * Math.cos(angle), 0, radius * Math.sin(angle));
  });
}

function closedLine(ring: readonly Vector3[]): BufferGeometry {
  const points = ring.flatMap((from, i) => {
    const to = ring[(i + 1) % ring.length];
    return [from.x, from.y, from.z, to.x, to.y, to.z];
  });
  const geometry = new BufferGeometry();
  geometry.setAttribute('position', new BufferAttribute(new Float32Array(points), 3));
  return geometry;
}

/** Blades broad near the root and narrow at the tip, leading edge straight, seen from above. */
function bladeFacets(radius: number, blades: number, sense: number, color: number): Facets {
  const facets = new Facets();
  for (let k = 0; k < blades; k++) {
    const turn = new Matrix4().makeRotationY((2 * Math.PI * k) / blades);
    const outline = [
      [0.05, 0.05],
      [0.3, 0.1],
      [1, 0.035],
      [1, -0.03],
      [0.3, -0.06],
      [0.05, -0.05],
    ].map(([r, w]) => new Vector3(r * radius, 0, w * radius * sense).applyMatrix4(turn));
    facets.polygon(sense > 0 ? outline : outline.reverse(), color);
  }
  return facets;
}

/** A square bar from a to b. */
function beam(facets: Facets, a: Vector3, b: Vector3, width: number, color: number): void {
  const along = new Vector3().subVectors(b, a);
  const length = along.length();
  const turn = new Quaternion().setFromUnitVectors(UP, along.normalize());
  const matrix = new Matrix4().compose(new Vector3().addVectors(a, b).multiplyScalar(0.5), turn, ONE);
  facets.frustum(matrix, width / 2, width / 2, width * 0.36, width * 0.36, length, color);
}
