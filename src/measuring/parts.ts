/**
 * Inertia from parts where no swing test was made: boxes, cylinders, point masses, each about its own centre,
 * moved to the common centre of mass by the parallel-axis (Huygens–Steiner) rule.
 */
import { z } from 'zod';
import { choice, formatTag, parseWith, positive, quantity, title, vector } from '../craft/fields.ts';
import { loopGainSentence, quantified, type Estimate, type Quantified } from './estimate.ts';

export const PARTS_FORMAT = 'gustbench.parts/1';

const place = {
  name: title(),
  mass_kg: positive(100, 'kg'),
  /** Its centre from the body origin. */
  position_m: vector(-5, 5, 'm'),
  /** One-sigma doubt of the mass and of each coordinate. */
  massSigma_kg: quantity(0, 10, 'kg').default(0.001),
  positionSigma_m: quantity(0, 1, 'm').default(0.002),
};
const edge = positive(5, 'm');
const box = z.strictObject({
  ...place,
  shape: z.literal('box'),
  /** Full edges along its own x, y, z. */
  size_m: z.tuple([edge, edge, edge], { error: 'three numbers above 0, up to 5 m' }),
  /** Turn about body z: 45 for the arm of an X frame. */
  heading_deg: quantity(-360, 360, 'deg').default(0),
});
const cylinder = z.strictObject({
  ...place,
  shape: z.literal('cylinder'),
  axis: choice(['x', 'y', 'z']),
  radius_m: positive(5, 'm'),
  /** Of a tube. */
  innerRadius_m: quantity(0, 5, 'm').default(0),
  length_m: positive(5, 'm'),
  heading_deg: quantity(-360, 360, 'deg').default(0),
});
const point = z.strictObject({ ...place, shape: z.literal('point') });

const partsSchema = z.strictObject(
  {
    format: formatTag(PARTS_FORMAT),
    parts: z
      .array(
        z.discriminatedUnion('shape', [box, cylinder, point], {
          error: 'a part of shape "box", "cylinder" or "point"',
        }),
        {
          error: 'a list of parts',
        },
      )
      .min(1, { error: 'at least one part' })
      .max(500, { error: 'at most 500 parts' }),
    /** The craft on the scale: the parts' masses are scaled to it. */
    weighedMass_kg: positive(150, 'kg').optional(),
  },
  { error: 'a parts object' },
);

export type PartsFile = z.output<typeof partsSchema>;
type Part = PartsFile['parts'][number];
type Vector = readonly [number, number, number];

/** @throws InputError naming path, value and what is allowed. */
export function parseParts(raw: unknown, file = 'parts'): PartsFile {
  return parseWith(partsSchema, raw, file);
}

type Tensor = 'xx' | 'yy' | 'zz' | 'xy' | 'xz' | 'yz';

export interface PartsResult {
  readonly measurement: 'parts';
  readonly mass_kg: Estimate;
  readonly centreOfMass_m: readonly [Estimate, Estimate, Estimate];
  readonly quantities: Record<`inertia_${Tensor}_kgm2`, Quantified>;
  readonly notes: readonly string[];
}

/** Doubt of shapes that stand for real parts, one sigma of the moments; common practice, no source. */
const SHAPE_DOUBT = 0.05;

