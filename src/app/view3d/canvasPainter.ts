/**
 * Draws the view on a 2D canvas, for machines without any WebGL: sky, ground to the horizon, what lies flat on
 * it, then the solids and the craft from what is hidden to what hides (solids.ts), the craft's own faces from
 * far to near. Faces are clipped at the near plane and fade into the sky as WebGL's fog makes them.
 */
import {
  Color,
  DoubleSide,
  LineSegments,
  Matrix4,
  Mesh,
  Vector3,
  type LineBasicMaterial,
  type MeshBasicMaterial,
  type Object3D,
  type PerspectiveCamera,
} from 'three';
import { fromThree } from './axes.ts';
import { facetsOf } from './facets.ts';
import type { SolidSpace } from './solids.ts';

const NEAR_M = 0.05;
export const FOG_FROM_M = 60;
export const FOG_TO_M = 420;
/** Where along the ground's fade its gradient has stops: shares of the fog. */
const FOG_STOPS = [0, 0.12, 0.3, 0.5, 0.7, 0.85, 1];

/** What to paint, from the bottom up. */
export interface Painting {
  readonly sky: Color;
  /** Flat on the ground or far away, in order. */
  readonly flats: readonly Object3D[];
  readonly space: SolidSpace;
  /** A mesh for each thing of `space`. */
  readonly solids: readonly Mesh[];
  /** The craft with all that goes with it, and its size. */
  readonly craft: readonly Object3D[];
  readonly centre: Vector3;
  readonly reach_m: number;
}

interface Face {
  readonly points: readonly number[];
  readonly depth: number;
  readonly style: string;
  readonly alpha: number;
  readonly line: boolean;
}

export class CanvasPainter {
  readonly canvas = document.createElement('canvas');
  private readonly pen: CanvasRenderingContext2D;
  private width = 1;
  private height = 1;
  private focal = 1;
  private readonly toView = new Matrix4();
  private readonly corners: Vector3[] = [];
  private readonly a = new Vector3();
  private readonly b = new Vector3();
  private readonly normal = new Vector3();
  private readonly edge = new Vector3();
  private readonly color = new Color();
  private readonly sky = new Color();
  private readonly styles = new Map<number, string>();
  /** Up in the eye's axes, and the eye's height: the horizon follows from them. */
  private readonly up = new Vector3();
  private eyeHeight_m = 1;
  private readonly order: number[] = [];
  private readonly eye = new Float64Array(3);
  private readonly ball = new Float64Array(3);
  private readonly grounds = new Map<number, CanvasGradient | string>();

  constructor() {
    const pen = this.canvas.getContext('2d', { alpha: false, willReadFrequently: true });
    if (pen === null) throw new Error('this browser draws neither WebGL nor a 2D canvas');
    this.pen = pen;
  }

  setSize(width: number, height: number, ratio: number): void {
    this.width = Math.max(1, Math.round(width * ratio));
    this.height = Math.max(1, Math.round(height * ratio));
    this.canvas.width = this.width;
    this.canvas.height = this.height;
    this.canvas.style.width = `${width}px`;
    this.canvas.style.height = `${height}px`;
  }

  render(painting: Painting, camera: PerspectiveCamera): void {
    const { pen, width, height } = this;
    this.focal = height / 2 / Math.tan((camera.fov * Math.PI) / 360);
    this.sky.copy(painting.sky);
    this.up.set(0, 1, 0).transformDirection(camera.matrixWorldInverse);
    this.eyeHeight_m = Math.max(0.05, camera.position.y);
    this.grounds.clear();
    pen.globalAlpha = 1;
    pen.lineJoin = 'round';
    pen.fillStyle = this.styleOf(this.sky.r, this.sky.g, this.sky.b, 0);
    pen.fillRect(0, 0, width, height);
    for (const flat of painting.flats) this.paintFlat(flat, camera);
    this.paintThings(painting, camera);
  }

