/** `value` held within ± `most`. */
export function limit(value: number, most: number): number {
  return Math.max(-most, Math.min(most, value));
}
