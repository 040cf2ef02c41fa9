/** The scene file, `gustbench.scene/1`: a flying site as data: ground, solids, air, wind, pilot's place. */
import { z } from 'zod';
import { formatTag, parseWith, positive, quantity, title, vector } from './fields.ts';
import { windSchema, parseWind } from './wind.ts';

export const SCENE_FORMAT = 'gustbench.scene/1';

const solid = z.strictObject(
  {
    name: title(),
    /** Centre, north-east-down, metres; the ground is at down = 0. */
    centre_m: vector(-5000, 5000, 'm'),
    size_m: z.tuple([positive(5000, 'm'), positive(5000, 'm'), positive(5000, 'm')], {
      error: 'three numbers above 0, up to 5000 m',
    }),
    heading_deg: quantity(-360, 360, 'deg').default(0),
    /** How it is drawn; nothing in the physics depends on it. */
    look: z.enum(['wall', 'pier', 'deck', 'rock', 'water', 'floor'], {
      error: 'one of "wall", "pier", "deck", "rock", "water", "floor"',
    }),
    /** A wake downwind of it: velocity deficit and added turbulence. */
    wake: z
      .strictObject({
        deficit: quantity(0, 1, ''),
        turbulence_share: quantity(0, 1, ''),
        length_m: positive(1000, 'm'),
      })
      .optional(),
    collides: z.boolean({ error: 'true or false' }).default(true),
  },
  { error: 'a solid' },
);

/** Lines on the ground, drawn only: courts, paths, roads. */
const marking = z.strictObject(
  {
    tone: z.enum(['paint', 'path'], { error: 'one of "paint", "path"' }),
    width_m: positive(50, 'm'),
    /** Places north, east along the middle of the line. */
    line_m: z
      .array(z.tuple([quantity(-5000, 5000, 'm'), quantity(-5000, 5000, 'm')]), {
        error: 'a list of [north, east]',
      })
      .min(2, { error: 'at least 2 places' })
      .max(200, { error: 'at most 200 places' }),
  },
  { error: 'an object with tone, width_m, line_m' },
);

export const sceneSchema = z.strictObject(
  {
    format: formatTag(SCENE_FORMAT),
    name: title(),
    title: title(),
    note: z.string().max(1000).optional(),
    elevation_m: quantity(-450, 6000, 'm'),
    /** Air temperature of the day; absent: ISO 2533 at the elevation. */
    temperature_K: quantity(220, 330, 'K').optional(),
    /** Station pressure of the day; absent: ISO 2533 at the elevation. */
    pressure_Pa: quantity(40_000, 110_000, 'Pa').optional(),
    ground: z.strictObject({
      tone: z.enum(['grass', 'water', 'stone', 'hall'], {
        error: 'one of "grass", "water", "stone", "hall"',
      }),
      friction: quantity(0, 2, '').default(0.6),
      restitution: quantity(0, 0.9, '').default(0.2),
    }),
    solids: z.array(solid).max(200, { error: 'at most 200 solids' }).default([]),
    markings: z
      .array(marking, { error: 'a list of markings' })
      .max(100, { error: 'at most 100 markings' })
      .default([]),
    start: z.strictObject({
      position_m: vector(-5000, 5000, 'm'),
      heading_deg: quantity(-360, 360, 'deg').default(0),
    }),
    pilot_m: vector(-5000, 5000, 'm'),
    wind: windSchema,
  },
  { error: 'a scene object' },
);

export type Scene = z.output<typeof sceneSchema>;
export type Solid = Scene['solids'][number];
export type Marking = Scene['markings'][number];

/**
 * Validates a scene object, its wind included.
 * @throws InputError naming path, value and what is allowed.
 */
export function parseScene(raw: unknown, file = 'scene'): Scene {
  const scene = parseWith(sceneSchema, raw, file);
  parseWind(scene.wind, file);
  return scene;
}

/** An endless flat field at sea level in standard air: what a flight without a scene flies over. */
export const OPEN_FIELD: Scene = parseScene({
  format: SCENE_FORMAT,
  name: 'open-field',
  title: 'Open field',
  elevation_m: 0,
  ground: { tone: 'grass' },
  start: { position_m: [0, 0, 0] },
  pilot_m: [-6, 0, -1.7],
  wind: { format: 'gustbench.wind/1' },
});
