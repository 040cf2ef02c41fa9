/**
 * The craft drawn from its build's own geometry: arms to the rotor positions, discs to the diameter, legs,
 * payload, nose. A changed arm length shows. Built in body axes (converted by axes.ts).
 */
import {
  BoxGeometry,
  CircleGeometry,
  ConeGeometry,
  CylinderGeometry,
  DoubleSide,
  Group,
  Mesh,
  MeshBasicMaterial,
  MeshLambertMaterial,
  Quaternion,
  Vector3,
} from 'three';
import { CORNERS, type Build } from '../../craft/build.ts';
import { toThree } from './axes.ts';
import type { ViewPalette } from './palette.ts';

/** Turning is drawn this much slower than it is, so that the eye can follow. */
const SLOW_MOTION = 0.022;
/** Rotor speed at which only the disc is seen, rad/s. */
const BLURRED_RADPS = 220;

export class CraftModel {
  readonly group = new Group();
  private readonly discs: MeshBasicMaterial[] = [];
  private readonly blades: Group[] = [];
  private readonly bladeMaterials: MeshBasicMaterial[] = [];
  private readonly arrows: Mesh[] = [];
  private readonly spins: number[];
  private readonly payload: Mesh | null = null;
  private readonly thrustScale_m_per_N: number;
  /** Largest extent, m: cameras keep their distance by it. */
  readonly reach_m: number;

  constructor(build: Build, palette: ViewPalette) {
    const com = build.airframe.centreOfMass_m;
    const rotors = CORNERS.map(
      (corner) => build.rotors.find((one) => one.corner === corner) ?? build.rotors[0],
    );
    this.spins = rotors.map((rotor) => (rotor.spin === 'cw' ? 1 : -1));
    const radius = build.propeller.diameter_m / 2;
    this.reach_m = Math.max(...rotors.map((r) => Math.hypot(r.position_m[0], r.position_m[1]))) + radius;
    this.thrustScale_m_per_N = (0.9 * this.reach_m * 4) / (build.airframe.mass_kg * 9.81);
    const at = (p: readonly number[]) => toThree(new Vector3(), p[0] - com[0], p[1] - com[1], p[2] - com[2]);
    const arm = new MeshLambertMaterial({ color: palette.arm, flatShading: true });
    const body = new MeshLambertMaterial({ color: palette.craft, flatShading: true });
    const hub = at([0, 0, 0]);
    const size = 0.34 * this.reach_m;
    const plate = new Mesh(new BoxGeometry(size * 0.8, size * 0.28, size * 1.25), body);
    plate.position.copy(hub);
    this.group.add(plate, this.nose(hub, size, palette));
    for (const rotor of rotors) {
      const tip = at(rotor.position_m);
      this.group.add(beam(hub, tip, 0.045 * this.reach_m, arm));
      this.addRotor(tip, radius, build.propeller.blades ?? 2, palette);
    }
    this.addLegs(build, hub, arm);
    if (build.payload !== undefined) this.payload = this.addPayload(build.payload, at, palette);
  }

  private nose(hub: Vector3, size: number, palette: ViewPalette): Mesh {
    const nose = new Mesh(
      new ConeGeometry(size * 0.26, size * 0.6, 4),
      new MeshLambertMaterial({ color: palette.nose, flatShading: true }),
    );
    nose.rotation.x = -Math.PI / 2;
    nose.position.copy(hub).add(new Vector3(0, 0, -size * 0.92));
    return nose;
  }

  private addRotor(tip: Vector3, radius: number, blades: number, palette: ViewPalette): void {
    const disc = new MeshBasicMaterial({
      color: palette.disc,
      transparent: true,
      opacity: 0.2,
      side: DoubleSide,
      depthWrite: false,
    });
    const circle = new Mesh(new CircleGeometry(radius, 20), disc);
    circle.rotation.x = -Math.PI / 2;
    circle.position.copy(tip);
    const bladeMaterial = new MeshBasicMaterial({ color: palette.blade, transparent: true });
    const turning = new Group();
    for (let k = 0; k < blades; k++) {
      const blade = new Mesh(new BoxGeometry(radius, 0.006 + radius * 0.015, radius * 0.13), bladeMaterial);
      blade.position.x = radius / 2;
      const holder = new Group();
      holder.rotation.y = (2 * Math.PI * k) / blades;
      holder.add(blade);
      turning.add(holder);
    }
    turning.position.copy(tip);
    const arrow = new Mesh(
      new CylinderGeometry(0.012 * this.reach_m, 0.024 * this.reach_m, 1, 5),
      new MeshBasicMaterial({ color: palette.thrust }),
    );
    arrow.position.copy(tip);
    this.discs.push(disc);
    this.blades.push(turning);
    this.bladeMaterials.push(bladeMaterial);
    this.arrows.push(arrow);
    this.group.add(circle, turning, arrow);
  }

  private addLegs(build: Build, hub: Vector3, material: MeshLambertMaterial): void {
    const height = build.airframe.legs?.height_m ?? 0.35 * build.propeller.diameter_m;
    const half = build.airframe.legs?.halfTrack_m ?? 0.3 * this.reach_m;
    for (const side of [1, -1]) {
      for (const end of [1, -1]) {
        const foot = new Vector3(side * half, hub.y - height, end * half);
        const knee = new Vector3(side * half * 0.4, hub.y, end * half * 0.4);
        this.group.add(beam(knee, foot, 0.022 * this.reach_m, material));
      }
    }
  }

  private addPayload(
    payload: NonNullable<Build['payload']>,
    at: (p: readonly number[]) => Vector3,
    palette: ViewPalette,
  ): Mesh {
    const [x, y, z] = payload.size_m;
    const box = new Mesh(
      new BoxGeometry(y, z, x),
      new MeshLambertMaterial({ color: palette.payload, flatShading: true }),
    );
    box.position.copy(at(payload.position_m));
    this.group.add(box);
    return box;
  }

  /** Rotor speeds rad/s, thrusts N, flags; `dt_s` since the last call. */
  update(
    speeds: ArrayLike<number>,
    thrusts: ArrayLike<number>,
    dt_s: number,
    arrows: boolean,
    loaded: boolean,
  ): void {
    for (let i = 0; i < 4; i++) {
      const speed = Math.abs(speeds[i]);
      // Clockwise seen from above is a negative turn about three's y.
      this.blades[i].rotation.y -= this.spins[i] * speed * SLOW_MOTION * dt_s * 2 * Math.PI;
      const blur = Math.min(1, speed / BLURRED_RADPS);
      this.discs[i].opacity = 0.05 + 0.2 * blur;
      this.bladeMaterials[i].opacity = 1 - 0.72 * blur;
      const length = thrusts[i] * this.thrustScale_m_per_N;
      this.arrows[i].visible = arrows && Math.abs(length) > 0.005;
      if (this.arrows[i].visible) {
        this.arrows[i].scale.y = length;
        this.arrows[i].position.y = this.blades[i].position.y + length / 2;
      }
    }
    if (this.payload !== null) this.payload.visible = loaded;
  }
}

/** A square bar from a to b. */
function beam(a: Vector3, b: Vector3, width: number, material: MeshLambertMaterial): Mesh {
  const along = new Vector3().subVectors(b, a);
  const length = along.length();
  const mesh = new Mesh(new BoxGeometry(width, length, width), material);
  mesh.position.copy(a).addScaledVector(along, 0.5);
  mesh.quaternion.copy(new Quaternion().setFromUnitVectors(new Vector3(0, 1, 0), along.normalize()));
  return mesh;
}
