/**
 * Unit quaternions w, x, y, z that turn body coordinates into world coordinates (north, east, down).
 * Euler angles are yaw-pitch-roll (z, y', x''), radians, as in ISO 1151-1.
 */
export type Quaternion = [w: number, x: number, y: number, z: number];
export type Vector3 = [x: number, y: number, z: number];

export function quaternionFromEuler(roll: number, pitch: number, yaw: number): Quaternion {
  const cr = Math.cos(roll / 2);
  const sr = Math.sin(roll / 2);
  const cp = Math.cos(pitch / 2);
  const sp = Math.sin(pitch / 2);
  const cy = Math.cos(yaw / 2);
  const sy = Math.sin(yaw / 2);
  return [
    cr * cp * cy + sr * sp * sy,
    sr * cp * cy - cr * sp * sy,
    cr * sp * cy + sr * cp * sy,
    cr * cp * sy - sr * sp * cy,
  ];
}

/** Roll, pitch, yaw in radians; at |pitch| = 90° roll is taken as 0. */
export function eulerFromQuaternion(w: number, x: number, y: number, z: number): Vector3 {
  const sinPitch = 2 * (w * y - z * x);
  if (Math.abs(sinPitch) > 1 - 1e-12) {
    return [0, Math.sign(sinPitch) * (Math.PI / 2), -2 * Math.sign(sinPitch) * Math.atan2(x, w)];
  }
  return [
    Math.atan2(2 * (w * x + y * z), 1 - 2 * (x * x + y * y)),
    Math.asin(sinPitch),
    Math.atan2(2 * (w * z + x * y), 1 - 2 * (y * y + z * z)),
  ];
}

/** Heading of the nose, rad clockwise from north, of the quaternion at `offset` in `q`. */
export function headingOf(q: ArrayLike<number>, offset = 0): number {
  const w = q[offset];
  const x = q[offset + 1];
  const y = q[offset + 2];
  const z = q[offset + 3];
  return Math.atan2(2 * (w * z + x * y), 1 - 2 * (y * y + z * z));
}

/** Body vector `v` in world axes. */
export function rotateToWorld(q: ArrayLike<number>, v: ArrayLike<number>, offset = 0): Vector3 {
  const [w, x, y, z] = [q[offset], q[offset + 1], q[offset + 2], q[offset + 3]];
  const tx = 2 * (y * v[2] - z * v[1]);
  const ty = 2 * (z * v[0] - x * v[2]);
  const tz = 2 * (x * v[1] - y * v[0]);
  return [
    v[0] + w * tx + (y * tz - z * ty),
    v[1] + w * ty + (z * tx - x * tz),
    v[2] + w * tz + (x * ty - y * tx),
  ];
}

/** World vector `v` in body axes. */
export function rotateToBody(q: ArrayLike<number>, v: ArrayLike<number>, offset = 0): Vector3 {
  const conjugate = [q[offset], -q[offset + 1], -q[offset + 2], -q[offset + 3]];
  return rotateToWorld(conjugate, v);
}

/** Angle in radians between two attitudes. */
export function angleBetween(a: ArrayLike<number>, b: ArrayLike<number>): number {
  // sin of the half angle from the vector part of a* b: accurate for small angles, where acos is not.
  const w = a[0] * b[0] + a[1] * b[1] + a[2] * b[2] + a[3] * b[3];
  const x = a[0] * b[1] - a[1] * b[0] - a[2] * b[3] + a[3] * b[2];
  const y = a[0] * b[2] + a[1] * b[3] - a[2] * b[0] - a[3] * b[1];
  const z = a[0] * b[3] - a[1] * b[2] + a[2] * b[1] - a[3] * b[0];
  return 2 * Math.atan2(Math.hypot(x, y, z), Math.abs(w));
}