/** Mass, centre of mass and inertia tensor about it, body axes, with first-order uncertainty. */
export function inertiaFromParts(file: PartsFile): PartsResult {
  const notes: string[] = [];
  const sum = file.parts.reduce((total, part) => total + part.mass_kg, 0);
  const scale = file.weighedMass_kg === undefined ? 1 : file.weighedMass_kg / sum;
  if (Math.abs(scale - 1) > 0.05) {
    notes.push(
      `The parts weigh ${sum.toFixed(3)} kg together, the craft ${file.weighedMass_kg} kg: every mass is scaled by ${scale.toFixed(3)}. Wiring and screws left out, or a part forgotten?`,
    );
  }
  const centre = bodyOf(file.parts, scale);
  const variance = new Float64Array(10);
  // GUM first order: each mass and each coordinate moved by its sigma, one at a time.
  const shift = (change: (part: Part) => Part, index: number) => {
    const moved = bodyOf(
      file.parts.map((part, i) => (i === index ? change(part) : part)),
      scale,
    );
    for (let k = 0; k < 10; k++) variance[k] += (moved[k] - centre[k]) ** 2;
  };
  file.parts.forEach((part, i) => {
    shift((one) => ({ ...one, mass_kg: one.mass_kg + one.massSigma_kg }), i);
    for (const axis of [0, 1, 2]) {
      shift((one) => ({ ...one, position_m: moveBy(one.position_m, axis, part.positionSigma_m) }), i);
    }
  });
  const estimate = (k: number, unit: string, doubt = 0): Estimate => ({
    value: centre[k],
    sigma: Math.hypot(Math.sqrt(variance[k]), doubt * Math.abs(centre[k])),
    unit,
  });
  const names: readonly Tensor[] = ['xx', 'yy', 'zz', 'xy', 'xz', 'yz'];
  const meaning = (name: Tensor, one: Estimate): string =>
    name === 'xx' || name === 'yy' || name === 'zz'
      ? loopGainSentence(`The estimate about ${AXIS_OF[name]}`, one, AXIS_OF[name])
      : 'Couples two axes; small beside the moments, it hardly touches the gains.';
  const quantities = Object.fromEntries(
    names.map((name, i) => {
      const one = estimate(4 + i, 'kg·m²', SHAPE_DOUBT);
      return [`inertia_${name}_kgm2`, quantified(one, meaning(name, one))];
    }),
  ) as PartsResult['quantities'];
  notes.push('An estimate: the shapes stand for real parts to about 5 %. A swing test is surer.');
  return {
    measurement: 'parts',
    mass_kg: estimate(0, 'kg'),
    centreOfMass_m: [estimate(1, 'm'), estimate(2, 'm'), estimate(3, 'm')],
    quantities,
    notes,
  };
}

const AXIS_OF = { xx: 'roll', yy: 'pitch', zz: 'yaw' } as const;

function moveBy(position: Vector, axis: number, by: number): [number, number, number] {
  const moved: [number, number, number] = [...position];
  moved[axis] += by;
  return moved;
}

/** mass, centre x y z, tensor xx yy zz xy xz yz (the tensor's own elements) about the centre. */
function bodyOf(parts: readonly Part[], scale: number): Float64Array {
  const out = new Float64Array(10);
  for (const part of parts) {
    out[0] += scale * part.mass_kg;
    for (let axis = 0; axis < 3; axis++) out[1 + axis] += scale * part.mass_kg * part.position_m[axis];
  }
  for (let axis = 0; axis < 3; axis++) out[1 + axis] /= out[0];
  for (const part of parts) {
    const m = scale * part.mass_kg;
    const [x, y, z] = part.position_m.map((value, axis) => value - out[1 + axis]);
    const [ix, iy, iz, ixy] = ownInertia(part).map((value) => scale * value);
    out[4] += ix + m * (y * y + z * z);
    out[5] += iy + m * (x * x + z * z);
    out[6] += iz + m * (x * x + y * y);
    out[7] += ixy - m * x * y;
    out[8] += -m * x * z;
    out[9] += -m * y * z;
  }
  return out;
}

/** xx, yy, zz, xy about the part's own centre, body axes. */
function ownInertia(part: Part): [number, number, number, number] {
  if (part.shape === 'point') return [0, 0, 0, 0];
  const m = part.mass_kg;
  let own: [number, number, number];
  if (part.shape === 'box') {
    const [a, b, c] = part.size_m;
    own = [(m / 12) * (b * b + c * c), (m / 12) * (a * a + c * c), (m / 12) * (a * a + b * b)];
  } else {
    const squares = part.radius_m ** 2 + part.innerRadius_m ** 2;
    const along = (m / 2) * squares;
    const across = (m / 12) * (3 * squares + part.length_m ** 2);
    own = [across, across, across];
    own['xyz'.indexOf(part.axis)] = along;
  }
  const turn = (part.heading_deg * Math.PI) / 180;
  const [c, s] = [Math.cos(turn), Math.sin(turn)];
  return [
    c * c * own[0] + s * s * own[1],
    s * s * own[0] + c * c * own[1],
    own[2],
    c * s * (own[0] - own[1]),
  ];
}
