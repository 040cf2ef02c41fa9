/**
 * The view of a flight: scene, craft, air, cameras and one of two renderers. With WebGL (also in software) the
 * resolution adapts so that the rate holds; without any WebGL a 2D canvas draws the same scene.
 */
import type {
  Group} from 'three';
import {
  BufferAttribute,
  BufferGeometry,
  CircleGeometry,
  Color,
  DirectionalLight,
  Fog,
  HemisphereLight,
  LineBasicMaterial,
  LineSegments,
  Mesh,
  MeshBasicMaterial,
  Quaternion,
  Scene as ThreeScene,
  Vector3,
  WebGLRenderer,
} from 'three';
import type { Build } from '../../craft/build.ts';
import type { Scene } from '../../craft/scene.ts';
import { AirModel } from './air.ts';
import { toThree, turnToThree } from './axes.ts';
import { CameraRig, type CameraName } from './cameras.ts';
import { CanvasPainter } from './canvasPainter.ts';
import { CraftModel } from './craftModel.ts';
import { paletteOf, type ViewTheme } from './palette.ts';
import { LAYER_FLAT, siteModel } from './siteModel.ts';

/** What is drawn in one frame, in the bench's own axes. */
export interface ViewFrame {
  /** 0–2 position NED m, 3–6 quaternion w, x, y, z. */
  readonly pose: ArrayLike<number>;
  /** rad/s, FL FR RL RR. */
  readonly rotorSpeeds: ArrayLike<number>;
  readonly thrusts_N: ArrayLike<number>;
  readonly wind_mps: ArrayLike<number>;
  readonly loaded: boolean;
}

export interface ViewShows {
  thrust: boolean;
  wind: boolean;
  streaks: boolean;
}

/** Frame interval that is wanted, and the interval below which resolution may rise, ms. */
const WANTED_MS = 1000 / 48;
const EASY_MS = 1000 / 57;
const LEAST_SCALE = 0.4;

export class FlightView {
  readonly shows: ViewShows = { thrust: true, wind: true, streaks: true };
  readonly renderer: 'webgl' | 'canvas';
  private readonly scene = new ThreeScene();
  private readonly rig = new CameraRig();
  private readonly webgl: WebGLRenderer | null;
  private readonly painter: CanvasPainter | null;
  private craft: CraftModel | null = null;
  private site: Group | null = null;
  private air: AirModel | null = null;
  private shadow: Mesh | null = null;
  private pole: LineSegments | null = null;
  private scale = 1;
  private interval_ms = 16;
  private lastFrame_ms = 0;
  private framesAtScale = 0;
  private readonly place = new Vector3();
  private readonly turn = new Quaternion();
  private readonly wind = new Vector3();
  private build: Build | null = null;
  private flyingSite: Scene | null = null;
  private theme: ViewTheme = 'light';
  private readonly cleanUp: (() => void)[] = [];

  constructor(
    private readonly host: HTMLElement,
    canvasOnly = false,
  ) {
    this.webgl = canvasOnly ? null : tryWebgl();
    this.painter = this.webgl === null ? new CanvasPainter() : null;
    this.renderer = this.webgl === null ? 'canvas' : 'webgl';
    // Without a GPU half the pixels are a good start; the rate soon says what can be afforded.
    this.scale = this.webgl === null ? 1 : 0.6;
    host.append(this.canvas);
    this.canvas.setAttribute('aria-hidden', 'true');
    this.followDrag();
    const observer = new ResizeObserver(() => this.resize());
    observer.observe(host);
    this.cleanUp.push(() => observer.disconnect());
    this.resize();
  }

  private get canvas(): HTMLCanvasElement {
    if (this.webgl !== null) return this.webgl.domElement;
    if (this.painter !== null) return this.painter.canvas;
    throw new Error('no renderer');
  }

  get camera(): CameraName {
    return this.rig.name;
  }

  setCamera(name: CameraName): void {
    this.rig.choose(name);
  }

  /** Turns the view by keys: radians. */
  lookBy(turn: number, lift: number): void {
    this.rig.drag(turn, lift);
  }

  setContent(build: Build, scene: Scene, theme: ViewTheme): void {
    if (build === this.build && scene === this.flyingSite && theme === this.theme) return;
    this.build = build;
    this.flyingSite = scene;
    this.theme = theme;
    const palette = paletteOf(theme, scene.ground.tone);
    this.scene.clear();
    this.scene.background = new Color(palette.sky);
    this.scene.fog = new Fog(palette.sky, 60, 420);
    this.scene.add(new HemisphereLight(palette.sun, palette.shade, 2.1));
    const sun = new DirectionalLight(palette.sun, 1.3);
    sun.position.set(0.45, 0.82, 0.35);
    this.scene.add(sun);
    this.site = siteModel(scene, palette);
    this.site.userData.site = true;
    this.craft = new CraftModel(build, palette);
    this.air = new AirModel(palette);
    this.shadow = blob(this.craft.reach_m, palette.shadow);
    this.pole = heightPole(palette.pole);
    this.scene.add(this.site, this.shadow, this.pole, this.air.streaks, this.air.arrow, this.craft.group);
    this.rig.setPilot(scene.pilot_m[0], scene.pilot_m[1], scene.pilot_m[2]);
  }

  resize(): void {
    const width = Math.max(2, this.host.clientWidth);
    const height = Math.max(2, this.host.clientHeight);
    if (this.webgl !== null) {
      this.webgl.setPixelRatio(this.scale);
      this.webgl.setSize(width, height);
    } else {
      this.painter?.setSize(width, height, Math.min(1, this.scale));
    }
    this.rig.camera.aspect = width / height;
    this.rig.camera.updateProjectionMatrix();
  }

