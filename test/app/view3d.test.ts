import { readFileSync } from 'node:fs';
import fc from 'fast-check';
import { Box3, Mesh, Quaternion, Vector3, type BufferGeometry } from 'three';
import { describe, expect, it } from 'vitest';
import { AirModel } from '../../src/app/view3d/air.ts';
import { fromThree, headingToThree, toThree, turnToThree } from '../../src/app/view3d/axes.ts';
import { CameraRig } from '../../src/app/view3d/cameras.ts';
import { CraftModel } from '../../src/app/view3d/craftModel.ts';
import { facetsOf } from '../../src/app/view3d/facets.ts';
import { HeightMarks } from '../../src/app/view3d/marks.ts';
import { paletteOf } from '../../src/app/view3d/palette.ts';
import { SiteModel } from '../../src/app/view3d/siteModel.ts';
import { SolidSpace } from '../../src/app/view3d/solids.ts';
import type { Build } from '../../src/craft/build.ts';
import { parseScene, type Solid } from '../../src/craft/scene.ts';
import { quaternionFromEuler, rotateToWorld } from '../../src/math/quaternion.ts';
import { demoBuild } from '../physics/builds.ts';

const palette = paletteOf('light', 'grass');
const sites = ['estuary-bridge', 'quarry-face', 'sports-hall'].map((name) =>
  parseScene(
    JSON.parse(readFileSync(new URL(`../../scenes/${name}.scene.json`, import.meta.url), 'utf8')),
    name,
  ),
);
const [bridge] = sites;
const angle = fc.double({ min: -Math.PI, max: Math.PI, noNaN: true });

const box = (name: string, centre_m: number[], size_m: number[], heading_deg = 0): Solid =>
  ({ name, centre_m, size_m, heading_deg, look: 'wall', collides: true }) as Solid;

describe('axes of the view', () => {
  it('north is into the picture, east to the right, down is down; and back', () => {
    expect(toThree(new Vector3(), 1, 0, 0).toArray()).toEqual([0, -0, -1]);
    expect(toThree(new Vector3(), 0, 1, 0).toArray()).toEqual([1, -0, -0]);
    expect(toThree(new Vector3(), 0, 0, 1).toArray()).toEqual([0, -1, -0]);
    expect(Array.from(fromThree(new Float64Array(3), toThree(new Vector3(), 3, -4, 5)))).toEqual([3, -4, 5]);
  });

  it('turning then converting is converting then turning, at any attitude (fast-check)', () => {
    fc.assert(
      fc.property(angle, angle, angle, fc.tuple(angle, angle, angle), (roll, pitch, yaw, v) => {
        const q = quaternionFromEuler(roll, pitch / 2, yaw);
        const world = rotateToWorld(q, v);
        const here = toThree(new Vector3(), v[0], v[1], v[2]).applyQuaternion(
          turnToThree(new Quaternion(), q[0], q[1], q[2], q[3]),
        );
        expect(here.distanceTo(toThree(new Vector3(), world[0], world[1], world[2]))).toBeLessThan(1e-12);
      }),
    );
  });

  it('a heading turns clockwise seen from above', () => {
    const turn = new Quaternion().setFromAxisAngle(new Vector3(0, 1, 0), headingToThree(Math.PI / 2));
    const east = toThree(new Vector3(), 1, 0, 0).applyQuaternion(turn);
    expect(east.distanceTo(toThree(new Vector3(), 0, 1, 0))).toBeLessThan(1e-12);
  });
});

