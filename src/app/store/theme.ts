/** The theme that is shown: the person's choice, or what the system asks for. Colours live in styles/tokens.css. */
import { computed, effect, signal, type ReadonlySignal } from '@preact/signals';
import type { Settings } from './document.ts';

export type ShownTheme = 'light' | 'dark' | 'contrast';

/** Colours for canvases, read from the page's own custom properties. */
export interface Palette {
  readonly ground: string;
  readonly raised: string;
  readonly ink: string;
  readonly faint: string;
  readonly line: string;
  readonly accent: string;
  readonly roll: string;
  readonly pitch: string;
  readonly yaw: string;
  readonly warn: string;
  readonly gust: string;
}
const PALETTE_KEYS = [
  'ground',
  'raised',
  'ink',
  'faint',
  'line',
  'accent',
  'roll',
  'pitch',
  'yaw',
  'warn',
  'gust',
] as const satisfies readonly (keyof Palette)[];

export interface Theme {
  readonly shown: ReadonlySignal<ShownTheme>;
  /** Changes with `shown`, after the page has taken the theme on. */
  readonly palette: ReadonlySignal<Palette>;
  readonly reducedMotion: ReadonlySignal<boolean>;
}

function followed(query: string): ReadonlySignal<boolean> {
  const list = window.matchMedia(query);
  const state = signal(list.matches);
  list.addEventListener('change', () => {
    state.value = list.matches;
  });
  return state;
}

function readPalette(): Palette {
  const style = getComputedStyle(document.documentElement);
  const read = (key: string) => style.getPropertyValue(`--${key}`).trim() || '#888888';
  return Object.fromEntries(PALETTE_KEYS.map((key) => [key, read(key)])) as unknown as Palette;
}

/** Follows settings and system; keeps `data-theme` and `data-motion` on the page's root up to date. */
export function startTheme(settings: ReadonlySignal<Settings>): Theme {
  const dark = followed('(prefers-color-scheme: dark)');
  const contrast = followed('(prefers-contrast: more)');
  const still = followed('(prefers-reduced-motion: reduce)');
  const shown = computed<ShownTheme>(() => {
    const choice = settings.value.theme;
    if (choice !== 'auto') return choice;
    if (contrast.value) return 'contrast';
    return dark.value ? 'dark' : 'light';
  });
  const reducedMotion = computed(() => settings.value.reducedMotion === 'on' || still.value);
  const palette = signal(readPalette());
  effect(() => {
    document.documentElement.dataset.theme = shown.value;
    palette.value = readPalette();
  });
  effect(() => {
    document.documentElement.dataset.motion = reducedMotion.value ? 'reduced' : 'full';
  });
  return { shown, palette, reducedMotion };
}
