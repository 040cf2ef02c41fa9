/** Two windows, one store: what becomes of each craft when another window has written since this one looked. */
import { freeName, type CraftWork } from '../store/document.ts';
import type { CraftRecord } from './records.ts';

export interface Known {
  /** Revision that this window last read or wrote. */
  readonly revision: number;
  /** The craft as it stood then; another object means an unwritten change here. */
  readonly craft: CraftWork;
}

export interface Merge {
  /** The crafts as they stand after the merge, in this window's order, newcomers last. */
  readonly crafts: readonly CraftWork[];
  /** Of these, the ones that have to be written. */
  readonly write: readonly CraftWork[];
  /** To be taken away from the store. */
  readonly remove: readonly string[];
  /** Names of crafts taken over from the other window. */
  readonly taken: readonly string[];
  /** Names of crafts that both changed: this window's state stays, the other one is kept as a copy. */
  readonly both: readonly string[];
}

/**
 * @param local this window's crafts
 * @param known what this window last read or wrote, by id
 * @param stored what the store holds now
 */
export function mergeCrafts(
  local: readonly CraftWork[],
  known: ReadonlyMap<string, Known>,
  stored: readonly CraftRecord[],
): Merge {
  const there = new Map(stored.map((record) => [record.id, record]));
  const names = [...local, ...stored].map((craft) => craft.build.name);
  const crafts: CraftWork[] = [];
  const write: CraftWork[] = [];
  const taken: string[] = [];
  const both: string[] = [];
  for (const craft of local) {
    const record = there.get(craft.id);
    const before = known.get(craft.id);
    const changedHere = before?.craft !== craft;
    const changedThere = record !== undefined && record.revision !== before?.revision;
    if (record === undefined && before !== undefined && !changedHere) continue; // removed in the other window
    if (!changedHere && changedThere) {
      crafts.push(plain(record));
      taken.push(record.build.name);
      continue;
    }
    crafts.push(craft);
    if (changedHere) write.push(craft);
    if (changedHere && changedThere) {
      const copy = copyOf(record, names);
      crafts.push(copy);
      write.push(copy);
      both.push(craft.build.name);
    }
  }
  const remove: string[] = [];
  const here = new Set(local.map((craft) => craft.id));
  for (const record of stored) {
    if (here.has(record.id)) continue;
    const before = known.get(record.id);
    if (before !== undefined && before.revision === record.revision) remove.push(record.id);
    else {
      crafts.push(plain(record));
      taken.push(record.build.name);
    }
  }
  return { crafts, write, remove, taken, both };
}

function copyOf(record: CraftRecord, names: string[]): CraftWork {
  const name = freeName(`${record.build.name.slice(0, 100)} (other window)`, names);
  names.push(name);
  return {
    ...plain(record),
    id: crypto.randomUUID(),
    build: { ...record.build, name },
    savedBuild: { ...record.savedBuild, name },
  };
}

/** The craft without what only the store needs. */
export function plain(record: CraftRecord): CraftWork {
  const { id, build, savedBuild, gainsA, gainsB, sheets } = record;
  return { id, build, savedBuild, gainsA, gainsB, sheets };
}

/**
 * The window's crafts with the merge taken in. A craft that was edited since `snapshot` (what was merged) keeps
 * its newer state; the next save brings it in.
 */
export function withMerge(
  now: readonly CraftWork[],
  snapshot: readonly CraftWork[],
  merged: readonly CraftWork[],
): readonly CraftWork[] {
  const before = new Map(snapshot.map((craft) => [craft.id, craft]));
  const after = new Map(merged.map((craft) => [craft.id, craft]));
  const kept = now.flatMap((craft) => {
    if (before.get(craft.id) !== craft) return [craft];
    const next = after.get(craft.id);
    return next === undefined ? [] : [next];
  });
  const here = new Set(now.map((craft) => craft.id));
  const added = merged.filter((craft) => !here.has(craft.id) && !before.has(craft.id));
  const next = [...kept, ...added];
  const same = next.length === now.length && next.every((craft, i) => craft === now[i]);
  return same ? now : next;
}
