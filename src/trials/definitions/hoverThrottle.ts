/** Throttle stick that hovers: where trials without height hold leave the collective. */
import type { Flight } from '../../flight/flight.ts';

export function hoverThrottle(flight: Flight): number {
  const { escIdle_us, escMax_us } = flight.craft;
  let sum = 0;
  for (let i = 0; i < 4; i++) sum += flight.trim.command_us[i] / 4;
  return (sum - escIdle_us) / (escMax_us - escIdle_us);
}
