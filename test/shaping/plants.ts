/** Loops for tests: gains with the same numbers on each axis, and plants. */
import { parseGains, type Gains } from '../../src/craft/gains.ts';
import { plantSystem, type Plant } from '../../src/shaping/continuous.ts';
import { rateLoop, type RateLoop } from '../../src/shaping/rateLoop.ts';

export function gainsOf(loop_Hz: number, p: number, i: number, d: number, more: object = {}): Gains {
  const axis = { p_us_per_dps: p, i_us_per_deg: i, d_us_per_dps2: d, feedforward_us_per_dps: 0 };
  return parseGains({
    format: 'gustbench.gains/1',
    loop_Hz,
    axes: { roll: axis, pitch: axis, yaw: axis },
    ...more,
  });
}

export const plantOf = (gain_dps2_per_us: number, lag_s: number, delay_s: number): Plant => ({
  gain_dps2_per_us,
  lag_s,
  delay_s,
});

export const loopOf = (plant: Plant, gains: Gains): RateLoop => rateLoop(plantSystem(plant), gains, 'roll');
