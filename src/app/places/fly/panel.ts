/** The panel beside the flight: gains, filters, air, noise and faults, all acting in flight. */
import { effect } from '@preact/signals';
import GUI from 'lil-gui';
import { CORNERS } from '../../../craft/build.ts';
import { AXES, type AxisName, type Gains } from '../../../craft/gains.ts';
import type { ViewShows } from '../../view3d/flightView.ts';
import type { Store } from '../../store/store.ts';
import type { FlightSession } from './session.ts';
import { flyTexts } from './texts.ts';

const words = flyTexts.panel;
const GAIN_KEYS = [
  ['p_us_per_dps', words.p],
  ['i_us_per_deg', words.i],
  ['d_us_per_dps2', words.d],
  ['feedforward_us_per_dps', words.ff],
] as const;

/** Builds the panel in `host`; returns the end of it. */
export function buildPanel(
  host: HTMLElement,
  store: Store,
  session: FlightSession,
  shows: ViewShows,
): () => void {
  const gui = new GUI({ container: host, title: words.title, width: host.clientWidth });
  const ends = [
    ...AXES.map((axis) => gainsFolder(gui, store, axis)),
    filtersFolder(gui, store),
    airFolder(gui, store, session),
    noiseFolder(gui, session),
    shownFolder(gui, shows),
  ];
  return () => {
    for (const end of ends) end();
    gui.destroy();
  };
}

/** Keeps a folder's plain values in step with the store without answering its own writes. */
function mirror(folder: GUI, copy: () => void): () => void {
  return effect(() => {
    copy();
    for (const controller of folder.controllers) controller.updateDisplay();
  });
}

function gainsFolder(gui: GUI, store: Store, axis: AxisName): () => void {
  const folder = gui.addFolder(words.gains(axis));
  const values: Record<string, number> = {};
  for (const [key, name] of GAIN_KEYS) {
    values[key] = store.gains.value.axes[axis][key];
    const saved = store.savedGains.value.axes[axis][key];
    // A slider from nothing to four times what is saved; the field takes anything the file allows.
    const top = Math.max(
      4 * Math.abs(saved),
      { p_us_per_dps: 2, i_us_per_deg: 10, d_us_per_dps2: 0.05, feedforward_us_per_dps: 1 }[key],
    );
    folder
      .add(values, key, 0, top)
      .name(name)
      .onChange((value: number) => {
        store.setGains(
          (gains): Gains => ({
            ...gains,
            axes: { ...gains.axes, [axis]: { ...gains.axes[axis], [key]: value } },
          }),
          `${axis} ${name}`,
        );
      });
  }
  if (axis !== 'roll') folder.close();
  return mirror(folder, () => {
    for (const [key] of GAIN_KEYS) values[key] = store.gains.value.axes[axis][key];
  });
}

function filtersFolder(gui: GUI, store: Store): () => void {
  const folder = gui.addFolder(words.filters);
  const read = () => {
    const gains = store.gains.value;
    return {
      dCut: gains.derivativeLowPass_Hz,
      gyroCut: gains.gyroLowPass_Hz,
      loop: gains.loop_Hz,
      delay: gains.computeDelay_s * 1000,
      on: gains.derivativeOn,
    };
  };
  const values = read();
  const set = (change: Partial<Gains>, label: string) =>
    store.setGains((gains) => ({ ...gains, ...change }), label);
  folder
    .add(values, 'dCut', 0, 400, 1)
    .name(words.dCut)
    .onChange((v: number) => set({ derivativeLowPass_Hz: v }, words.dCut));
  folder
    .add(values, 'gyroCut', 0, 400, 1)
    .name(words.gyroCut)
    .onChange((v: number) => set({ gyroLowPass_Hz: v }, words.gyroCut));
  folder
    .add(values, 'loop', [125, 250, 400, 500, 1000, 2000, 4000, 8000])
    .name(words.loop)
    .onChange((v: number) => set({ loop_Hz: v }, words.loop));
  folder
    .add(values, 'delay', 0, 10, 0.1)
    .name(words.delay)
    .onChange((v: number) => set({ computeDelay_s: v / 1000 }, words.delay));
  folder
    .add(values, 'on', ['measurement', 'error'])
    .name(words.on)
    .onChange((v: Gains['derivativeOn']) => set({ derivativeOn: v }, words.on));
  folder.close();
  return mirror(folder, () => Object.assign(values, read()));
}

