/** The panel beside the flight: gains, filters, air, noise and faults, all acting in flight. */
import { effect } from '@preact/signals';
import GUI, { type Controller } from 'lil-gui';
import { CORNERS } from '../../../craft/build.ts';
import { AXES, type AxisName, type Gains } from '../../../craft/gains.ts';
import type { ViewShows } from '../../view3d/flightView.ts';
import type { Store } from '../../store/store.ts';
import { NO_FAULTS } from './faultChoices.ts';
import type { FlightChoices, FlightSession } from './session.ts';
import { flyTexts } from './texts.ts';

const words = flyTexts.panel;
const GAIN_KEYS = [
  ['p_us_per_dps', words.p],
  ['i_us_per_deg', words.i],
  ['d_us_per_dps2', words.d],
  ['feedforward_us_per_dps', words.ff],
] as const;

/** Ends of the sliders: a share of the saved gain, and no less than this. */
const SLIDER_TOP = {
  p_us_per_dps: { share: 4, least: 2 },
  i_us_per_deg: { share: 4, least: 10 },
  d_us_per_dps2: { share: 8, least: 0.05 },
  feedforward_us_per_dps: { share: 4, least: 1 },
} as const;
const LOOPS_HZ = [50, 100, 125, 250, 400, 500, 1000, 2000, 4000, 8000];

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
    faultsFolder(gui, session),
    shownFolder(gui, shows),
    handBackFocus(host),
  ];
  return () => {
    for (const end of ends) end();
    gui.destroy();
  };
}

/** A list worked by the pointer gives its focus back, so that the arrow keys fly again. */
function handBackFocus(host: HTMLElement): () => void {
  let byPointer = false;
  const pointer = () => (byPointer = true);
  const key = () => (byPointer = false);
  const change = ({ target }: globalThis.Event) => {
    if (byPointer && target instanceof HTMLSelectElement) target.blur();
  };
  host.addEventListener('pointerdown', pointer);
  host.addEventListener('keydown', key);
  host.addEventListener('change', change);
  return () => {
    host.removeEventListener('pointerdown', pointer);
    host.removeEventListener('keydown', key);
    host.removeEventListener('change', change);
  };
}

/** Marks a number that differs from the saved one; a double click on its row goes back to it. */
function tieToSaved(controller: Controller, saved: () => number): () => void {
  const row = controller.domElement;
  const back = () => controller.setValue(saved());
  row.addEventListener('dblclick', back);
  return () => {
    row.classList.toggle('changed', controller.getValue() !== saved());
    row.title = words.toSaved(String(saved()));
  };
}

/** The field takes more than the slider reaches (the store says what is too much); the slider then grows. */
function openEnded(controller: Controller, top: number): void {
  let end = top;
  const grow = ({ target }: globalThis.Event) => {
    const value = target instanceof HTMLInputElement ? parseFloat(target.value) : NaN;
    if (!(value > end)) return;
    end = value;
    controller.max(value);
  };
  // Before the panel's own listener, which would cut the value to the slider's end.
  controller.domElement.addEventListener('input', grow, true);
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
  const marks: (() => void)[] = [];
  for (const [key, name] of GAIN_KEYS) {
    values[key] = store.gains.value.axes[axis][key];
    const saved = store.savedGains.value.axes[axis][key];
    // A slider from nothing to well past what is sensible: D to where any motor screams.
    const top = Math.max(SLIDER_TOP[key].share * Math.abs(saved), SLIDER_TOP[key].least);
    const controller = folder
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
    openEnded(controller, top);
    marks.push(tieToSaved(controller, () => store.savedGains.value.axes[axis][key]));
  }
  if (axis !== 'roll') folder.close();
  return mirror(folder, () => {
    for (const [key] of GAIN_KEYS) values[key] = store.gains.value.axes[axis][key];
    for (const mark of marks) mark();
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
    .add(
      values,
      'loop',
      [...new Set([...LOOPS_HZ, values.loop])].sort((a, b) => a - b),
    )
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
  for (const controller of folder.controllers) {
    if (controller.property === 'dCut' || controller.property === 'gyroCut') openEnded(controller, 400);
    if (controller.property === 'delay') openEnded(controller, 10);
  }
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
  for (const controller of folder.controllers) {
    if (controller.property === 'mean') openEnded(controller, 20);
    if (controller.property === 'w20') openEnded(controller, 23);
  }
  return mirror(folder, () => Object.assign(values, read()));
}

function noiseFolder(gui: GUI, session: FlightSession): () => void {
  const folder = gui.addFolder(words.noise);
  const values = { ...session.choices.value };
  const set = setterOf(session);
  folder.add(values, 'noiseScale', 0, 10, 0.1).name(words.noiseScale).onChange(set('noiseScale'));
  folder.add(values, 'vibrationScale', 0, 10, 0.1).name(words.vibration).onChange(set('vibrationScale'));
  folder.add(values, 'seed', 0, 9999, 1).name(words.seed).onFinishChange(set('seed'));
  return mirror(folder, () => Object.assign(values, session.choices.value));
}

function faultsFolder(gui: GUI, session: FlightSession): () => void {
  const folder = gui.addFolder(words.faults);
  const values = { ...session.choices.value, none: () => session.change(NO_FAULTS) };
  const set = setterOf(session);
  const corners = ['none', ...CORNERS];
  folder.add(values, 'weakCorner', corners).name(words.weak).onChange(set('weakCorner'));
  folder.add(values, 'weakShare', 0.5, 1, 0.01).name(words.weakShare).onChange(set('weakShare'));
  folder.add(values, 'chippedCorner', corners).name(words.chipped).onChange(set('chippedCorner'));
  folder.add(values, 'imbalance', 1, 30, 0.5).name(words.imbalance).onChange(set('imbalance'));
  folder.add(values, 'shiftForward_mm', -40, 40, 1).name(words.shiftForward).onChange(set('shiftForward_mm'));
  folder.add(values, 'shiftRight_mm', -40, 40, 1).name(words.shiftRight).onChange(set('shiftRight_mm'));
  folder.add(values, 'looseMount', 1, 30, 0.5).name(words.looseMount).onChange(set('looseMount'));
  folder.add(values, 'late_ms', 0, 20, 0.1).name(words.late).onChange(set('late_ms'));
  folder.add(values, 'jitter_ms', 0, 20, 0.1).name(words.jitter).onChange(set('jitter_ms'));
  folder.add(values, 'deadCell').name(words.deadCell).onChange(set('deadCell'));
  folder.add(values, 'none').name(words.noFaults);
  folder.close();
  return mirror(folder, () => Object.assign(values, session.choices.value));
}

function setterOf(session: FlightSession) {
  return (key: keyof FlightChoices) => (value: unknown) => session.change({ [key]: value });
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