  // --- The ground and what lies on it -------------------------------------------------------------------

  private paintFlat(object: Object3D, camera: PerspectiveCamera): void {
    if (!object.visible) return;
    object.updateMatrixWorld();
    const { pen } = this;
    pen.globalAlpha = 1;
    if (object instanceof LineSegments) {
      const faces: Face[] = [];
      this.lineFaces(object, camera, faces);
      this.paint(faces);
      return;
    }
    if (!(object instanceof Mesh)) return;
    const facets = facetsOf(object.geometry);
    if (facets === undefined) return;
    const fog = (object.material as MeshBasicMaterial).fog;
    this.toView.multiplyMatrices(camera.matrixWorldInverse, object.matrixWorld);
    for (let i = 0; i < facets.shades.length; i++) {
      const c = 3 * i;
      pen.fillStyle = fog
        ? this.groundStyle(facets.colors[c], facets.colors[c + 1], facets.colors[c + 2])
        : this.styleOf(facets.colors[c], facets.colors[c + 1], facets.colors[c + 2], 0);
      if (object.userData.plain === true) {
        this.fillGround();
        continue;
      }
      const points = this.polygon(facets.corners, facets.starts[i], facets.starts[i + 1]);
      if (points.length < 6) continue;
      this.trace(points);
      pen.fill();
    }
  }

  /** Fills everything below the horizon. */
  private fillGround(): void {
    const { pen, width, height, up, focal } = this;
    const slope = Math.hypot(up.x, up.y);
    const far = width + height;
    if (slope < 1e-6) {
      if (up.z > 0) pen.fillRect(0, 0, width, height);
      return;
    }
    // On the screen the horizon is the line x·ux + y·uy = f·uz, y upward; the ground lies on its lower side.
    const [nx, ny] = [up.x / slope, up.y / slope];
    const middle = (focal * up.z) / slope;
    const [cx, cy] = [width / 2 + nx * middle, height / 2 - ny * middle];
    pen.beginPath();
    pen.moveTo(cx + ny * far, cy + nx * far);
    pen.lineTo(cx - ny * far, cy - nx * far);
    pen.lineTo(cx - ny * far - nx * 2 * far, cy - nx * far + ny * 2 * far);
    pen.lineTo(cx + ny * far - nx * 2 * far, cy + nx * far + ny * 2 * far);
    pen.fill();
  }

  /** Colour of the ground plane fading to the sky at the horizon, as a gradient over the screen. */
  private groundStyle(r: number, g: number, b: number): CanvasGradient | string {
    const key = this.color.setRGB(r, g, b).getHex();
    const known = this.grounds.get(key);
    if (known !== undefined) return known;
    const { up, focal, eyeHeight_m: h, width, height } = this;
    const slope = Math.hypot(up.x, up.y);
    let style: CanvasGradient | string = this.styleOf(r, g, b, 0);
    if (slope > 0.02) {
      const [nx, ny] = [up.x / slope, up.y / slope];
      // A place s along the screen's upward normal shows ground at depth h f/(f uz − slope s).
      const along = (depth: number) => (focal * up.z - (h * focal) / depth) / slope;
      const horizon = along(Infinity);
      const begin = along(FOG_FROM_M);
      const at = (s: number) => [width / 2 + nx * s, height / 2 - ny * s] as const;
      if (horizon - begin > 0.01) {
        const gradient = this.pen.createLinearGradient(...at(begin), ...at(horizon));
        for (const fog of FOG_STOPS) {
          const depth = FOG_FROM_M + fog * (FOG_TO_M - FOG_FROM_M);
          const share = (along(depth) - begin) / (horizon - begin);
          gradient.addColorStop(Math.max(0, Math.min(1, share)), this.styleOf(r, g, b, depth));
        }
        gradient.addColorStop(1, this.styleOf(r, g, b, FOG_TO_M));
        style = gradient;
      }
    }
    this.grounds.set(key, style);
    return style;
  }

