/**
 * Flat-coloured polygons: gathered once, drawn by either renderer. The geometry carries triangles with colours
 * for WebGL, and beside them the polygons themselves for the canvas painter. Light is one sun and the sky, put
 * into the colours here, so that both renderers show the same tones and WebGL needs no lighting at all.
 */
import { BufferAttribute, BufferGeometry, Color, Vector3, type Matrix4, type Quaternion } from 'three';

/** Where the sun stands, in three's axes: from the south-west, high. */
const SUN = new Vector3(-0.42, 0.8, 0.43).normalize();
const SKY_SHARE = 0.16;
const SUN_SHARE = 0.4;
const LEAST = 0.44;

/** Share of a surface's own colour that is seen, by its outward normal in three's world axes. */
export function shadeOf(x: number, y: number, z: number): number {
  const sun = Math.max(0, x * SUN.x + y * SUN.y + z * SUN.z);
  return LEAST + SKY_SHARE * (0.5 + 0.5 * y) + SUN_SHARE * sun;
}

/** Polygons as the canvas painter reads them; colours are linear, before shading. */
export interface FacetData {
  /** xyz of all corners, polygon after polygon. */
  readonly corners: Float32Array;
  /** First corner of each polygon, and one past the last. */
  readonly starts: Uint32Array;
  readonly normals: Float32Array;
  readonly colors: Float32Array;
  /** Shade of each polygon now. */
  readonly shades: Float32Array;
}

/** The facets of a geometry made here; undefined for any other. */
export function facetsOf(geometry: BufferGeometry): FacetData | undefined {
  return geometry.userData.facets as FacetData | undefined;
}

export class Facets {
  private readonly corners: number[] = [];
  private readonly starts: number[] = [0];
  private readonly normals: number[] = [];
  private readonly colors: number[] = [];
  private readonly color = new Color();

  /** A plane convex polygon, corners counter-clockwise seen from its outer side. */
  polygon(points: readonly Vector3[], color: number): this {
    const [a, b, c] = points;
    const normal = new Vector3().subVectors(b, a).cross(new Vector3().subVectors(c, a)).normalize();
    for (const point of points) this.corners.push(point.x, point.y, point.z);
    this.starts.push(this.corners.length / 3);
    this.normals.push(normal.x, normal.y, normal.z);
    this.color.setHex(color);
    this.colors.push(this.color.r, this.color.g, this.color.b);
    return this;
  }

  /** A box of `size` (three's axes), placed by `matrix`; `top` may have a colour of its own. */
  box(matrix: Matrix4, size: Vector3, color: number, top = color): this {
    return this.frustum(matrix, size.x / 2, size.z / 2, size.x / 2, size.z / 2, size.y, color, top);
  }

  /** A box whose top is of another size, centred on the matrix's place. */
  frustum(
    matrix: Matrix4,
    bottomX: number,
    bottomZ: number,
    topX: number,
    topZ: number,
    height: number,
    color: number,
    top = color,
  ): this {
    const h = height / 2;
    const at = (x: number, y: number, z: number) => new Vector3(x, y, z).applyMatrix4(matrix);
    const low = [
      at(-bottomX, -h, bottomZ),
      at(bottomX, -h, bottomZ),
      at(bottomX, -h, -bottomZ),
      at(-bottomX, -h, -bottomZ),
    ];
    const high = [at(-topX, h, topZ), at(topX, h, topZ), at(topX, h, -topZ), at(-topX, h, -topZ)];
    return this.sides(low, high, color, top);
  }

  /** A cylinder or cone about the matrix's y, centred on its place. */
  prism(
    matrix: Matrix4,
    bottom: number,
    topRadius: number,
    height: number,
    count: number,
    color: number,
    top = color,
  ): this {
    const ring = (radius: number, y: number) =>
      Array.from({ length: count }, (_, i) => {
        const angle = (-2 * Math.PI * (i + 0.5)) / count;
        return new Vector3(radius * Math.cos(angle), y, radius * Math.sin(angle)).applyMatrix4(matrix);
      });
    return this.sides(ring(bottom, -height / 2), ring(topRadius, height / 2), color, top);
  }

  /** Side walls between two rings of equal count (counter-clockwise seen from above), and both ends. */
  private sides(low: readonly Vector3[], high: readonly Vector3[], color: number, top: number): this {
    const count = low.length;
    const pointed = high[0].distanceToSquared(high[1]) < 1e-12;
    for (let i = 0; i < count; i++) {
      const next = (i + 1) % count;
      if (pointed) this.polygon([low[i], low[next], high[i]], color);
      else this.polygon([low[i], low[next], high[next], high[i]], color);
    }
    if (!pointed) this.polygon(high, top);
    return this.polygon([...low].reverse(), color);
  }

  /** `lit`: shaded by its normals as they stand now; otherwise in its plain colours. */
  build(lit = true): BufferGeometry {
    const polygons = this.starts.length - 1;
    const facets: FacetData = {
      corners: new Float32Array(this.corners),
      starts: new Uint32Array(this.starts),
      normals: new Float32Array(this.normals),
      colors: new Float32Array(this.colors),
      shades: new Float32Array(polygons).fill(1),
    };
    const triangles: number[] = [];
    for (let i = 0; i < polygons; i++) {
      for (let k = this.starts[i] + 1; k + 1 < this.starts[i + 1]; k++) {
        for (const corner of [this.starts[i], k, k + 1]) {
          triangles.push(...this.corners.slice(3 * corner, 3 * corner + 3));
        }
      }
    }
    const geometry = new BufferGeometry();
    geometry.setAttribute('position', new BufferAttribute(new Float32Array(triangles), 3));
    geometry.setAttribute('color', new BufferAttribute(new Float32Array(triangles.length), 3));
    geometry.userData.facets = facets;
    if (lit) {
      for (let i = 0; i < polygons; i++) {
        const n = facets.normals;
        facets.shades[i] = shadeOf(n[3 * i], n[3 * i + 1], n[3 * i + 2]);
      }
    }
    writeColors(geometry);
    return geometry;
  }
}

const turned = new Vector3();

/** Shades a lit geometry anew for a body that now stands turned by `attitude`. */
export function shadeTurned(geometry: BufferGeometry, attitude: Quaternion, write: boolean): void {
  const facets = facetsOf(geometry);
  if (facets === undefined) return;
  for (let i = 0; i < facets.shades.length; i++) {
    turned.fromArray(facets.normals, 3 * i).applyQuaternion(attitude);
    facets.shades[i] = shadeOf(turned.x, turned.y, turned.z);
  }
  if (write) writeColors(geometry);
}

/** Colours times shades into the attribute that WebGL reads. */
function writeColors(geometry: BufferGeometry): void {
  const facets = facetsOf(geometry);
  if (facets === undefined) return;
  const attribute = geometry.getAttribute('color');
  const { starts, colors, shades } = facets;
  let vertex = 0;
  for (let i = 0; i < shades.length; i++) {
    const count = 3 * (starts[i + 1] - starts[i] - 2);
    for (let k = 0; k < count; k++) {
      attribute.setXYZ(
        vertex++,
        colors[3 * i] * shades[i],
        colors[3 * i + 1] * shades[i],
        colors[3 * i + 2] * shades[i],
      );
    }
  }
  attribute.needsUpdate = true;
}
