/** Keys of Fly: what each does, which key it is on, and how a person puts it on another. */
import { z } from 'zod';

/** Every action with the key it comes with, by `KeyboardEvent.code`, in the order the list shows them. */
export const FIRST_KEYS = {
  arm: 'Space',
  up: 'KeyW',
  down: 'KeyS',
  noseDown: 'ArrowUp',
  noseUp: 'ArrowDown',
  rollLeft: 'ArrowLeft',
  rollRight: 'ArrowRight',
  yawLeft: 'KeyA',
  yawRight: 'KeyD',
  levelling: 'KeyL',
  heightHold: 'KeyH',
  gust: 'KeyG',
  camera: 'KeyC',
  lookLeft: 'BracketLeft',
  lookRight: 'BracketRight',
  nearer: 'Equal',
  farther: 'Minus',
  pause: 'KeyP',
  singleTick: 'Period',
  back: 'Comma',
  flyOn: 'Enter',
  terms: 'KeyT',
  upright: 'KeyU',
  drop: 'KeyX',
  restart: 'Backspace',
  keys: 'Slash',
} as const;

export type FlyKey = keyof typeof FIRST_KEYS;
export type KeyMap = Readonly<Record<FlyKey, string>>;
export const FLY_KEYS = Object.keys(FIRST_KEYS) as readonly FlyKey[];

/** Keys that the page, the browser or the fields need, or that only change what others mean. */
const KEPT_FREE = /^(Escape|Tab|F\d+|Shift|Control|Alt|Meta|OS|CapsLock|ContextMenu|Fn)/;

const keptSchema = z.record(z.string(), z.string().min(1).max(40));

/** The keys a person chose, over those it comes with; anything that makes no sense is left out. */
export function keyMapFrom(kept: unknown): KeyMap {
  const parsed = keptSchema.safeParse(kept);
  if (!parsed.success) return FIRST_KEYS;
  let map: KeyMap = FIRST_KEYS;
  for (const action of FLY_KEYS) {
    const code = parsed.data[action];
    if (code !== undefined) map = rebound(map, action, code) ?? map;
  }
  return map;
}

/** `action` on `code`; what was there before gets the key that becomes free. Null: that key cannot be used. */
export function rebound(map: KeyMap, action: FlyKey, code: string): KeyMap | null {
  if (KEPT_FREE.test(code)) return null;
  const other = FLY_KEYS.find((one) => map[one] === code);
  const freed = other === undefined ? {} : { [other]: map[action] };
  return { ...map, ...freed, [action]: code };
}

/** The action on a key, or null. */
export function actionOn(map: KeyMap, code: string): FlyKey | null {
  return FLY_KEYS.find((action) => map[action] === code) ?? null;
}

const SIGNS: Readonly<Record<string, string>> = {
  ArrowUp: '↑',
  ArrowDown: '↓',
  ArrowLeft: '←',
  ArrowRight: '→',
  BracketLeft: '[',
  BracketRight: ']',
  Equal: '+',
  Minus: '−',
  Period: '.',
  Comma: ',',
  Slash: '/',
  Backslash: '\\',
  Semicolon: ';',
  Quote: '’',
  Backquote: '`',
};

/** What stands on the key: by the person's own layout where the browser tells it. */
export function keyName(code: string, layout: ReadonlyMap<string, string> | null): string {
  const letter = /^(?:Key|Digit)(.)$/.exec(code)?.[1];
  if (letter !== undefined) return (layout?.get(code) ?? letter).toUpperCase();
  return SIGNS[code] ?? code.replace(/^Numpad(.)/, 'Num $1');
}
