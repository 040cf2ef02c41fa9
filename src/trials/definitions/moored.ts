/** Held by the bench's mooring: what trials about the craft rather than the hands have in common. */
import { AXES } from '../../craft/gains.ts';
import type { Sticks } from '../../flight/pilot.ts';
import { heightError, peakDrift, peakTilt, saturation, timeToTouch } from '../scores.ts';
import type { ScoreDefinition } from '../trial.ts';

export const MOORED_SIGNALS: readonly string[] = [
  ...AXES.map((axis) => `rate_${axis}_dps`),
  'north_m',
  'east_m',
  'down_m',
  'wind_n_mps',
  'wind_e_mps',
];

export function moor(_time_s: number, sticks: Sticks): void {
  sticks.moored = true;
}

/** Scores of a flight that must hold where it is for `duration_s`. */
export function heldScores(tilt_deg: number, drift_m: number, duration_s: number): ScoreDefinition[] {
  return [
    peakTilt(tilt_deg),
    peakDrift(drift_m),
    heightError(0.8),
    saturation(10),
    // A tick's grace: the last row is taken one tick before the end.
    timeToTouch(duration_s - 0.05),
  ];
}