describe('the drawn craft', () => {
  const sizeOf = (build: Build): Vector3 => {
    const { group } = new CraftModel(build, palette, true);
    return new Box3().setFromObject(group).getSize(new Vector3());
  };

  it('reaches from rim to rim: rotor distance plus a diameter, within a disc of 24 sides', () => {
    const build = demoBuild('sandpiper');
    const size = sizeOf(build);
    const wide = 2 * 0.16 + build.propeller.diameter_m;
    expect(Math.abs(size.x - wide)).toBeLessThan(0.01 * wide);
    expect(Math.abs(size.z - wide)).toBeLessThan(0.01 * wide);
  });

  it('an arm 50 mm longer on each side is drawn 100 mm wider', () => {
    const build = demoBuild('sandpiper');
    const longer = {
      ...build,
      rotors: build.rotors.map((rotor) => ({
        ...rotor,
        position_m: [rotor.position_m[0], rotor.position_m[1] + 0.05 * Math.sign(rotor.position_m[1]), 0],
      })) as unknown as Build['rotors'],
    };
    expect(sizeOf(longer).x - sizeOf(build).x).toBeCloseTo(0.1, 6);
  });

  it('stands on its feet where the contact model has them, and is a whole: every face looks outward', () => {
    const build = demoBuild('wren');
    const model = new CraftModel(build, palette, true);
    const hull = model.group.children[0];
    if (!(hull instanceof Mesh)) throw new Error('no hull');
    const geometry = hull.geometry as BufferGeometry;
    geometry.computeBoundingBox();
    const legs = build.airframe.legs;
    if (legs === undefined) throw new Error('no legs');
    const com = build.airframe.centreOfMass_m;
    expect(geometry.boundingBox?.min.y).toBeCloseTo(-(legs.height_m - com[2]), 2);
    // Signed volume by the divergence theorem: closed, outward faces give more than nothing.
    const { corners, starts } = facetsOf(geometry) ?? { corners: [], starts: [0] };
    let volume = 0;
    const at = (k: number) => new Vector3(corners[3 * k], corners[3 * k + 1], corners[3 * k + 2]);
    for (let i = 0; i + 1 < starts.length; i++) {
      for (let k = starts[i] + 1; k + 1 < starts[i + 1]; k++) {
        volume += at(starts[i]).dot(at(k).cross(at(k + 1))) / 6;
      }
    }
    expect(volume).toBeGreaterThan(0);
  });

  it('blades turn in their rotor’s sense, drawn never fast enough to seem to stand at 30 frames a second', () => {
    const build = demoBuild('sandpiper');
    const model = new CraftModel(build, palette, true);
    const blades = model.group.children
      .slice(-4)
      .map((rotor) =>
        rotor.children.find(
          (part) => part instanceof Mesh && part.rotation.y !== undefined && part.position.y > 0,
        ),
      );
    model.update([2000, 2000, 2000, 2000], [0, 0, 0, 0], 1 / 30, { thrust: true, loaded: true });
    const turned = blades.map((one) => one?.rotation.y ?? 0);
    // Clockwise from above (FL, RR of the Sandpiper) is negative about three's y.
    expect(turned.map(Math.sign)).toEqual([-1, 1, 1, -1]);
    for (const turn of turned) expect(Math.abs(turn)).toBeLessThan(Math.PI / 2);
  });
});

describe('what hides what', () => {
  it('draws every hidden solid before the one that hides it, at all three sites (fast-check)', () => {
    for (const site of sites) {
      const { space, meshes } = new SiteModel(site, palette);
      const blocks = site.solids.filter((one) => one.look !== 'water');
      const place = fc.tuple(
        fc.double({ min: -15, max: 15, noNaN: true }),
        fc.double({ min: -9, max: 9, noNaN: true }),
        fc.double({ min: -8, max: -0.3, noNaN: true }),
      );
      fc.assert(
        fc.property(place, place, place, (eye, ball, aim) => {
          const order = space.order(eye, ball, []);
          expect([...order].sort((a, b) => a - b)).toEqual([...Array(meshes.length + 1).keys()]);
          // A ray through the scene meets solids from near to far: the far ones must come first.
          const to = eye.map((from, k) => from + 60 * (aim[k] - from));
          const met = blocks
            .map((solid, i) => ({ i, share: new SolidSpace([solid]).clearShare(eye, to, 0) }))
            .filter(({ share }) => share > 0 && share < 1)
            .sort((a, b) => a.share - b.share);
          for (let k = 0; k + 1 < met.length; k++) {
            if (met[k + 1].share - met[k].share < 1e-4) continue;
            expect(
              order.indexOf(met[k].i),
              `${blocks[met[k].i].name} hides ${blocks[met[k + 1].i].name}`,
            ).toBeGreaterThan(order.indexOf(met[k + 1].i));
          }
        }),
        { numRuns: 150 },
      );
    }
  });

  it('the craft is drawn after a wall behind it and before a wall in front of it', () => {
    const space = new SolidSpace([
      box('behind', [5, 0, -2], [0.3, 10, 4]),
      box('before', [-5, 0, -1], [0.3, 10, 2]),
    ]);
    expect(space.order([-10, 0, -1.7], [0, 0, -1], [])).toEqual([0, 2, 1]);
    expect(space.order([10, 0, -1.7], [0, 0, -1], [])).toEqual([1, 2, 0]);
  });

  it('finds the top under the craft, the heading of a solid minded', () => {
    const space = new SolidSpace([box('stage', [0, 0, -0.2], [8, 1, 0.4], 90)]);
    expect(space.topBelow(0, 3, -2)).toBeCloseTo(-0.4);
    expect(space.topBelow(3, 0, -2)).toBe(0);
    expect(space.topBelow(0, 3, -0.1), 'under it').toBe(0);
  });
});

