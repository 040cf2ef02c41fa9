/**
 * Draws a three.js scene on a 2D canvas, for machines without any WebGL: ground first, flat things next, then
 * things from far to near, each thing's own faces from far to near. Faces are clipped at the near plane,
 * shaded by one sun, and faded into the sky with distance.
 */
import {
  Color,
  LineSegments,
  Matrix4,
  Mesh,
  Vector3,
  type Material,
  type Object3D,
  type PerspectiveCamera,
  type Scene,
} from 'three';
import { LAYER_FLAT, LAYER_GROUND, LAYER_THINGS } from './siteModel.ts';

const SUN = new Vector3(0.45, 0.82, 0.35).normalize();
const NEAR_M = 0.06;
const FADE_FROM_M = 60;
const FADE_TO_M = 420;

interface Face {
  readonly points: readonly number[];
  readonly depth: number;
  readonly style: string;
  readonly alpha: number;
  readonly line: boolean;
}

interface Thing {
  readonly distance: number;
  readonly faces: Face[];
}

export class CanvasPainter {
  readonly canvas = document.createElement('canvas');
  private readonly pen: CanvasRenderingContext2D;
  private width = 1;
  private height = 1;
  private readonly toView = new Matrix4();
  private readonly a = new Vector3();
  private readonly b = new Vector3();
  private readonly c = new Vector3();
  private readonly normal = new Vector3();
  private readonly edge = new Vector3();
  private readonly color = new Color();
  private readonly sky = new Color();
  private fx = 1;
  private fy = 1;

