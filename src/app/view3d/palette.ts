/** Colours of the view: two tones of sky and ground a theme, matt solids, one accent for the nose. */
import type { Scene, Solid } from '../../craft/scene.ts';

export type ViewTheme = 'light' | 'dark';

export interface ViewPalette {
  readonly sky: number;
  readonly ground: number;
  readonly grid: number;
  readonly edge: number;
  readonly craft: number;
  readonly arm: number;
  readonly disc: number;
  readonly blade: number;
  readonly nose: number;
  readonly payload: number;
  readonly thrust: number;
  readonly wind: number;
  readonly shadow: number;
  readonly pole: number;
  readonly solids: Readonly<Record<Solid['look'], number>>;
  readonly sun: number;
  readonly shade: number;
}

const GROUND: Readonly<Record<ViewTheme, Readonly<Record<Scene['ground']['tone'], number>>>> = {
  light: { grass: 0xc9cdb0, water: 0xb7c6c8, stone: 0xd3cbbb, hall: 0xd9c7a6 },
  dark: { grass: 0x2b3329, water: 0x1f2d31, stone: 0x353430, hall: 0x3a332a },
};

export function paletteOf(theme: ViewTheme, tone: Scene['ground']['tone']): ViewPalette {
  const ground = GROUND[theme][tone];
  return theme === 'light'
    ? {
        sky: 0xdfe8ea,
        ground,
        grid: 0x9aa08c,
        edge: 0x6d6a5e,
        craft: 0x2c373b,
        arm: 0x4b575b,
        disc: 0x1b2427,
        blade: 0x1b2427,
        nose: 0x96426f,
        payload: 0x0f6d8c,
        thrust: 0x96426f,
        wind: 0x35586b,
        shadow: 0x1b2427,
        pole: 0x1b2427,
        solids: {
          wall: 0xc2b9a6,
          pier: 0xa9a294,
          deck: 0x8f8a7e,
          rock: 0xb5a993,
          water: 0x9fb8c2,
          floor: 0xbda67d,
        },
        sun: 0xffffff,
        shade: 0xb9c0b4,
      }
    : {
        sky: 0x1a2429,
        ground,
        grid: 0x4d5a54,
        edge: 0x7d8a8c,
        craft: 0xd2cfc4,
        arm: 0xa7a9a2,
        disc: 0xe6e2d6,
        blade: 0xe6e2d6,
        nose: 0xcc79a7,
        payload: 0x56b4e9,
        thrust: 0xcc79a7,
        wind: 0x9db9c4,
        shadow: 0x000000,
        pole: 0xe6e2d6,
        solids: {
          wall: 0x59605f,
          pier: 0x666a66,
          deck: 0x4c5455,
          rock: 0x5b564d,
          water: 0x24404b,
          floor: 0x54493a,
        },
        sun: 0xfff6e6,
        shade: 0x4a5a60,
      };
}
