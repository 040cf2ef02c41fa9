/**
 * The view of a flight: site, craft, air, cameras and one of two renderers. With WebGL (also in software) the
 * resolution adapts so that the rate holds; without any WebGL, or when it is lost, a 2D canvas draws the same.
 */
import { Color, Fog, Quaternion, Scene as ThreeScene, Vector3, WebGLRenderer } from 'three';
import type { Build } from '../../craft/build.ts';
import type { Scene } from '../../craft/scene.ts';
import { AirModel } from './air.ts';
import { fromThree, toThree, turnToThree } from './axes.ts';
import { CameraRig, type CameraName } from './cameras.ts';
import { CanvasPainter, FOG_FROM_M, FOG_TO_M } from './canvasPainter.ts';
import { CraftModel } from './craftModel.ts';
import { GroundModel } from './ground.ts';
import { HeightMarks, Trail } from './marks.ts';
import { paletteOf, type ViewTheme } from './palette.ts';
import { SiteModel } from './siteModel.ts';

/** What is drawn in one frame, in the bench's own axes. */
export interface ViewFrame {
  /** 0–2 position NED m, 3–6 quaternion w, x, y, z. */
  readonly pose: ArrayLike<number>;
  /** rad/s, FL FR RL RR. */
  readonly rotorSpeeds: ArrayLike<number>;
  readonly thrusts_N: ArrayLike<number>;
  readonly wind_mps: ArrayLike<number>;
  /** The payload is still on. */
  readonly loaded: boolean;
  /** 1 where a propeller struck something. */
  readonly struck?: ArrayLike<number>;
}

export interface ViewShows {
  thrust: boolean;
  wind: boolean;
  streaks: boolean;
  trail: boolean;
}

/** Frame interval that is wanted, and the interval below which resolution may rise, ms. */
const WANTED_MS = 1000 / 47;
const EASY_MS = 1000 / 57;
/** Frames at one resolution before the next step down, and up. */
const FRAMES_DOWN = 20;
const FRAMES_UP = 180;
const LEAST_SCALE = 0.4;
/** A gap between frames longer than this was a hidden page, not a slow one. */
const HIDDEN_MS = 1000;

/** Everything that is made anew with build, site or theme. */
interface Content {
  readonly ground: GroundModel;
  readonly site: SiteModel;
  readonly craft: CraftModel;
  readonly marks: HeightMarks;
  readonly trail: Trail;
  readonly air: AirModel;
}

export class FlightView {
  readonly shows: ViewShows = { thrust: true, wind: true, streaks: true, trail: false };
  private readonly scene = new ThreeScene();
  private readonly rig = new CameraRig();
  private webgl: WebGLRenderer | null;
  private painter: CanvasPainter | null;
  private content: Content | null = null;
  private scale: number;
  private readonly mostScale: number;
  private interval_ms = 16;
  private lastFrame_ms = 0;
  private framesAtScale = 0;
  /** Resolutions above this were too slow; raised again only after a while. */
  private tooMuch = Infinity;
  private readonly place = new Vector3();
  private readonly turn = new Quaternion();
  private readonly wind = new Vector3();
  private readonly bench = new Float64Array(3);
  private build: Build | null = null;
  private flyingSite: Scene | null = null;
  private theme: ViewTheme = 'light';
  private readonly cleanUp: (() => void)[] = [];

  /** @param canvasOnly draws on the 2D canvas even where there is WebGL. */
  constructor(
    private readonly host: HTMLElement,
    canvasOnly = false,
  ) {
    const kind = canvasOnly ? 'none' : webglKind();
    this.webgl = kind === 'none' ? null : tryWebgl(kind === 'hardware');
    this.painter = this.webgl === null ? new CanvasPainter() : null;
    // In software half the pixels are a good start; the rate soon says what can be afforded.
    this.mostScale = Math.min(kind === 'hardware' ? 2 : 1.25, window.devicePixelRatio);
    this.scale = kind === 'hardware' ? this.mostScale : kind === 'software' ? 0.6 : 1;
    this.attach();
    this.followPointer();
    const observer = new ResizeObserver(() => this.resize());
    observer.observe(host);
    this.cleanUp.push(() => observer.disconnect());
  }

  get renderer(): 'webgl' | 'canvas' {
    return this.webgl === null ? 'canvas' : 'webgl';
  }

  private get canvas(): HTMLCanvasElement {
    if (this.webgl !== null) return this.webgl.domElement;
    if (this.painter !== null) return this.painter.canvas;
    throw new Error('no renderer');
  }

