/** Colours of the view: two tones of sky and ground a theme, matt solids, one accent for nose and thrust. */
import type { Marking, Scene, Solid } from '../../craft/scene.ts';

export type ViewTheme = 'light' | 'dark';

export interface ViewPalette {
  readonly sky: number;
  /** Far ridges, a little darker than the sky. */
  readonly ridge: number;
  readonly ground: number;
  readonly grid: number;
  readonly edge: number;
  readonly hull: number;
  readonly arm: number;
  readonly disc: number;
  readonly blade: number;
  readonly nose: number;
  readonly payload: number;
  readonly thrust: number;
  readonly wind: number;
  readonly shadow: number;
  readonly mark: number;
  readonly ripple: number;
  readonly solids: Readonly<Record<Solid['look'], number>>;
  readonly markings: Readonly<Record<Marking['tone'], number>>;
}

type Tone = Scene['ground']['tone'];

const LIGHT: Omit<ViewPalette, 'ground' | 'grid' | 'markings'> = {
  sky: 0xe4eaea,
  ridge: 0xcfd8d6,
  edge: 0x77736a,
  hull: 0x36434a,
  arm: 0x5d6a70,
  disc: 0x1b2427,
  blade: 0x20292d,
  nose: 0xa6457e,
  payload: 0x2a7fa3,
  thrust: 0x96426f,
  wind: 0x2f6076,
  shadow: 0x1b2427,
  mark: 0x1b2427,
  ripple: 0xc3d5da,
  solids: {
    wall: 0xddd5c6,
    pier: 0xc9c4b8,
    deck: 0xb3ada0,
    rock: 0xd3c6ac,
    water: 0xa8c1c9,
    floor: 0xb98f5a,
  },
};

const DARK: typeof LIGHT = {
  sky: 0x18222a,
  ridge: 0x202c33,
  edge: 0x8a9593,
  hull: 0xd9d5c9,
  arm: 0xa9ada8,
  disc: 0xe6e2d6,
  blade: 0xeeeade,
  nose: 0xcc79a7,
  payload: 0x56b4e9,
  thrust: 0xcc79a7,
  wind: 0xa5c4d2,
  shadow: 0x05090b,
  mark: 0xe6e2d6,
  ripple: 0x3a5561,
  solids: {
    wall: 0x66706f,
    pier: 0x6d7674,
    deck: 0x58615f,
    rock: 0x6e675a,
    water: 0x274350,
    floor: 0x8a6a41,
  },
};

interface GroundTones {
  readonly ground: number;
  readonly grid: number;
  readonly paint: number;
  readonly path: number;
}

const GROUND: Readonly<Record<ViewTheme, Readonly<Record<Tone, GroundTones>>>> = {
  light: {
    grass: { ground: 0xcdd1b5, grid: 0x9fa584, paint: 0xf6f4ee, path: 0xddd6c1 },
    water: { ground: 0xa8c1c9, grid: 0x86a3ad, paint: 0xf6f4ee, path: 0xc3d5da },
    stone: { ground: 0xdbd3c2, grid: 0xb0a68f, paint: 0xf6f4ee, path: 0xe8e2d4 },
    hall: { ground: 0xd9bf94, grid: 0xbb9c6a, paint: 0xfaf7f0, path: 0xcdb083 },
  },
  dark: {
    grass: { ground: 0x2f3a2f, grid: 0x53614c, paint: 0xb9b6aa, path: 0x3f463a },
    water: { ground: 0x274350, grid: 0x3f5f6d, paint: 0xb9b6aa, path: 0x335260 },
    stone: { ground: 0x3b3932, grid: 0x5f5b4f, paint: 0xb9b6aa, path: 0x4a473e },
    hall: { ground: 0x4a3d2a, grid: 0x6f5d42, paint: 0xc9c3b4, path: 0x574930 },
  },
};

export function paletteOf(theme: ViewTheme, tone: Tone): ViewPalette {
  const { ground, grid, paint, path } = GROUND[theme][tone];
  return { ...(theme === 'light' ? LIGHT : DARK), ground, grid, markings: { paint, path } };
}