function airFolder(gui: GUI, store: Store, session: FlightSession): () => void {
  const folder = gui.addFolder(words.air);
  const gust = {
    peak: 6,
    now: () => session.gustNow(gust.peak),
    siteWind: () => store.setWind(store.scene.value.wind, words.siteWind),
  };
  const read = () => {
    const wind = store.wind.value;
    return {
      site: store.scene.value.name,
      mean: wind.mean_mps,
      from: wind.from_deg,
      model: wind.turbulence.model,
      w20: wind.turbulence.windAt20ft_mps,
    };
  };
  const values = read();
  const sites = Object.fromEntries(store.scenes.value.map((scene) => [scene.title, scene.name]));
  folder
    .add(values, 'site', sites)
    .name(words.site)
    .onChange((name: string) => {
      const scene = store.scenes.value.find((one) => one.name === name);
      if (scene !== undefined) store.setScene(scene, words.site, { keepWind: true });
    });
  folder.add(gust, 'siteWind').name(words.siteWind);
  folder
    .add(values, 'mean', 0, 20, 0.1)
    .name(words.mean)
    .onChange((v: number) => store.setWind((wind) => ({ ...wind, mean_mps: v }), words.mean));
  folder
    .add(values, 'from', 0, 359, 1)
    .name(words.from)
    .onChange((v: number) => store.setWind((wind) => ({ ...wind, from_deg: v }), words.from));
  folder
    .add(values, 'model', ['none', 'MIL-F-8785C', 'MIL-HDBK-1797'])
    .name(words.model)
    .onChange((v: 'none' | 'MIL-F-8785C' | 'MIL-HDBK-1797') =>
      store.setWind(
        (wind) => ({
          ...wind,
          turbulence: {
            ...wind.turbulence,
            model: v,
            // Turbulence without wind at 20 ft would be none: begin with the standard's light level, 15 kn.
            windAt20ft_mps: wind.turbulence.windAt20ft_mps === 0 ? 7.7 : wind.turbulence.windAt20ft_mps,
          },
        }),
        words.model,
      ),
    );
  folder
    .add(values, 'w20', 0, 23, 0.1)
    .name(words.w20)
    .onChange((v: number) =>
      store.setWind(
        (wind) => ({ ...wind, turbulence: { ...wind.turbulence, windAt20ft_mps: v } }),
        words.w20,
      ),
    );
  folder.add(gust, 'peak', 0, 20, 0.5).name(words.gust);
  folder.add(gust, 'now').name(words.gustNow);
  return mirror(folder, () => Object.assign(values, read()));
}

function noiseFolder(gui: GUI, session: FlightSession): () => void {
  const folder = gui.addFolder(words.noise);
  const values = { ...session.choices.value };
  const set = (key: keyof typeof values) => (value: unknown) => session.change({ [key]: value });
  folder.add(values, 'noiseScale', 0, 10, 0.1).name(words.noiseScale).onChange(set('noiseScale'));
  folder.add(values, 'vibrationScale', 0, 10, 0.1).name(words.vibration).onChange(set('vibrationScale'));
  folder
    .add(values, 'weakCorner', ['none', ...CORNERS])
    .name(words.weak)
    .onChange(set('weakCorner'));
  folder.add(values, 'weakShare', 0.5, 1, 0.01).name(words.weakShare).onChange(set('weakShare'));
  folder.add(values, 'late_ms', 0, 20, 0.1).name(words.late).onChange(set('late_ms'));
  folder.add(values, 'seed', 0, 9999, 1).name(words.seed).onFinishChange(set('seed'));
  folder.close();
  return mirror(folder, () => Object.assign(values, session.choices.value));
}

function shownFolder(gui: GUI, shows: ViewShows): () => void {
  const folder = gui.addFolder(words.shown);
  folder.add(shows, 'thrust').name(words.thrust);
  folder.add(shows, 'wind').name(words.wind);
  folder.add(shows, 'streaks').name(words.streaks);
  folder.add(shows, 'trail').name(words.trail);
  folder.close();
  return () => undefined;
}
