/**
 * What the bench keeps for a person: crafts with their builds and gain sets, the desk (what lies on it now)
 * and settings. Plain immutable data; the store holds it in signals, storage writes it down.
 */
import type { Build } from '../../craft/build.ts';
import type { Gains } from '../../craft/gains.ts';
import type { Scene } from '../../craft/scene.ts';
import type { Wind } from '../../craft/wind.ts';

export const PLACES = ['measure', 'shape', 'fly', 'prove', 'match', 'carry'] as const;
export type PlaceName = (typeof PLACES)[number];

export type Side = 'A' | 'B';

/** One saved state of a gain set, with the person's note. */
export interface GainsVersion {
  /** ISO 8601, UTC. */
  readonly savedAt: string;
  readonly note: string;
  readonly gains: Gains;
}

/** A gain set: what is being tried, what was last saved, and everything saved before, newest last. */
export interface GainSet {
  readonly working: Gains;
  readonly saved: Gains;
  readonly history: readonly GainsVersion[];
}

/** One craft on the bench. */
export interface CraftWork {
  readonly id: string;
  readonly build: Build;
  readonly savedBuild: Build;
  readonly gainsA: GainSet;
  readonly gainsB: GainSet | null;
  /** What the places keep about this craft (worksheets, trial results), each under its own name, as JSON. */
  readonly sheets: Readonly<Record<string, unknown>>;
}

export const THEMES = ['auto', 'light', 'dark', 'contrast'] as const;
export type ThemeChoice = (typeof THEMES)[number];
export const UNIT_SYSTEMS = ['metric', 'imperial'] as const;
export type UnitSystem = (typeof UNIT_SYSTEMS)[number];

export interface Settings {
  readonly theme: ThemeChoice;
  readonly units: UnitSystem;
  readonly reducedMotion: 'auto' | 'on';
  /** Stick settings per device, as the input code wrote them. */
  readonly sticks: Readonly<Record<string, unknown>>;
  /** Anything else a place remembers between visits, under its own name. */
  readonly places: Readonly<Record<string, unknown>>;
}

export const DEFAULT_SETTINGS: Settings = {
  theme: 'auto',
  units: 'metric',
  reducedMotion: 'auto',
  sticks: {},
  places: {},
};

/** What lies on the desk: the choices that a reload brings back. */
export interface Desk {
  readonly currentId: string;
  readonly side: Side;
  readonly place: PlaceName;
  readonly wind: Wind;
  readonly scene: Scene;
}

/** Everything that is kept. */
export interface WorkDocument {
  readonly crafts: readonly CraftWork[];
  readonly desk: Desk;
  readonly settings: Settings;
}

export function newGainSet(gains: Gains): GainSet {
  return { working: gains, saved: gains, history: [] };
}

export function newCraft(build: Build, gains: Gains): CraftWork {
  return {
    id: crypto.randomUUID(),
    build,
    savedBuild: build,
    gainsA: newGainSet(gains),
    gainsB: null,
    sheets: {},
  };
}

/** Equal as written to a file; schema output has a fixed order of keys. */
export function sameJson(a: unknown, b: unknown): boolean {
  return a === b || JSON.stringify(a) === JSON.stringify(b);
}

/** `wanted`, or `wanted 2`, `wanted 3`, … : the first that `taken` does not hold. */
export function freeName(wanted: string, taken: readonly string[]): string {
  if (!taken.includes(wanted)) return wanted;
  const stem = wanted.slice(0, 112);
  for (let n = 2; ; n++) {
    const name = `${stem} ${n}`;
    if (!taken.includes(name)) return name;
  }
}
