/** Winds that trials fly in. */
import { CALM, parseWind, WIND_FORMAT, type Wind } from '../craft/wind.ts';

const KNOT_MPS = 1852 / 3600;

/** Levels of MIL-F-8785C by wind at 20 ft, kn. */
export const TURBULENCE_KNOTS = { light: 15, moderate: 30, severe: 45 } as const;
export type TurbulenceLevel = keyof typeof TURBULENCE_KNOTS;

/** Turbulence of a level times `scale`, with a mean wind from the north of `meanShare` of its wind at 20 ft. */
export function turbulenceWind(level: TurbulenceLevel, scale: number, meanShare: number): Wind {
  const windAt20ft_mps = Number((TURBULENCE_KNOTS[level] * KNOT_MPS * scale).toFixed(4));
  return parseWind({
    format: WIND_FORMAT,
    name: scale === 1 ? `${level} turbulence` : `${level} turbulence × ${scale}`,
    mean_mps: Number((windAt20ft_mps * meanShare).toFixed(4)),
    turbulence: { model: 'MIL-F-8785C', windAt20ft_mps },
  });
}

/** One gust up and down at once, rise and fall of `rise_s` each: the shape of CS 25.341 in time. */
export function gustWind(peak_mps: number, from_deg: number, start_s: number, rise_s: number): Wind {
  return { ...CALM, name: `gust ${peak_mps} m/s`, gusts: [{ start_s, rise_s, peak_mps, from_deg }] };
}
