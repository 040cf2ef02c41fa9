/** JSON from outside: nothing too long, too deep, of a dangerous name or beyond a double gets further than here. */
import { parseJson } from '../../craft/fields.ts';
import { refuse } from '../../craft/problem.ts';

/** Our own files nest six deep, worksheets a little more. */
const DEEPEST = 24;
const FORBIDDEN_KEYS = new Set(['__proto__', 'constructor', 'prototype']);

/**
 * Text to a plain JSON value.
 * @throws InputError for text that is too long, not JSON, nested too deeply, holds a key that could reach a
 * prototype, or a number beyond the range of a double.
 */
export function parseGuardedJson(text: string, file: string): unknown {
  const depth = nestingOf(text);
  if (depth > DEEPEST) throw refuse(file, '', `nesting ${depth} deep`, `nesting up to ${DEEPEST} deep`);
  const value = parseJson(text, file);
  checkPlain(value, file, '');
  return value;
}

/** Deepest nesting of brackets outside strings; needs no recursion, so that no text can exhaust the stack. */
function nestingOf(text: string): number {
  let depth = 0;
  let deepest = 0;
  let inString = false;
  for (let i = 0; i < text.length; i++) {
    const code = text.charCodeAt(i);
    if (inString) {
      if (code === 0x5c) i++;
      else if (code === 0x22) inString = false;
    } else if (code === 0x22) inString = true;
    else if (code === 0x7b || code === 0x5b) deepest = Math.max(deepest, ++depth);
    else if (code === 0x7d || code === 0x5d) depth--;
  }
  return deepest;
}

function checkPlain(value: unknown, file: string, path: string): void {
  if (typeof value === 'number' && !Number.isFinite(value)) {
    throw refuse(file, path, value, 'a number within the range of a double');
  }
  if (typeof value !== 'object' || value === null) return;
  for (const key of Object.keys(value)) {
    const place = Array.isArray(value) ? `${path}[${key}]` : path === '' ? key : `${path}.${key}`;
    if (!Array.isArray(value) && FORBIDDEN_KEYS.has(key))
      throw refuse(file, place, key, 'no field of this name');
    checkPlain((value as Record<string, unknown>)[key], file, place);
  }
}
