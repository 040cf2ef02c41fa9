/** The wind file, `gustbench.wind/1`: mean wind, turbulence and gusts; alone or inside a scene. */
import { z } from 'zod';
import { choice, formatTag, parseWith, positive, quantity, title } from './fields.ts';
import { refuse } from './problem.ts';

export const WIND_FORMAT = 'gustbench.wind/1';

const gust = z.strictObject(
  {
    start_s: quantity(0, 86_400, 's'),
    /** Distance over which the gust rises, d_m of MIL-F-8785C 3.7.3; the craft meets it at the airspeed. */
    length_m: positive(10_000, 'm').optional(),
    /** Time over which it rises, instead of length_m. */
    rise_s: positive(600, 's').optional(),
    /** Time it holds after the rise and before the fall; absent: up and down at once, as in CS 25.341. */
    hold_s: quantity(0, 3600, 's').optional(),
    peak_mps: quantity(-80, 80, 'm/s'),
    from_deg: quantity(-360, 360, 'deg'),
    up_mps: quantity(-40, 40, 'm/s').optional(),
  },
  { error: 'an object with start_s, length_m or rise_s, peak_mps, from_deg' },
);

const profile = z.union(
  [
    z.literal('uniform'),
    z.strictObject({
      law: z.literal('power'),
      exponent: quantity(0, 1, ''),
      reference_m: positive(1000, 'm'),
    }),
    z.strictObject({
      law: z.literal('log'),
      roughness_m: positive(5, 'm'),
      reference_m: positive(1000, 'm'),
    }),
  ],
  {
    error: '"uniform", {law: "power", exponent, reference_m} or {law: "log", roughness_m, reference_m}',
  },
);

export const windSchema = z.strictObject(
  {
    format: formatTag(WIND_FORMAT),
    name: title().optional(),
    /** Mean wind speed at the profile's reference height (anywhere, if uniform). */
    mean_mps: quantity(0, 60, 'm/s').default(0),
    /** Where it comes from, clockwise from north. */
    from_deg: quantity(-360, 360, 'deg').default(0),
    profile: profile.default('uniform'),
    turbulence: z
      .strictObject(
        {
          model: choice(['none', 'MIL-F-8785C', 'MIL-HDBK-1797']),
          windAt20ft_mps: quantity(0, 60, 'm/s').default(0),
          /** Turbulence is scaled by this; 1 is the standard's own level. */
          scale: quantity(0, 5, '').optional(),
        },
        { error: 'an object with model and windAt20ft_mps' },
      )
      .default({ model: 'none', windAt20ft_mps: 0 }),
    gusts: z.array(gust, { error: 'a list of gusts' }).max(200, { error: 'at most 200 gusts' }).default([]),
  },
  { error: 'a wind object' },
);

export type Wind = z.output<typeof windSchema>;
export type Gust = Wind['gusts'][number];
export type WindProfile = Wind['profile'];

/** Air at rest. */
export const CALM: Wind = parseWind({ format: WIND_FORMAT, name: 'calm' });

/**
 * Validates a wind object.
 * @throws InputError naming path, value and what is allowed.
 */
export function parseWind(raw: unknown, file = 'wind'): Wind {
  const wind = parseWith(windSchema, raw, file);
  const { profile } = wind;
  if (typeof profile === 'object' && profile.law === 'log' && profile.reference_m <= profile.roughness_m) {
    throw refuse(file, 'profile.reference_m', profile.reference_m, 'more than profile.roughness_m');
  }
  wind.gusts.forEach((one, index) => {
    if ((one.length_m === undefined) === (one.rise_s === undefined)) {
      throw refuse(file, `gusts[${index}]`, one, 'exactly one of length_m and rise_s');
    }
  });
  return wind;
}
