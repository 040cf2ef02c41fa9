/** The gains file, `gustbench.gains/1`: what the rate controller is set to. */
import { z } from 'zod';
import { choice, formatTag, parseWith, positive, quantity, title } from './fields.ts';
import { refuse } from './problem.ts';

export const GAINS_FORMAT = 'gustbench.gains/1';

const axisGains = z.strictObject(
  {
    p_us_per_dps: quantity(-1000, 1000, 'µs per deg/s'),
    i_us_per_deg: quantity(-100_000, 100_000, 'µs per deg'),
    d_us_per_dps2: quantity(-100, 100, 'µs per deg/s²'),
    feedforward_us_per_dps: quantity(-1000, 1000, 'µs per deg/s').default(0),
    /** Share of the setpoint that the proportional term sees (Åström & Hägglund's b). */
    setpointWeight: quantity(0, 2, '').optional(),
  },
  { error: 'an object with p_us_per_dps, i_us_per_deg, d_us_per_dps2, feedforward_us_per_dps' },
);

const notch = z.strictObject(
  { centre_Hz: positive(20_000, 'Hz'), q: positive(200, '') },
  { error: 'an object with centre_Hz and q' },
);

const levelling = z.strictObject({
  /** Attitude error to rate setpoint, (deg/s)/deg = 1/s. */
  attitude_per_s: quantity(0, 50, '1/s'),
  maxAngle_deg: quantity(1, 80, 'deg'),
});

export const gainsSchema = z.strictObject(
  {
    format: formatTag(GAINS_FORMAT),
    name: title().optional(),
    note: z.string({ error: 'a text' }).max(2000, { error: 'at most 2000 characters' }).optional(),
    loop_Hz: quantity(50, 8000, 'Hz'),
    computeDelay_s: quantity(0, 0.05, 's').default(0),
    axes: z.strictObject(
      { roll: axisGains, pitch: axisGains, yaw: axisGains },
      { error: 'an object with roll, pitch, yaw' },
    ),
    derivativeOn: choice(['error', 'measurement']).default('measurement'),
    derivativeLowPass_Hz: quantity(0, 20_000, 'Hz (0 = none)').default(0),
    derivativeLowPassKind: choice(['first-order', 'biquad']).optional(),
    gyroLowPass_Hz: quantity(0, 20_000, 'Hz (0 = none)').default(0),
    gyroLowPassKind: choice(['first-order', 'biquad']).optional(),
    notches: z
      .array(notch, { error: 'a list of notches' })
      .max(8, { error: 'at most 8 notches' })
      .default([]),
    integralLimit_us: quantity(0, 2000, 'µs').default(150),
    outputLimit_us: quantity(0, 2000, 'µs').default(400),
    antiWindup: choice(['clamping', 'back-calculation', 'none']).optional(),
    /** Below this share of the throttle the integrators are held at zero. */
    integratorReset_throttle: quantity(0, 0.5, '').optional(),
    desaturation: choice(['attitude-first', 'keep-collective']).optional(),
    maxRate_dps: z
      .strictObject(
        {
          roll: positive(4000, 'deg/s'),
          pitch: positive(4000, 'deg/s'),
          yaw: positive(4000, 'deg/s'),
        },
        { error: 'an object with roll, pitch, yaw' },
      )
      .default({ roll: 220, pitch: 220, yaw: 120 }),
    levelling: levelling.optional(),
  },
  { error: 'a gains object' },
);

export type Gains = z.output<typeof gainsSchema>;
export type AxisGains = Gains['axes']['roll'];
export const AXES = ['roll', 'pitch', 'yaw'] as const;
export type AxisName = (typeof AXES)[number];

/**
 * Validates a gains object.
 * @throws InputError naming path, value and what is allowed.
 */
export function parseGains(raw: unknown, file = 'gains'): Gains {
  const gains = parseWith(gainsSchema, raw, file);
  const nyquist_Hz = gains.loop_Hz / 2;
  gains.notches.forEach((one, index) => {
    if (one.centre_Hz >= nyquist_Hz) {
      throw refuse(
        file,
        `notches[${index}].centre_Hz`,
        one.centre_Hz,
        `below half the loop rate, ${nyquist_Hz} Hz (a sampled filter cannot act above it)`,
      );
    }
  });
  refuseBiquadAboveNyquist(
    file,
    'derivativeLowPass_Hz',
    gains.derivativeLowPass_Hz,
    gains.derivativeLowPassKind,
    nyquist_Hz,
  );
  refuseBiquadAboveNyquist(file, 'gyroLowPass_Hz', gains.gyroLowPass_Hz, gains.gyroLowPassKind, nyquist_Hz);
  return gains;
}

function refuseBiquadAboveNyquist(
  file: string,
  path: string,
  cutoff_Hz: number,
  kind: 'first-order' | 'biquad' | undefined,
  nyquist_Hz: number,
): void {
  if (kind === 'biquad' && cutoff_Hz >= nyquist_Hz) {
    throw refuse(
      file,
      path,
      cutoff_Hz,
      `below half the loop rate, ${nyquist_Hz} Hz, for a biquad (0 = none)`,
    );
  }
}