  private attach(): void {
    this.host.append(this.canvas);
    this.canvas.setAttribute('aria-hidden', 'true');
    this.canvas.addEventListener('webglcontextlost', () => this.loseWebgl(), { once: true });
    this.resize();
  }

  /** The graphics driver gave up: goes on with the 2D canvas. */
  private loseWebgl(): void {
    if (this.webgl === null) return;
    this.webgl.domElement.remove();
    this.webgl.dispose();
    this.webgl = null;
    this.painter = new CanvasPainter();
    this.scale = 1;
    this.attach();
    const { build, flyingSite } = this;
    this.build = null;
    if (build !== null && flyingSite !== null) this.setContent(build, flyingSite, this.theme);
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

  /** Nearer below 1, farther above. */
  zoomBy(factor: number): void {
    this.rig.zoomBy(factor);
  }

  setContent(build: Build, scene: Scene, theme: ViewTheme): void {
    if (build === this.build && scene === this.flyingSite && theme === this.theme) return;
    this.build = build;
    this.flyingSite = scene;
    this.theme = theme;
    this.clear();
    const palette = paletteOf(theme, scene.ground.tone);
    this.scene.background = new Color(palette.sky);
    this.scene.fog = new Fog(palette.sky, FOG_FROM_M, FOG_TO_M);
    const craft = new CraftModel(build, palette, this.webgl !== null);
    const content: Content = {
      craft,
      ground: new GroundModel(scene, palette),
      site: new SiteModel(scene, palette),
      marks: new HeightMarks(craft.reach_m, palette),
      trail: new Trail(palette),
      air: new AirModel(craft.reach_m, palette),
    };
    const { marks, air } = content;
    const site = this.webgl === null ? content.site.group : content.site.merged();
    this.scene.add(content.ground.group, site, marks.shadow, marks.ring, marks.pole);
    this.scene.add(craft.group, air.arrow, content.trail.lines, air.streaks);
    this.content = content;
    this.rig.setPilot(scene.pilot_m[0], scene.pilot_m[1], scene.pilot_m[2]);
  }

  /** Frees what the last content held on the graphics side. */
  private clear(): void {
    this.scene.traverse((object) => {
      if (!('geometry' in object) || !('material' in object)) return;
      (object.geometry as { dispose(): void }).dispose();
      (object.material as { dispose(): void }).dispose();
    });
    this.scene.clear();
  }

  resize(): void {
    const width = Math.max(2, this.host.clientWidth);
    const height = Math.max(2, this.host.clientHeight);
    if (this.webgl !== null) {
      this.webgl.setPixelRatio(this.scale);
      this.webgl.setSize(width, height);
    } else {
      this.painter?.setSize(width, height, this.scale);
    }
    this.rig.camera.aspect = width / height;
    this.rig.camera.updateProjectionMatrix();
  }

  render(frame: ViewFrame, now_ms: number): void {
    const { content, place, turn } = this;
    if (content === null) return;
    const { craft, air, marks, site } = content;
    const dt_s = Math.min(0.1, Math.max(0, (now_ms - this.lastFrame_ms) / 1000));
    const { pose } = frame;
    toThree(place, pose[0], pose[1], pose[2]);
    turnToThree(turn, pose[3], pose[4], pose[5], pose[6]);
    toThree(this.wind, frame.wind_mps[0], frame.wind_mps[1], frame.wind_mps[2]);
    craft.group.position.copy(place);
    craft.group.quaternion.copy(turn);
    craft.update(frame.rotorSpeeds, frame.thrusts_N, dt_s, {
      thrust: this.shows.thrust,
      loaded: frame.loaded,
      struck: frame.struck,
    });
    air.update(place, this.wind, dt_s, this.shows);
    fromThree(this.bench, place);
    marks.update(place, -site.space.topBelow(this.bench[0], this.bench[1], this.bench[2]));
    content.trail.update(place, dt_s, this.shows.trail);
    this.rig.update(place, turn, craft.reach_m, site.space, dt_s);
    content.ground.follow(this.rig.camera.position, place);
    craft.group.visible = this.rig.name !== 'onboard';
    if (this.rig.name === 'onboard') air.arrow.visible = false;
    site.pilot.visible = this.rig.name !== 'pilot';
    this.draw(content);
    this.adapt(now_ms);
  }

  private draw(content: Content): void {
    if (this.webgl !== null) {
      this.webgl.render(this.scene, this.rig.camera);
      return;
    }
    const { craft, air, marks, trail, site, ground } = content;
    this.scene.updateMatrixWorld();
    this.painter?.render(
      {
        sky: this.scene.background instanceof Color ? this.scene.background : new Color(),
        flats: ground.group.children,
        space: site.space,
        solids: site.meshes,
        craft: [marks.shadow, marks.ring, marks.pole, craft.group, air.arrow, trail.lines, air.streaks],
        centre: this.place,
        reach_m: craft.reach_m,
      },
      this.rig.camera,
    );
  }

  /** Frames a second lately, resolution against CSS pixels, and what draws. */
  stats(): { fps: number; scale: number; renderer: 'webgl' | 'canvas' } {
    return { fps: 1000 / this.interval_ms, scale: this.scale, renderer: this.renderer };
  }

  dispose(): void {
    for (const undo of this.cleanUp) undo();
    this.clear();
    this.canvas.remove();
    this.webgl?.dispose();
  }

  /** Raises or lowers the resolution so that the frame interval stays near what is wanted. */
  private adapt(now_ms: number): void {
    const interval = now_ms - this.lastFrame_ms;
    this.lastFrame_ms = now_ms;
    if (interval <= 0 || interval > HIDDEN_MS) return;
    this.interval_ms += 0.08 * (Math.min(200, interval) - this.interval_ms);
    this.framesAtScale++;
    if (this.framesAtScale < FRAMES_DOWN) return;
    if (this.interval_ms > WANTED_MS && this.scale > LEAST_SCALE) {
      this.tooMuch = this.scale;
      this.setScale(Math.max(LEAST_SCALE, this.scale * 0.82));
    } else if (
      this.interval_ms < EASY_MS &&
      this.scale < this.mostScale &&
      this.framesAtScale > FRAMES_UP * (this.scale * 1.15 >= this.tooMuch ? 8 : 1)
    ) {
      this.setScale(Math.min(this.mostScale, this.scale * 1.15));
    }
  }

  private setScale(scale: number): void {
    this.scale = scale;
    this.framesAtScale = 0;
    this.interval_ms = Math.min(this.interval_ms, WANTED_MS);
    this.resize();
  }

  /** Drag and pinch turn and move the eye, the wheel brings it nearer. */
  private followPointer(): void {
    const { host, rig } = this;
    const held = new Map<number, { x: number; y: number }>();
    const spread = () => {
      const [a, b] = [...held.values()];
      return Math.hypot(a.x - b.x, a.y - b.y);
    };
    const listen = <K extends keyof HTMLElementEventMap>(
      type: K,
      act: (event: HTMLElementEventMap[K]) => void,
    ): void => {
      host.addEventListener(type, act, { passive: false });
      this.cleanUp.push(() => host.removeEventListener(type, act));
    };
    listen('pointerdown', (event) => {
      if (event.button !== 0) return;
      held.set(event.pointerId, { x: event.clientX, y: event.clientY });
      host.setPointerCapture(event.pointerId);
    });
    listen('pointermove', (event) => {
      const last = held.get(event.pointerId);
      if (last === undefined) return;
      const before = held.size === 2 ? spread() : 0;
      if (held.size === 1) rig.drag((event.clientX - last.x) * 0.006, (event.clientY - last.y) * 0.006);
      last.x = event.clientX;
      last.y = event.clientY;
      if (held.size === 2 && before > 0) rig.zoomBy(before / Math.max(1, spread()));
    });
    const release = (event: PointerEvent): void => void held.delete(event.pointerId);
    listen('pointerup', release);
    listen('pointercancel', release);
    listen('wheel', (event) => {
      event.preventDefault();
      rig.zoomBy(Math.exp(event.deltaY * 0.001));
    });
  }
}

/** What WebGL there is: drawn by a graphics chip, by the processor, or none. */
function webglKind(): 'hardware' | 'software' | 'none' {
  const gl = document.createElement('canvas').getContext('webgl2');
  if (gl === null) return 'none';
  const named = gl.getExtension('WEBGL_debug_renderer_info');
  const name: unknown = gl.getParameter(named === null ? gl.RENDERER : named.UNMASKED_RENDERER_WEBGL);
  gl.getExtension('WEBGL_lose_context')?.loseContext();
  return /swiftshader|llvmpipe|software|basic render/i.test(String(name)) ? 'software' : 'hardware';
}

/** Opaque to the page (the compositor need not blend it), without stencil. */
function tryWebgl(antialias: boolean): WebGLRenderer | null {
  const canvas = document.createElement('canvas');
  const context = canvas.getContext('webgl2', {
    alpha: false,
    antialias,
    stencil: false,
    powerPreference: 'high-performance',
  });
  if (context === null) return null;
  try {
    return new WebGLRenderer({ canvas, context });
  } catch {
    return null;
  }
}