  // --- Solids and craft -----------------------------------------------------------------------------------

  private paintThings(painting: Painting, camera: PerspectiveCamera): void {
    fromThree(this.eye, camera.position);
    fromThree(this.ball, painting.centre);
    painting.space.order(this.eye, this.ball, this.order);
    for (const i of this.order) {
      const faces: Face[] = [];
      if (i < painting.solids.length) {
        const mesh = painting.solids[i];
        if (!mesh.visible) continue;
        this.meshFaces(mesh, camera, faces);
        const seen = painting.space.facesSeen(i, this.eye);
        for (const child of mesh.children) {
          if (child instanceof LineSegments) this.lineFaces(child, camera, faces, seen);
        }
      } else {
        for (const part of painting.craft) this.collect(part, camera, faces);
        faces.sort((one, other) => other.depth - one.depth);
      }
      this.paint(faces);
    }
  }

  private collect(object: Object3D, camera: PerspectiveCamera, faces: Face[]): void {
    if (!object.visible) return;
    if (object instanceof Mesh) this.meshFaces(object, camera, faces);
    else if (object instanceof LineSegments) this.lineFaces(object, camera, faces);
    for (const child of object.children) this.collect(child, camera, faces);
  }

  private meshFaces(mesh: Mesh, camera: PerspectiveCamera, faces: Face[]): void {
    const facets = facetsOf(mesh.geometry);
    if (facets === undefined) return;
    const material = mesh.material as MeshBasicMaterial;
    const both = material.side === DoubleSide;
    const { starts, colors, shades, corners } = facets;
    this.toView.multiplyMatrices(camera.matrixWorldInverse, mesh.matrixWorld);
    for (let i = 0; i < shades.length; i++) {
      const points = this.polygon(corners, starts[i], starts[i + 1]);
      if (points.length < 6) continue;
      const [a, b, c] = this.corners;
      this.normal.subVectors(b, a).cross(this.edge.subVectors(c, a));
      if (!both && this.normal.dot(a) >= 0) continue;
      let depth = 0;
      let away = 0;
      const count = starts[i + 1] - starts[i];
      for (let k = 0; k < count; k++) {
        depth += this.corners[k].length() / count;
        away -= this.corners[k].z / count;
      }
      const shade = shades[i];
      faces.push({
        points,
        depth,
        style: this.styleOf(
          colors[3 * i] * shade,
          colors[3 * i + 1] * shade,
          colors[3 * i + 2] * shade,
          away,
        ),
        alpha: material.opacity,
        line: false,
      });
    }
  }

  private lineFaces(lines: LineSegments, camera: PerspectiveCamera, faces: Face[], seen = 255): void {
    const material = lines.material as LineBasicMaterial;
    const position = lines.geometry.getAttribute('position');
    const tint = material.vertexColors ? lines.geometry.getAttribute('color') : undefined;
    const onFaces = lines.geometry.userData.faces as Uint8Array | undefined;
    const { start, count } = lines.geometry.drawRange;
    const end = Math.min(position.count, start + count);
    this.toView.multiplyMatrices(camera.matrixWorldInverse, lines.matrixWorld);
    for (let i = start; i + 1 < end; i += 2) {
      if (onFaces !== undefined && (onFaces[i / 2] & seen) === 0) continue;
      const alpha = material.opacity * (tint?.itemSize === 4 ? 0.5 * (tint.getW(i) + tint.getW(i + 1)) : 1);
      if (alpha < 0.02) continue;
      this.a.fromBufferAttribute(position, i).applyMatrix4(this.toView);
      this.b.fromBufferAttribute(position, i + 1).applyMatrix4(this.toView);
      if (this.a.z > -NEAR_M && this.b.z > -NEAR_M) continue;
      if (this.a.z > -NEAR_M) clipTo(this.a, this.b);
      else if (this.b.z > -NEAR_M) clipTo(this.b, this.a);
      const away = -0.5 * (this.a.z + this.b.z);
      if (away > FOG_TO_M) continue;
      const { r, g, b } = material.color;
      faces.push({
        points: [...this.project(this.a), ...this.project(this.b)],
        depth: 0.5 * (this.a.length() + this.b.length()),
        style:
          tint === undefined
            ? this.styleOf(r, g, b, away)
            : this.styleOf(tint.getX(i), tint.getY(i), tint.getZ(i), away),
        alpha: Math.round(alpha * 24) / 24,
        line: true,
      });
    }
  }

