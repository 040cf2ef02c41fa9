/**
 * The one place that turns the bench's axes into three.js's: north, east, down (and body forward, right,
 * down) become x east, y up, z south. A proper rotation, so quaternions keep their w and turn their vector
 * part like any vector.
 */
import type { Quaternion, Vector3 } from 'three';

/** Sets `into` from north, east, down or body x, y, z. */
export function toThree(into: Vector3, north: number, east: number, down: number): Vector3 {
  return into.set(east, -down, -north);
}

/** Sets `into` from a body-to-world quaternion w, x, y, z. */
export function turnToThree(into: Quaternion, w: number, x: number, y: number, z: number): Quaternion {
  return into.set(y, -z, -x, w);
}
