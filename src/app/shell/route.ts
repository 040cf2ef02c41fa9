/** Deep links: `#/fly`, `#/fly?seed=4`. The hash names the place; what follows the "?" belongs to the place. */
import { PLACES, type PlaceName } from '../store/document.ts';

/** The place that `hash` names, or null. */
export function placeInHash(hash: string): PlaceName | null {
  const name = /^#\/([a-z]+)/.exec(hash)?.[1];
  return PLACES.find((place) => place === name) ?? null;
}

export function hashOf(place: PlaceName): string {
  return `#/${place}`;
}
