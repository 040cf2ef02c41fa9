/** Numbers as people type them. */

/** "1.5", "1,5", "−3", "2e-3" to a number; null for anything else, the empty text included. */
export function parseNumber(text: string): number | null {
  const plain = text
    .trim()
    .replace('−', '-')
    .replace(/^([^.,]*),([^,.]*)$/, '$1.$2');
  if (!/^[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?$/i.test(plain)) return null;
  const value = Number(plain);
  return Number.isFinite(value) ? value : null;
}

/** `value` on the grid of `step` from `origin`, without the dust of binary fractions. */
export function onGrid(value: number, step: number, origin: number): number {
  const places = Math.min(12, Math.max(0, Math.ceil(-Math.log10(step)) + 2));
  return Number((origin + Math.round((value - origin) / step) * step).toFixed(places));
}