  render(frame: ViewFrame, now_ms: number): void {
    const { craft, air } = this;
    if (craft === null || air === null) return;
    const dt_s = Math.min(0.1, Math.max(0, (now_ms - this.lastFrame_ms) / 1000));
    const { pose } = frame;
    toThree(this.place, pose[0], pose[1], pose[2]);
    turnToThree(this.turn, pose[3], pose[4], pose[5], pose[6]);
    toThree(this.wind, frame.wind_mps[0], frame.wind_mps[1], frame.wind_mps[2]);
    craft.group.position.copy(this.place);
    craft.group.quaternion.copy(this.turn);
    craft.update(frame.rotorSpeeds, frame.thrusts_N, dt_s, this.shows.thrust, frame.loaded);
    air.update(this.place, this.wind, craft.reach_m, dt_s, this.shows.streaks, this.shows.wind);
    this.placeGroundMarks(this.place);
    this.rig.update(this.place, this.turn, craft.reach_m, dt_s);
    craft.group.visible = this.rig.name !== 'onboard';
    if (this.webgl !== null) this.webgl.render(this.scene, this.rig.camera);
    else this.painter?.render(this.scene, this.rig.camera);
    this.adapt(now_ms);
  }

  stats(): { fps: number; scale: number; renderer: 'webgl' | 'canvas' } {
    return { fps: 1000 / this.interval_ms, scale: this.scale, renderer: this.renderer };
  }

  dispose(): void {
    for (const undo of this.cleanUp) undo();
    this.webgl?.dispose();
    this.canvas.remove();
  }

  private placeGroundMarks(place: Vector3): void {
    const { shadow, pole, craft } = this;
    if (shadow === null || pole === null || craft === null) return;
    const height = Math.max(0, place.y);
    shadow.position.set(place.x, 0.01, place.z);
    const spread = 1 + height * 0.06;
    shadow.scale.set(spread, spread, 1);
    if (shadow.material instanceof MeshBasicMaterial) shadow.material.opacity = 0.34 / (1 + height * 0.12);
    pole.position.set(place.x, 0, place.z);
    pole.scale.y = Math.max(0.001, height);
    pole.visible = height > craft.reach_m;
  }

  /** Raises or lowers the resolution so that the frame interval stays near what is wanted. */
  private adapt(now_ms: number): void {
    const interval = now_ms - this.lastFrame_ms;
    this.lastFrame_ms = now_ms;
    if (interval <= 0 || interval > 250) return;
    this.interval_ms += 0.08 * (interval - this.interval_ms);
    this.framesAtScale++;
    if (this.framesAtScale < 20) return;
    const most = Math.min(1.5, window.devicePixelRatio);
    if (this.interval_ms > WANTED_MS && this.scale > LEAST_SCALE) {
      this.setScale(Math.max(LEAST_SCALE, this.scale * 0.82));
    } else if (this.interval_ms < EASY_MS && this.scale < most && this.framesAtScale > 240) {
      this.setScale(Math.min(most, this.scale * 1.15));
    }
  }

  private setScale(scale: number): void {
    this.scale = scale;
    this.framesAtScale = 0;
    this.resize();
  }

  private followDrag(): void {
    const { host, rig } = this;
    let pointer: number | null = null;
    const down = (event: PointerEvent): void => {
      if (event.button !== 0 || event.pointerType === 'touch') return;
      pointer = event.pointerId;
      host.setPointerCapture(pointer);
    };
    const move = (event: PointerEvent): void => {
      if (event.pointerId === pointer) rig.drag(event.movementX * 0.006, event.movementY * 0.006);
    };
    const up = (): void => {
      pointer = null;
    };
    const wheel = (event: WheelEvent): void => {
      event.preventDefault();
      rig.zoomBy(Math.exp(event.deltaY * 0.001));
    };
    host.addEventListener('pointerdown', down);
    host.addEventListener('pointermove', move);
    host.addEventListener('pointerup', up);
    host.addEventListener('wheel', wheel, { passive: false });
    this.cleanUp.push(() => {
      host.removeEventListener('pointerdown', down);
      host.removeEventListener('pointermove', move);
      host.removeEventListener('pointerup', up);
      host.removeEventListener('wheel', wheel);
    });
  }
}

/** A WebGL renderer, or null where there is none. */
function tryWebgl(): WebGLRenderer | null {
  const probe = document.createElement('canvas');
  if (probe.getContext('webgl2') === null) return null;
  try {
    return new WebGLRenderer({ antialias: false, powerPreference: 'high-performance' });
  } catch {
    return null;
  }
}

function blob(reach: number, color: number): Mesh {
  const mesh = new Mesh(
    new CircleGeometry(reach * 0.8, 18),
    new MeshBasicMaterial({ color, transparent: true, opacity: 0.3, depthWrite: false }),
  );
  mesh.rotation.x = -Math.PI / 2;
  mesh.userData.layer = LAYER_FLAT;
  return mesh;
}

/** A line from the ground to the craft. */
function heightPole(color: number): LineSegments {
  const geometry = new BufferGeometry();
  geometry.setAttribute('position', new BufferAttribute(new Float32Array([0, 0, 0, 0, 1, 0]), 3));
  const line = new LineSegments(geometry, new LineBasicMaterial({ color, transparent: true, opacity: 0.5 }));
  line.frustumCulled = false;
  return line;
}
