/** Corrected column mappings, kept per file shape: files with the same heads in the same order have one shape. */
import type { ColumnKey, ColumnMapping } from '../../../measuring/columns.ts';
import type { Store } from '../../store/store.ts';
import type { BenchKind } from './kinds.ts';

/** Quantities a bench takes from its table. */
export const KEYS_OF: Readonly<Record<Exclude<BenchKind, 'swing'>, readonly ColumnKey[]>> = {
  stand: [
    'speed',
    'electricalSpeed',
    'thrust',
    'torque',
    'command',
    'voltage',
    'current',
    'power',
    'thrustCoefficient',
    'powerCoefficient',
  ],
  spinup: ['time', 'speed', 'electricalSpeed', 'command'],
  still: [
    'time',
    'gyro_roll',
    'gyro_pitch',
    'gyro_yaw',
    'acceleration_roll',
    'acceleration_pitch',
    'acceleration_yaw',
    'speed',
  ],
};

/** Entry of the place's memory; the latest shapes first. */
const MEMORY = 'measure columns';
const MOST_SHAPES = 24;

export interface RememberedShape {
  readonly shape: string;
  readonly mapping: ColumnMapping;
}

export const shapeOf = (kind: BenchKind, heads: readonly string[]): string => `${kind} ${heads.join('|')}`;

export function rememberedShapes(store: Store): readonly RememberedShape[] {
  const kept = store.settings.value.places[MEMORY];
  return Array.isArray(kept) ? kept.filter(isShape) : [];
}

export function rememberShape(store: Store, one: RememberedShape): void {
  const others = rememberedShapes(store).filter(({ shape }) => shape !== one.shape);
  store.setPlaceMemory(MEMORY, [one, ...others].slice(0, MOST_SHAPES));
}

/** What was kept may be of another version: only what reads as a mapping counts. */
function isShape(raw: unknown): raw is RememberedShape {
  if (typeof raw !== 'object' || raw === null || !('shape' in raw) || !('mapping' in raw)) return false;
  const { shape, mapping } = raw;
  if (typeof shape !== 'string' || typeof mapping !== 'object' || mapping === null) return false;
  return Object.values(mapping as Record<string, unknown>).every(
    (choice) =>
      typeof choice === 'object' &&
      choice !== null &&
      'column' in choice &&
      typeof choice.column === 'string' &&
      'unit' in choice &&
      (choice.unit === null || typeof choice.unit === 'string'),
  );
}
