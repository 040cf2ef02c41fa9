/** One edit as data: which slots of the document it changed, from what to what. */
import type { Scene } from '../../craft/scene.ts';
import type { Wind } from '../../craft/wind.ts';
import type { CraftWork } from './document.ts';

/** Null stands for "no such craft". */
interface CraftChange {
  readonly slot: 'craft';
  readonly id: string;
  readonly before: CraftWork | null;
  readonly after: CraftWork | null;
}
interface WindChange {
  readonly slot: 'wind';
  readonly before: Wind;
  readonly after: Wind;
}
interface SceneChange {
  readonly slot: 'scene';
  readonly before: Scene;
  readonly after: Scene;
}
interface CurrentChange {
  readonly slot: 'current';
  readonly before: string;
  readonly after: string;
}
export type SlotChange = CraftChange | WindChange | SceneChange | CurrentChange;
export type Change = readonly SlotChange[];

export function reversed(change: Change): Change {
  return change.map((one) => ({ ...one, before: one.after, after: one.before }) as SlotChange);
}

function sameSlot(a: SlotChange, b: SlotChange): boolean {
  return a.slot === b.slot && (a.slot !== 'craft' || (b.slot === 'craft' && a.id === b.id));
}

/** One change from the first one's start to the second one's end; null when they touch different slots. */
export function joined(first: Change, second: Change): Change | null {
  if (first.length !== second.length || !first.every((one, i) => sameSlot(one, second[i]))) return null;
  return first.map((one, i) => ({ ...one, after: second[i].after }) as SlotChange);
}

/** The crafts after `change`; a craft that was gone comes back at the end. */
export function changedCrafts(crafts: readonly CraftWork[], change: Change): readonly CraftWork[] {
  let next = crafts;
  for (const one of change) {
    if (one.slot !== 'craft') continue;
    const { id, after } = one;
    if (after === null) next = next.filter((craft) => craft.id !== id);
    else if (next.some((craft) => craft.id === id))
      next = next.map((craft) => (craft.id === id ? after : craft));
    else next = [...next, after];
  }
  return next;
}