  /** A polygon seen from the eye, clipped at the near plane, on the screen: x, y, x, y, … */
  private polygon(corners: Float32Array, from: number, to: number): number[] {
    const count = to - from;
    let anyInside = false;
    for (let k = 0; k < count; k++) {
      const corner = (this.corners[k] ??= new Vector3());
      corner.fromArray(corners, 3 * (from + k)).applyMatrix4(this.toView);
      if (corner.z <= -NEAR_M) anyInside = true;
    }
    const out: number[] = [];
    if (!anyInside) return out;
    for (let k = 0; k < count; k++) {
      const one = this.corners[k];
      const next = this.corners[(k + 1) % count];
      const inside = one.z <= -NEAR_M;
      if (inside) out.push(...this.project(one));
      if (inside !== next.z <= -NEAR_M) {
        this.edge.lerpVectors(one, next, (-NEAR_M - one.z) / (next.z - one.z));
        out.push(...this.project(this.edge));
      }
    }
    return out;
  }

  private project(v: Vector3): [number, number] {
    const per = this.focal / -v.z;
    return [this.width / 2 + v.x * per, this.height / 2 - v.y * per];
  }

  /** A linear colour as it looks `away` metres deep, as a CSS colour. */
  private styleOf(r: number, g: number, b: number, away: number): string {
    this.color.setRGB(r, g, b);
    if (away > FOG_FROM_M) {
      this.color.lerp(this.sky, Math.min(1, (away - FOG_FROM_M) / (FOG_TO_M - FOG_FROM_M)));
    }
    const hex = this.color.getHex();
    let style = this.styles.get(hex);
    if (style === undefined) {
      if (this.styles.size > 4000) this.styles.clear();
      style = `#${hex.toString(16).padStart(6, '0')}`;
      this.styles.set(hex, style);
    }
    return style;
  }

  private trace(points: readonly number[]): void {
    const { pen } = this;
    pen.beginPath();
    pen.moveTo(points[0], points[1]);
    for (let k = 2; k < points.length; k += 2) pen.lineTo(points[k], points[k + 1]);
  }

  /** Faces in order; neighbouring lines of one style are one stroke. */
  private paint(faces: readonly Face[]): void {
    const { pen } = this;
    const unit = Math.max(1, this.height / 900);
    pen.lineWidth = unit;
    for (let i = 0; i < faces.length; i++) {
      const face = faces[i];
      pen.globalAlpha = face.alpha;
      this.trace(face.points);
      if (!face.line) {
        pen.fillStyle = face.style;
        pen.fill();
        continue;
      }
      while (i + 1 < faces.length && sameLine(face, faces[i + 1])) {
        const { points } = faces[++i];
        pen.moveTo(points[0], points[1]);
        pen.lineTo(points[2], points[3]);
      }
      pen.strokeStyle = face.style;
      pen.stroke();
    }
    pen.globalAlpha = 1;
  }
}

function sameLine(one: Face, other: Face): boolean {
  return other.line && other.style === one.style && other.alpha === one.alpha;
}

/** Moves `behind` onto the near plane along the way to `front`. */
function clipTo(behind: Vector3, front: Vector3): void {
  behind.lerp(front, (-NEAR_M - behind.z) / (front.z - behind.z));
}
