/**
 * ISO 2533:1975 standard atmosphere, troposphere only (−2 km to 11 km geopotential), with the day's own
 * temperature and pressure where they are known.
 */
import { GRAVITY_MPS2 } from '../math/angles.ts';

const SEA_LEVEL_TEMPERATURE_K = 288.15;
const SEA_LEVEL_PRESSURE_PA = 101_325;
const LAPSE_K_PER_M = -0.0065;
/** Specific gas constant of dry air, J/(kg·K), ISO 2533 table 1. */
export const AIR_GAS_CONSTANT = 287.05287;

export interface Air {
  readonly temperature_K: number;
  readonly pressure_Pa: number;
  readonly density_kgpm3: number;
}

/** Standard air at geopotential altitude `altitude_m` (ISO 2533 eqs. 8, 11, 14). */
export function standardAir(altitude_m: number): Air {
  const temperature_K = SEA_LEVEL_TEMPERATURE_K + LAPSE_K_PER_M * altitude_m;
  const exponent = -GRAVITY_MPS2 / (LAPSE_K_PER_M * AIR_GAS_CONSTANT);
  const pressure_Pa = SEA_LEVEL_PRESSURE_PA * Math.pow(temperature_K / SEA_LEVEL_TEMPERATURE_K, exponent);
  return { temperature_K, pressure_Pa, density_kgpm3: pressure_Pa / (AIR_GAS_CONSTANT * temperature_K) };
}

/** Air at a site: standard at its elevation, with the day's temperature and station pressure if given. */
export function siteAir(site: { elevation_m: number; temperature_K?: number; pressure_Pa?: number }): Air {
  const standard = standardAir(site.elevation_m);
  const temperature_K = site.temperature_K ?? standard.temperature_K;
  const pressure_Pa = site.pressure_Pa ?? standard.pressure_Pa;
  return { temperature_K, pressure_Pa, density_kgpm3: pressure_Pa / (AIR_GAS_CONSTANT * temperature_K) };
}

/** Altitude in the standard atmosphere that has this density, m (density altitude). */
export function densityAltitude_m(density_kgpm3: number): number {
  const seaLevel = standardAir(0).density_kgpm3;
  const exponent = -GRAVITY_MPS2 / (LAPSE_K_PER_M * AIR_GAS_CONSTANT) - 1;
  return (SEA_LEVEL_TEMPERATURE_K / LAPSE_K_PER_M) * (Math.pow(density_kgpm3 / seaLevel, 1 / exponent) - 1);
}
