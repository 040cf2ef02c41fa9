/** The craft with its payload let go, and with its mass shifted: builds derived from a build. */
import type { Build } from './build.ts';

type Tensor = Build['airframe']['inertia_kgm2'];

/**
 * The build without its payload: mass, centre of mass and inertia by the parallel-axis rule, the payload taken
 * as a homogeneous box. A build without a payload is returned as it is.
 */
export function withoutPayload(build: Build): Build {
  const { payload, airframe } = build;
  if (payload === undefined) return build;
  const mass_kg = airframe.mass_kg - payload.mass_kg;
  const centre = airframe.centreOfMass_m.map(
    (c, axis) => (airframe.mass_kg * c - payload.mass_kg * payload.position_m[axis]) / mass_kg,
  ) as [number, number, number];
  const [a, b, c] = payload.size_m;
  const own = { x: (b * b + c * c) / 12, y: (a * a + c * c) / 12, z: (a * a + b * b) / 12 };
  // About the old centre of mass: whole − payload; then moved to the new centre.
  const load = shifted(
    {
      xx: payload.mass_kg * own.x,
      yy: payload.mass_kg * own.y,
      zz: payload.mass_kg * own.z,
      xy: 0,
      xz: 0,
      yz: 0,
    },
    payload.mass_kg,
    difference(payload.position_m, airframe.centreOfMass_m),
    1,
  );
  const rest = combine(airframe.inertia_kgm2, load, -1);
  const inertia_kgm2 = shifted(rest, mass_kg, difference(centre, airframe.centreOfMass_m), -1);
  const { payload: _gone, ...others } = build;
  return { ...others, airframe: { ...airframe, mass_kg, centreOfMass_m: centre, inertia_kgm2 } };
}

/** The build with its centre of mass moved by `shift_m` (a payload that slipped); inertia about it is kept. */
export function withShiftedCentre(build: Build, shift_m: ArrayLike<number>): Build {
  const centre = build.airframe.centreOfMass_m.map((value, axis) => value + shift_m[axis]) as [
    number,
    number,
    number,
  ];
  return { ...build, airframe: { ...build.airframe, centreOfMass_m: centre } };
}

function difference(a: readonly number[], b: readonly number[]): number[] {
  return a.map((value, axis) => value - b[axis]);
}

/** Parallel-axis rule: adds (`sign` 1) or takes (−1) m (|r|² 1 − r rᵀ). */
function shifted(t: Tensor, mass_kg: number, r: readonly number[], sign: 1 | -1): Tensor {
  const m = sign * mass_kg;
  const [x, y, z] = r;
  return {
    xx: t.xx + m * (y * y + z * z),
    yy: t.yy + m * (x * x + z * z),
    zz: t.zz + m * (x * x + y * y),
    xy: t.xy - m * x * y,
    xz: t.xz - m * x * z,
    yz: t.yz - m * y * z,
  };
}

function combine(a: Tensor, b: Tensor, share: number): Tensor {
  return {
    xx: a.xx + share * b.xx,
    yy: a.yy + share * b.yy,
    zz: a.zz + share * b.zz,
    xy: a.xy + share * b.xy,
    xz: a.xz + share * b.xz,
    yz: a.yz + share * b.yz,
  };
}
