/** Bundles `entries` (paths from the root) for node into the cache; returns their folder. */
export function bundle(entries: readonly string[]): Promise<string>;
