/**
 * The flight view alone, for the browser tests; not part of the program. The address says what is shown:
 * ?scene=estuary-bridge&craft=sandpiper&theme=light&camera=chase&canvas=1&at=12.5 (held there; else it flies).
 */
import { parseBuild, type Build } from '../../../src/craft/build.ts';
import { parseScene } from '../../../src/craft/scene.ts';
import { quaternionFromEuler } from '../../../src/math/quaternion.ts';
import { CAMERAS } from '../../../src/app/view3d/cameras.ts';
import { FlightView, type ViewFrame } from '../../../src/app/view3d/flightView.ts';

const files: Record<string, unknown> = import.meta.glob('../../../scenes/*.json', {
  eager: true,
  import: 'default',
});
const file = (name: string): unknown =>
  Object.entries(files).find(([path]) => path.endsWith(`/${name}`))?.[1];

const query = new URLSearchParams(location.search || location.hash.replace(/^#/, ''));
const ask = (name: string, other: string): string => query.get(name) ?? other;

const scene = parseScene(file(`${ask('scene', 'estuary-bridge')}.scene.json`), 'scene');
const measured = parseBuild(file(`${ask('craft', 'sandpiper')}.build.json`), 'build');
const build = lengthened(measured, Number(ask('arm', '1')));
const host = document.querySelector('main');
if (host === null) throw new Error('no main');
const view = new FlightView(host, query.has('canvas'));
view.setContent(build, scene, ask('theme', 'light') === 'dark' ? 'dark' : 'light');
view.setCamera(CAMERAS.find((name) => name === ask('camera', 'chase')) ?? 'chase');
Object.assign(view.shows, {
  trail: query.has('trail'),
  thrust: !query.has('bare'),
  streaks: !query.has('bare'),
});
view.zoomBy(Number(ask('zoom', '1')));
view.lookBy(Number(ask('turn', '0')), Number(ask('lift', '0')));

const held = query.get('at');
let frames = 0;
const start_ms = performance.now();
function beat(now_ms: number): void {
  requestAnimationFrame(beat);
  view.render(frameAt(held === null ? (now_ms - start_ms) / 1000 : Number(held)), now_ms);
  frames++;
}
requestAnimationFrame(beat);
Object.assign(window, {
  bench: {
    stats: () => ({ ...view.stats(), frames, time_s: (performance.now() - start_ms) / 1000 }),
    camera: (name: (typeof CAMERAS)[number]) => view.setCamera(name),
    view,
  },
});

/** An invented flight: up from the start, forward and back across the site, turning. */
function frameAt(time_s: number): ViewFrame {
  const [north, east, down] = scene.start.position_m;
  const phase = 0.35 * time_s;
  const up = Math.min(1, time_s / 4);
  const height = 0.13 + up * (1.6 + 0.9 * Math.sin(0.6 * time_s));
  const way = Math.min(1, Math.max(0, time_s - 3) / 4);
  const roll = 0.18 * way * Math.sin(phase * 1.7);
  const pitch = -0.2 * way * Math.cos(phase);
  const yaw = (scene.start.heading_deg * Math.PI) / 180 + 0.5 * way * Math.sin(phase);
  const speed = 470 * Math.min(1, time_s);
  const { mean_mps, from_deg } = scene.wind;
  const from = (from_deg * Math.PI) / 180;
  const gust = mean_mps * (1 + 0.25 * Math.sin(1.3 * time_s));
  return {
    pose: [
      north + way * 7 * Math.sin(phase),
      east - way * 5 * (1 - Math.cos(phase)),
      down - height,
      ...quaternionFromEuler(roll, pitch, yaw),
    ],
    rotorSpeeds: [speed, 1.05 * speed, 0.97 * speed, speed],
    thrusts_N: [0, 1, 2, 3].map((i) => 3.3 * up * (1 + 0.25 * Math.sin(phase * 3 + i))),
    wind_mps: [-gust * Math.cos(from), -gust * Math.sin(from), 0],
    loaded: time_s < 30,
    struck: [0, 0, 0, query.has('struck') ? 1 : 0],
  };
}

/** The build with its rotors `share` times as far out. */
function lengthened(one: Build, share: number): Build {
  const rotors = one.rotors.map((rotor) => ({
    ...rotor,
    position_m: [rotor.position_m[0] * share, rotor.position_m[1] * share, rotor.position_m[2]],
  }));
  return { ...one, rotors: rotors as unknown as Build['rotors'] };
}
