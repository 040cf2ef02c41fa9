/**
 * What looks wrong with a log's units or signs, from the log's own consistency and from the build's plant.
 * Nothing is changed: each finding is an offer the user may take.
 */
import type { AxisName } from '../craft/gains.ts';
import { AXES } from '../craft/gains.ts';
import { DEG_PER_RAD } from '../math/angles.ts';
import type { PlantParameters } from './axisData.ts';
import type { FlightLog } from './log.ts';
import { responseOf } from './reducedPlant.ts';
import { pairIndex, type CrossSpectra, type MeasuredResponse } from './spectra.ts';
import { trustedBins } from './startValues.ts';

export interface Offer {
  readonly signals: readonly string[];
  readonly unit?: 'rad/s' | 'deg/s';
  readonly sign?: -1;
  /** A sentence. */
  readonly because: string;
}

/** A ratio within this factor of 57.3 or its inverse is taken as a unit mistaken. */
const SPREAD = 2.4;

function mistaken(ratio: number): 'rad/s' | 'deg/s' | null {
  if (ratio > 1 / (DEG_PER_RAD * SPREAD) && ratio < SPREAD / DEG_PER_RAD) return 'rad/s';
  if (ratio > DEG_PER_RAD / SPREAD && ratio < DEG_PER_RAD * SPREAD) return 'deg/s';
  return null;
}

/**
 * Looks at one axis.
 * @param response measured, may hold few trusted bins
 * @param spectra of [setpoint, command, rate] or [command, rate]
 */
export function suspectAxis(
  axis: AxisName,
  response: MeasuredResponse,
  spectra: CrossSpectra,
  model: PlantParameters,
): Offer[] {
  const bins = trustedBins(response);
  if (bins.length < 5) return [];
  const at = responseOf({ ...model, damping_per_s: 0 });
  let logs = 0;
  for (const k of bins) {
    const wanted = at(2 * Math.PI * response.f_Hz[k]);
    const size = Math.hypot(response.re[k], response.im[k]);
    const wantedSize = Math.hypot(wanted.re, wanted.im);
    logs += Math.log(size / wantedSize) / bins.length;
  }
  const gyroUnit = mistaken(Math.exp(logs));
  const followed = setpointRatio(spectra, bins);
  const setpointUnit = followed === null ? null : mistaken(followed);
  const offers: Offer[] = [];
  if (gyroUnit !== null) {
    const both = setpointUnit === null && followed !== null;
    offers.push({
      signals: both ? [`gyro_${axis}`, `sp_${axis}`] : [`gyro_${axis}`],
      unit: gyroUnit,
      because: `${axis}: the rate answers the command ${times(Math.exp(logs))} as strongly as the build says; that is the factor between rad/s and deg/s. Read gyro_${axis}${both ? ` and sp_${axis}` : ''} as ${gyroUnit}?`,
    });
  } else if (setpointUnit !== null && followed !== null) {
    const unit = setpointUnit === 'rad/s' ? 'deg/s' : 'rad/s';
    offers.push({
      signals: [`sp_${axis}`],
      unit,
      because: `${axis}: the rate follows ${times(followed)} of the setpoint; that is the factor between rad/s and deg/s. Read sp_${axis} as ${unit}?`,
    });
  }
  return offers;
}

function times(ratio: number): string {
  const plain = (value: number) => String(Number(value.toPrecision(2)));
  return ratio < 1 ? `1/${plain(1 / ratio)}` : `${plain(ratio)} times`;
}

/** A fit that found the rate going against the command. */
export function turnedSign(axis: AxisName): Offer {
  return {
    signals: [`gyro_${axis}`],
    sign: -1,
    because: `${axis}: the rate goes against the command. Turn the sign of gyro_${axis}, or of the command, or are motors at other corners than the columns say?`,
  };
}

/** Rate over setpoint at the lowest trusted bins, where a loop follows; null without a setpoint. */
function setpointRatio(s: CrossSpectra, bins: readonly number[]): number | null {
  if (s.count !== 3) return null;
  const pair = pairIndex(0, 2, 3);
  const low = bins.slice(0, Math.max(3, Math.floor(bins.length / 3)));
  const logs = low.map((k) => Math.log(Math.hypot(s.crossRe[pair][k], s.crossIm[pair][k]) / s.auto[0][k]));
  return Math.exp(logs.reduce((sum, value) => sum + value, 0) / logs.length);
}

/** Rates against attitude columns, where the log has both: the integral of one is the change of the other. */
export function suspectAttitude(log: FlightLog): Offer[] {
  return AXES.flatMap((axis): Offer[] => {
    const gyro = log.gyro_dps[axis];
    const angle = log.angle_deg[axis];
    if (gyro === undefined || angle === undefined) return [];
    const { t_s } = log;
    const hop = Math.max(1, Math.round(0.2 / ((t_s[t_s.length - 1] - t_s[0]) / t_s.length)));
    let top = 0;
    let below = 0;
    let other = 0;
    for (let k = hop; k < t_s.length; k += hop) {
      let turned = 0;
      for (let j = k - hop + 1; j <= k; j++) turned += gyro[j] * (t_s[j] - t_s[j - 1]);
      const change = angle[k] - angle[k - hop];
      // Wrapped angles and steep attitudes say nothing.
      if (Math.abs(change) > 90) continue;
      top += turned * change;
      below += change * change;
      other += turned * turned;
    }
    const ratio = below > 0 ? top / below : 0;
    const agreement = below > 0 && other > 0 ? Math.abs(top) / Math.sqrt(below * other) : 0;
    const unit = agreement > 0.8 ? mistaken(Math.abs(ratio)) : null;
    if (unit === null) return [];
    return [
      {
        signals: [`gyro_${axis}`],
        unit,
        because: `${axis}: the rate, added up, turns ${times(Math.abs(ratio))} as far as the angle column. Read gyro_${axis} as ${unit}?`,
      },
    ];
  });
}
