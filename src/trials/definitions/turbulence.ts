/** MIL-F-8785C turbulence of a stated level, moored; a scale below 1 is for small craft and says so. */
import { heightError, peakDrift, peakTilt, rmsRateError, saturation, timeToTouch } from '../scores.ts';
import { defineTrial, type Trial } from '../trial.ts';
import { TURBULENCE_KNOTS, turbulenceWind, type TurbulenceLevel } from '../winds.ts';
import { MOORED_SIGNALS, moor } from './moored.ts';

const DURATION_S = 12;
/** The mooring needs this long to lean into the mean wind, which is there from the start. */
const SETTLE_S = 4;
const HARDNESS: Readonly<
  Record<TurbulenceLevel, { tilt: number; drift: number; height: number; rate: number }>
> = {
  light: { tilt: 15, drift: 1.5, height: 0.5, rate: 6 },
  moderate: { tilt: 28, drift: 4, height: 1, rate: 10 },
  severe: { tilt: 40, drift: 10, height: 1.5, rate: 20 },
};

export function turbulence(level: TurbulenceLevel, scale = 1): Trial {
  const { tilt, drift, height, rate } = HARDNESS[level];
  const knots = TURBULENCE_KNOTS[level];
  const scaled = scale !== 1;
  return defineTrial({
    name: scaled ? `turbulence-${level}-scaled` : `turbulence-${level}`,
    title: scaled ? `Turbulence, ${level}, scaled × ${scale} for small craft` : `Turbulence, ${level}`,
    purpose: scaled
      ? `MIL-F-8785C ${level} turbulence with its wind at 20 ft of ${knots} kn taken × ${scale}: the standard was written for crewed aircraft.`
      : `MIL-F-8785C ${level} turbulence, wind at 20 ft ${knots} kn.`,
    parameters: {
      scale: {
        value: scale,
        least: 0,
        most: 2,
        meaning: 'factor on the wind at 20 ft; 1 is the standard’s own',
      },
      meanShare: { value: 0.5, least: 0, most: 1, meaning: 'mean wind as a share of the wind at 20 ft' },
    },
    scores: [
      peakTilt(tilt),
      peakDrift(drift),
      heightError(height),
      rmsRateError(rate),
      saturation(5),
      timeToTouch(DURATION_S - 0.05),
    ],
    traceSignals: MOORED_SIGNALS,
    duration_s: () => DURATION_S,
    start: () => ({ kind: 'hover', height_m: 8 }),
    wind: (p) => turbulenceWind(level, p.scale, p.meanShare),
    scored: () => [SETTLE_S, DURATION_S],
    sticks: moor,
  });
}