describe('cameras', () => {
  const level = new Quaternion();

  it('the pilot stands where the scene says and looks at the craft', () => {
    const rig = new CameraRig();
    rig.setPilot(...bridge.pilot_m);
    rig.choose('pilot');
    const craft = toThree(new Vector3(), 20, 30, -6);
    rig.update(craft, level, 0.35, new SiteModel(bridge, palette).space, 0.02);
    expect(rig.camera.position.distanceTo(toThree(new Vector3(), ...bridge.pilot_m))).toBeLessThan(1e-9);
    const seen = craft.clone().project(rig.camera);
    expect(Math.hypot(seen.x, seen.y)).toBeLessThan(1e-6);
  });

  it('chase stands behind the nose and settles there', () => {
    const rig = new CameraRig();
    const space = new SolidSpace([]);
    const east = turnToThree(new Quaternion(), ...quaternionFromEuler(0, 0, Math.PI / 2));
    const craft = toThree(new Vector3(), 0, 0, -5);
    for (let k = 0; k < 200; k++) rig.update(craft, east, 0.35, space, 0.02);
    const [north, eastOf] = fromThree(new Float64Array(3), rig.camera.position);
    expect(eastOf).toBeLessThan(-1);
    expect(Math.abs(north)).toBeLessThan(1e-6);
  });

  it('a wall behind the craft brings the eye nearer instead of hiding the craft', () => {
    const rig = new CameraRig();
    const space = new SolidSpace([box('wall', [-1, 0, -3], [0.3, 20, 6])]);
    rig.update(toThree(new Vector3(), 0, 0, -2), level, 0.35, space, 0.02);
    const [north] = fromThree(new Float64Array(3), rig.camera.position);
    expect(north).toBeGreaterThan(-0.85);
    expect(north).toBeLessThan(0);
  });

  it('never goes under the ground', () => {
    const rig = new CameraRig();
    rig.choose('free');
    rig.drag(0, -5);
    rig.update(toThree(new Vector3(), 0, 0, -0.2), level, 0.35, new SolidSpace([]), 0.02);
    expect(rig.camera.position.y).toBeGreaterThan(0.1);
  });
});

describe('air and height', () => {
  it('streaks move with the air: wind times time, inside their box', () => {
    const air = new AirModel(0.35, palette);
    const centre = new Vector3(0, 40, 0);
    const wind = toThree(new Vector3(), 0, 6, 0);
    const shows = { streaks: true, wind: true };
    air.update(centre, wind, 0, shows);
    const heads = () =>
      Array.from({ length: 40 }, (_, i) => air.streaks.geometry.getAttribute('position').getX(2 * i));
    const before = heads();
    air.update(centre, wind, 0.05, shows);
    const moved = heads().map((x, i) => x - before[i]);
    const stayed = moved.filter((way) => Math.abs(way - 0.3) < 1e-5);
    expect(stayed.length).toBeGreaterThan(34);
    expect(moved.filter((way) => Math.abs(way - 0.3) >= 1e-5).every((way) => way < -10)).toBe(true);
    expect(air.arrow.visible).toBe(true);
    air.update(centre, new Vector3(), 0.05, shows);
    expect([air.streaks.visible, air.arrow.visible]).toEqual([false, false]);
  });

  it('the pole counts metres up to the craft and the shadow lies on what is below', () => {
    const marks = new HeightMarks(0.35, palette);
    marks.update(new Vector3(2, 5.5, 1), 0.4);
    expect(marks.shadow.position.y).toBeCloseTo(0.412);
    expect(marks.pole.geometry.getAttribute('position').getY(1)).toBeCloseTo(5.1);
    expect(marks.pole.geometry.drawRange.count).toBe(2 + 4 * 4);
    marks.update(new Vector3(2, 0.5, 1), 0.4);
    expect(marks.pole.visible).toBe(false);
  });
});
