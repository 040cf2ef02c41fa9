/**
 * What is written down, and how older layouts become today's. Every record bears its layout number; reading
 * goes up the ladder one step at a time and then through the parsers of craft/.
 */
import { z } from 'zod';
import { buildSchema, parseBuild } from '../../craft/build.ts';
import { parseWith } from '../../craft/fields.ts';
import { gainsSchema, parseGains } from '../../craft/gains.ts';
import { refuse } from '../../craft/problem.ts';
import { parseScene, sceneSchema } from '../../craft/scene.ts';
import { parseWind, windSchema } from '../../craft/wind.ts';
import {
  DEFAULT_SETTINGS,
  PLACES,
  THEMES,
  UNIT_SYSTEMS,
  type CraftWork,
  type Desk,
  type GainSet,
  type Settings,
} from '../store/document.ts';

/** Layout 1 knew neither saved histories nor sheets; 2 is today's. */
export const LAYOUT = 2;

export interface CraftRecord extends CraftWork {
  readonly layout: typeof LAYOUT;
  /** Grows with every save of any window; tells which one is newer. */
  readonly revision: number;
}

type Raw = Record<string, unknown>;
/** Step n makes layout n + 1 from layout n. */
const LADDER: Readonly<Record<number, (raw: Raw) => Raw>> = {
  1: ({ gainsA, gainsB, build, ...rest }) => {
    const set = (gains: unknown) => (gains === null ? null : { working: gains, saved: gains, history: [] });
    return {
      ...rest,
      layout: 2,
      build,
      savedBuild: build,
      gainsA: set(gainsA),
      gainsB: set(gainsB ?? null),
      sheets: {},
    };
  },
};

/** @throws InputError for a layout that is unknown or later than today's. */
function today(raw: unknown, file: string): Raw {
  if (typeof raw !== 'object' || raw === null) throw refuse(file, '', raw, 'a record');
  let record = raw as Raw;
  while (record.layout !== LAYOUT) {
    const step = typeof record.layout === 'number' ? LADDER[record.layout] : undefined;
    if (step === undefined) throw refuse(file, 'layout', record.layout, `a layout from 1 to ${LAYOUT}`);
    record = step(record);
  }
  return record;
}

const versionSchema = z.strictObject({
  savedAt: z.string().max(40),
  note: z.string().max(2000),
  gains: gainsSchema,
});
const gainSetSchema = z.strictObject({
  working: gainsSchema,
  saved: gainsSchema,
  history: z.array(versionSchema).max(1000),
});
const craftSchema = z.strictObject({
  layout: z.literal(LAYOUT),
  id: z.string().min(1).max(80),
  revision: z.number().int().min(0),
  build: buildSchema,
  savedBuild: buildSchema,
  gainsA: gainSetSchema,
  gainsB: gainSetSchema.nullable(),
  sheets: z.record(z.string().max(80), z.unknown()),
});

/** @throws InputError naming what cannot be used. */
export function readCraftRecord(raw: unknown, file: string): CraftRecord {
  const record = parseWith(craftSchema, today(raw, file), file);
  return {
    ...record,
    build: parseBuild(record.build, `${file}, build`),
    savedBuild: parseBuild(record.savedBuild, `${file}, saved build`),
    gainsA: readGainSet(record.gainsA, `${file}, gains A`),
    gainsB: record.gainsB === null ? null : readGainSet(record.gainsB, `${file}, gains B`),
  };
}

function readGainSet(set: GainSet, file: string): GainSet {
  return {
    working: parseGains(set.working, file),
    saved: parseGains(set.saved, file),
    history: set.history.map((version) => ({ ...version, gains: parseGains(version.gains, file) })),
  };
}

const deskSchema = z.object({
  currentId: z.string(),
  side: z.enum(['A', 'B']),
  place: z.enum(PLACES),
  wind: windSchema,
  scene: sceneSchema,
});

/** @throws InputError naming what cannot be used. */
export function readDesk(raw: unknown, file: string): Desk {
  const desk = parseWith(deskSchema, raw, file);
  return { ...desk, wind: parseWind(desk.wind, file), scene: parseScene(desk.scene, file) };
}

const settingsSchema = z.object({
  theme: z.enum(THEMES).catch(DEFAULT_SETTINGS.theme),
  units: z.enum(UNIT_SYSTEMS).catch(DEFAULT_SETTINGS.units),
  reducedMotion: z.enum(['auto', 'on']).catch(DEFAULT_SETTINGS.reducedMotion),
  sticks: z.record(z.string(), z.unknown()).catch({}),
  places: z.record(z.string(), z.unknown()).catch({}),
});

/** Settings never fail: what cannot be read becomes the default. */
export function readSettings(raw: unknown): Settings {
  const parsed = settingsSchema.safeParse(raw);
  return parsed.success ? parsed.data : DEFAULT_SETTINGS;
}
