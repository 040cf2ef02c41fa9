/** The wind in a few words, for the top line. */
import type { Wind } from '../../craft/wind.ts';
import type { UnitSystem } from '../store/document.ts';
import { withUnit } from '../store/units.ts';
import type { Texts } from '../texts/en.ts';

/** Below this mean a person would say "calm". */
const CALM_BELOW_MPS = 0.3;

/**
 * "calm", "7 m/s", "7 m/s, gusty": mean wind, then turbulence by the wind at 20 ft of MIL-F-8785C (light 15 kn,
 * moderate 30 kn) with its scale, then single gusts.
 */
export function windInWords(wind: Wind, units: UnitSystem, words: Texts['wind']): string {
  const parts = [wind.mean_mps < CALM_BELOW_MPS ? words.calm : withUnit(wind.mean_mps, 'm/s', units, 2)];
  const { model, windAt20ft_mps, scale = 1 } = wind.turbulence;
  const level_mps = model === 'none' ? 0 : windAt20ft_mps * scale;
  if (level_mps >= 15.4) parts.push(words.rough);
  else if (level_mps >= 5) parts.push(words.gusty);
  else if (level_mps > 0) parts.push(words.light);
  if (wind.gusts.length > 0) parts.push(words.gusts(wind.gusts.length));
  return parts.join(', ');
}
