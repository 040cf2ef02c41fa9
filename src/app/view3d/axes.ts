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

/** North, east, down of a place in three's axes. */
export function fromThree(into: Float64Array, place: Vector3): Float64Array {
  into[0] = -place.z;
  into[1] = place.x;
  into[2] = -place.y;
  return into;
}

/** Sets `into` from a body-to-world quaternion w, x, y, z. */
export function turnToThree(into: Quaternion, w: number, x: number, y: number, z: number): Quaternion {
  return into.set(y, -z, -x, w);
}

/** Extents along x, y, z (or north, east, down) as extents along three's axes. */
export function sizeToThree(into: Vector3, x: number, y: number, z: number): Vector3 {
  return into.set(y, z, x);
}

/** Heading clockwise from north as a turn about three's y. */
export function headingToThree(heading_rad: number): number {
  return -heading_rad;
}
