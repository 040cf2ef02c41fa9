/** Mean wind speed with height: uniform, power law or logarithmic law. */
import type { Wind, WindProfile } from '../craft/wind.ts';

/** Laws of the surface layer are held below this height over the ground … */
const LEAST_PROFILE_HEIGHT_M = 0.5;
/** … and above this one, the usual depth of the neutral boundary layer (common practice). */
const GREATEST_PROFILE_HEIGHT_M = 600;

/**
 * Factor on the speed at the reference height.
 * Power law: (h/h_ref)^exponent. Log law: ln(h/z₀)/ln(h_ref/z₀), 0 at and below the roughness height z₀.
 */
function profileFactor(profile: WindProfile, height_m: number): number {
  if (profile === 'uniform') return 1;
  // Written so that a height that is not a number gives the least one.
  const h =
    height_m > LEAST_PROFILE_HEIGHT_M
      ? Math.min(height_m, GREATEST_PROFILE_HEIGHT_M)
      : LEAST_PROFILE_HEIGHT_M;
  if (profile.law === 'power') return (h / profile.reference_m) ** profile.exponent;
  const { roughness_m, reference_m } = profile;
  return Math.max(0, Math.log(h / roughness_m) / Math.log(reference_m / roughness_m));
}

/** Mean wind speed at `height_m` over the ground, m/s. */
export function meanSpeed(wind: Wind, height_m: number): number {
  return wind.mean_mps === 0 ? 0 : wind.mean_mps * profileFactor(wind.profile, height_m);
}
