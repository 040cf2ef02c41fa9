/**
 * Scale lengths and intensities of low-altitude turbulence, MIL-F-8785C 3.7.3.4, and their form in
 * MIL-HDBK-1797.
 *
 * The two documents write the same turbulence in two ways: the handbook halves the transverse lengths
 * (2 L_w = h, 2 L_v = L_u) and puts 2 L where the specification has L in the transverse spectra. Mixing the
 * lengths of one with the spectra of the other is wrong by an octave; kept apart, the air is the same.
 */
import type { Wind } from '../craft/wind.ts';

export type TurbulenceModel = Exclude<Wind['turbulence']['model'], 'none'>;

const METRES_PER_FOOT = 0.3048;
const LEAST_HEIGHT_M = 10 * METRES_PER_FOOT;
const GREATEST_HEIGHT_M = 1000 * METRES_PER_FOOT;

export interface TurbulenceLevels {
  /** Root mean square of the components along the wind, across it and vertical, m/s. */
  sigmaU_mps: number;
  sigmaV_mps: number;
  sigmaW_mps: number;
  /** Scale lengths as the document defines them, m. */
  lengthU_m: number;
  lengthV_m: number;
  lengthW_m: number;
  /** Factor of L in the transverse spectra (1 + 3 (cLΩ)²)/(1 + (cLΩ)²)²: 1 in MIL-F-8785C, 2 in MIL-HDBK-1797. */
  transverseFactor: number;
}

/** Levels to write into. */
export function emptyLevels(): TurbulenceLevels {
  return {
    sigmaU_mps: 0,
    sigmaV_mps: 0,
    sigmaW_mps: 0,
    lengthU_m: 1,
    lengthV_m: 1,
    lengthW_m: 1,
    transverseFactor: 1,
  };
}

/** Height whose values hold at `height_m`, see `levelsAt`. */
export function heldHeight(height_m: number): number {
  // Written so that a height that is not a number gives the least one.
  return height_m > LEAST_HEIGHT_M ? Math.min(height_m, GREATEST_HEIGHT_M) : LEAST_HEIGHT_M;
}

/**
 * Writes the levels at `height_m` above the ground for the wind at 20 ft.
 * Below 10 ft the values of 10 ft are held, above 1000 ft those of 1000 ft (isotropic, L = 1000 ft, as the
 * specification's figures draw them up to 2000 ft, the end of its low-altitude model; beyond that a level
 * would need a probability of exceedance, which a wind file does not hold).
 */
export function levelsAt(
  model: TurbulenceModel,
  height_m: number,
  windAt20ft_mps: number,
  out: TurbulenceLevels,
): void {
  const h = heldHeight(height_m) / METRES_PER_FOOT;
  const shape = 0.177 + 0.000823 * h;
  const along_m = (h / shape ** 1.2) * METRES_PER_FOOT;
  const sigmaW = 0.1 * windAt20ft_mps;
  const factor = model === 'MIL-HDBK-1797' ? 2 : 1;
  out.sigmaW_mps = sigmaW;
  out.sigmaU_mps = out.sigmaV_mps = sigmaW / shape ** 0.4;
  out.lengthU_m = along_m;
  out.lengthV_m = along_m / factor;
  out.lengthW_m = (h * METRES_PER_FOOT) / factor;
  out.transverseFactor = factor;
}