  constructor() {
    const pen = this.canvas.getContext('2d', { alpha: false });
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

  render(scene: Scene, camera: PerspectiveCamera): void {
    const { pen, width, height } = this;
    scene.updateMatrixWorld();
    this.fy = height / 2 / Math.tan((camera.fov * Math.PI) / 360);
    this.fx = this.fy;
    if (scene.background instanceof Color) this.sky.copy(scene.background);
    pen.globalAlpha = 1;
    pen.fillStyle = `#${this.sky.getHexString()}`;
    pen.fillRect(0, 0, width, height);
    const layers: Thing[][] = [[], [], []];
    for (const child of scene.children) this.gather(child, camera, layers);
    for (const layer of layers) {
      layer.sort((one, other) => other.distance - one.distance);
      for (const thing of layer) this.paint(thing.faces);
    }
  }

  /** One thing for each child of the site; the craft and other groups are one thing each. */
  private gather(object: Object3D, camera: PerspectiveCamera, layers: Thing[][]): void {
    if (!object.visible) return;
    if (object.userData.site === true) {
      for (const child of object.children) this.gather(child, camera, layers);
      return;
    }
    const faces: Face[] = [];
    this.collect(object, camera, faces);
    if (faces.length === 0) return;
    const layer: number = typeof object.userData.layer === 'number' ? object.userData.layer : LAYER_THINGS;
    if (layer === LAYER_THINGS) faces.sort((one, other) => other.depth - one.depth);
    const nearest = faces.reduce((least, face) => Math.min(least, face.depth), Infinity);
    layers[layer === LAYER_GROUND ? 0 : layer === LAYER_FLAT ? 1 : 2].push({ distance: nearest, faces });
  }

  private collect(object: Object3D, camera: PerspectiveCamera, faces: Face[]): void {
    if (!object.visible) return;
    if (object instanceof Mesh) this.meshFaces(object, camera, faces);
    else if (object instanceof LineSegments) this.lineFaces(object, camera, faces);
    for (const child of object.children) this.collect(child, camera, faces);
  }

  private meshFaces(mesh: Mesh, camera: PerspectiveCamera, faces: Face[]): void {
    const material = mesh.material as Material & { color: Color };
    if (material.transparent && material.opacity < 0.02) return;
    this.toView.multiplyMatrices(camera.matrixWorldInverse, mesh.matrixWorld);
    const position = mesh.geometry.getAttribute('position');
    const index = mesh.geometry.getIndex();
    const count = index === null ? position.count : index.count;
    const lit = material.type === 'MeshLambertMaterial';
    const both = material.side === 2;
    for (let i = 0; i < count; i += 3) {
      const [ia, ib, ic] =
        index === null ? [i, i + 1, i + 2] : [index.getX(i), index.getX(i + 1), index.getX(i + 2)];
      this.a.fromBufferAttribute(position, ia).applyMatrix4(this.toView);
      this.b.fromBufferAttribute(position, ib).applyMatrix4(this.toView);
      this.c.fromBufferAttribute(position, ic).applyMatrix4(this.toView);
      this.normal.subVectors(this.b, this.a).cross(this.edge.subVectors(this.c, this.a));
      const facing = -this.normal.dot(this.a);
      if (facing <= 0 && !both) continue;
      const depth = (this.a.length() + this.b.length() + this.c.length()) / 3;
      const points = this.clippedPolygon();
      if (points.length < 6) continue;
      let shade = 1;
      if (lit) {
        this.normal.transformDirection(camera.matrixWorld);
        shade = 0.68 + 0.32 * Math.max(0, this.normal.dot(SUN));
      }
      const fades = mesh.userData.layer !== LAYER_GROUND;
      faces.push({
        points,
        depth,
        style: this.styleOf(material.color, shade, fades ? depth : 0),
        alpha: material.transparent ? material.opacity : 1,
        line: false,
      });
    }
  }

  private lineFaces(lines: LineSegments, camera: PerspectiveCamera, faces: Face[]): void {
    const material = lines.material as Material & { color: Color };
    this.toView.multiplyMatrices(camera.matrixWorldInverse, lines.matrixWorld);
    const position = lines.geometry.getAttribute('position');
    for (let i = 0; i + 1 < position.count; i += 2) {
      this.a.fromBufferAttribute(position, i).applyMatrix4(this.toView);
      this.b.fromBufferAttribute(position, i + 1).applyMatrix4(this.toView);
      if (this.a.z > -NEAR_M && this.b.z > -NEAR_M) continue;
      if (this.a.z > -NEAR_M) clipTo(this.a, this.b);
      else if (this.b.z > -NEAR_M) clipTo(this.b, this.a);
      const depth = (this.a.length() + this.b.length()) / 2;
      if (depth > FADE_TO_M) continue;
      faces.push({
        points: [...this.project(this.a), ...this.project(this.b)],
        // A hair nearer than the face it bounds.
        depth: depth * 0.999,
        style: this.styleOf(material.color, 1, depth * 1.6),
        alpha: material.transparent ? material.opacity : 1,
        line: true,
      });
    }
  }

  /** The triangle a, b, c clipped at the near plane, projected: x, y, x, y, … */
  private clippedPolygon(): number[] {
    const corners = [this.a, this.b, this.c];
    const out: number[] = [];
    for (let i = 0; i < 3; i++) {
      const from = corners[i];
      const to = corners[(i + 1) % 3];
      const inside = from.z <= -NEAR_M;
      if (inside) out.push(...this.project(from));
      if (inside !== to.z <= -NEAR_M) {
        const share = (-NEAR_M - from.z) / (to.z - from.z);
        this.edge.lerpVectors(from, to, share);
        out.push(...this.project(this.edge));
      }
    }
    return out;
  }

  private project(v: Vector3): [number, number] {
    const per = 1 / -v.z;
    return [this.width / 2 + v.x * per * this.fx, this.height / 2 - v.y * per * this.fy];
  }

  private styleOf(color: Color, shade: number, distance: number): string {
    const fade = Math.max(0, Math.min(1, (distance - FADE_FROM_M) / (FADE_TO_M - FADE_FROM_M)));
    this.color.copy(color).multiplyScalar(shade).lerp(this.sky, fade);
    return `#${this.color.getHexString()}`;
  }

  private paint(faces: readonly Face[]): void {
    const { pen } = this;
    for (const face of faces) {
      pen.globalAlpha = face.alpha;
      pen.beginPath();
      pen.moveTo(face.points[0], face.points[1]);
      for (let i = 2; i < face.points.length; i += 2) pen.lineTo(face.points[i], face.points[i + 1]);
      if (face.line) {
        pen.strokeStyle = face.style;
        pen.lineWidth = 1;
        pen.stroke();
      } else {
        pen.closePath();
        pen.fillStyle = face.style;
        pen.fill();
        if (face.alpha === 1) {
          // Hides the hair lines between neighbouring triangles.
          pen.strokeStyle = face.style;
          pen.lineWidth = 0.7;
          pen.stroke();
        }
      }
    }
  }
}

/** Moves `behind` onto the near plane along the way to `front`. */
function clipTo(behind: Vector3, front: Vector3): void {
  const share = (-NEAR_M - behind.z) / (front.z - behind.z);
  behind.lerp(front, share);
}
