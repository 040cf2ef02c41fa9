/** Where two JSON values differ, as a person would say it. */

export interface Difference {
  /** "axes.roll.p_us_per_dps". */
  readonly path: string;
  readonly before: string;
  readonly after: string;
}

/** Every leaf that differs; an absent one is "–". */
export function differences(before: unknown, after: unknown): Difference[] {
  const a = leaves(before);
  const b = leaves(after);
  const paths = [...a.keys(), ...[...b.keys()].filter((path) => !a.has(path))];
  return paths
    .filter((path) => a.get(path) !== b.get(path))
    .map((path) => ({ path, before: a.get(path) ?? '–', after: b.get(path) ?? '–' }));
}

function leaves(value: unknown, path = '', into = new Map<string, string>()): Map<string, string> {
  if (typeof value === 'object' && value !== null) {
    for (const [key, inner] of Object.entries(value))
      leaves(inner, path === '' ? key : `${path}.${key}`, into);
  } else if (value !== undefined) into.set(path, String(value));
  return into;
}
