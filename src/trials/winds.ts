/** Winds that trials fly in. */
import { CALM, parseWind, WIND_FORMAT, type Wind } from '../craft/wind.ts';

const KNOT_MPS = 0.514444;

/** MIL-F-8785C levels by wind at 20 ft: 15, 30, 45 kn. */
export const TURBULENCE_LEVELS_MPS = {
  light: 15 * KNOT_MPS,
  moderate: 30 * KNOT_MPS,
  severe: 45 * KNOT_MPS,
} as const;
export type TurbulenceLevel = keyof typeof TURBULENCE_LEVELS_MPS;

/** Turbulence of a level with a mean wind of half its wind at 20 ft, times `scale`. */
export function turbulenceWind(level: TurbulenceLevel, scale: number): Wind {
  const w20 = TURBULENCE_LEVELS_MPS[level] * scale;
  return parseWind({
    format: WIND_FORMAT,
    name: `${level} turbulence × ${scale}`,
    mean_mps: w20 / 2,
    from_deg: 0,
    turbulence: { model: 'MIL-F-8785C', windAt20ft_mps: w20 },
  });
}

/** One gust, up and down, at `start_s`: rise and fall of `rise_s` each (CS 25.341's shape in time). */
export function gustWind(peak_mps: number, from_deg: number, start_s: number, rise_s: number): Wind {
  return { ...CALM, name: `gust ${peak_mps} m/s`, gusts: [{ start_s, rise_s, peak_mps, from_deg }] };
}
