/** The six places, in the order of the work. Each is its own chunk, loaded when first opened. */
import type { ComponentType } from 'preact';
import { PLACES, type PlaceName } from '../store/document.ts';

type PlaceModule = Promise<{ default: ComponentType }>;

const LOADERS: Readonly<Record<PlaceName, () => PlaceModule>> = {
  measure: () => import('./measure/index.tsx'),
  shape: () => import('./shape/index.tsx'),
  fly: () => import('./fly/index.tsx'),
  prove: () => import('./prove/index.tsx'),
  match: () => import('./match/index.tsx'),
  carry: () => import('./carry/index.tsx'),
};

export interface Place {
  readonly name: PlaceName;
  /** Pressed together with Alt. */
  readonly key: string;
  readonly load: () => PlaceModule;
}

export const PLACE_LIST: readonly Place[] = PLACES.map((name, index) => ({
  name,
  key: String(index + 1),
  load: LOADERS[name],
}));
