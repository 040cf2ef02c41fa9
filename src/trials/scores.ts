/** Scores that several trials share: name, unit, band and how the value is found. */
import { isElectric } from '../craft/build.ts';
import type { AxisName } from '../craft/gains.ts';
import {
  motorActivity_us,
  peakDrift_m,
  peakHeightError_m,
  peakTilt_deg,
  power_W,
  rateError_dps,
  saturation_pct,
  stepScores,
  timeToTouch_s,
  windingHeat_W,
} from './measures.ts';
import { COMMON, type Band, type ScoreDefinition, type TrialRun, type Window } from './trial.ts';

function score(
  name: string,
  unit: string,
  band: Band,
  of: (run: TrialRun) => number | null,
  source = COMMON,
): ScoreDefinition {
  return { name, unit, band, source, of };
}

const most = (value: number): Band => ({ most: value });

/** Largest tilt from level. */
export const peakTilt = (deg: number) =>
  score('peak tilt', 'deg', most(deg), ({ record, rows }) => peakTilt_deg(record, ...rows));

/** Largest distance in the plane from where the scored time began. */
export const peakDrift = (m: number) =>
  score('peak drift', 'm', most(m), ({ record, rows }) => peakDrift_m(record, ...rows));

export const heightError = (m: number) =>
  score('height error', 'm', most(m), ({ record, rows }) => peakHeightError_m(record, ...rows));

export const rmsRateError = (dps: number) =>
  score('rms rate error', 'deg/s', most(dps), ({ record, rows }) => rateError_dps(record, ...rows));

export const motorActivity = (us: number) =>
  score('motor activity', 'µs rms', most(us), ({ record, rows }) => motorActivity_us(record, ...rows));

/** Share of ticks in which any command stood at a limit. */
export const saturation = (pct: number) =>
  score('saturation', '%', most(pct), ({ record, rows }) => saturation_pct(record, ...rows));

/** Winding heat over that of the same flight without gyro noise and vibration. */
export const heatOverQuiet = (pct: number) =>
  score('heat over noise-free', '%', most(pct), (run) => {
    if (!isElectric(run.build.motor)) return null;
    const quiet = run.quiet();
    const least = windingHeat_W(quiet.record, ...quiet.rows);
    return least > 0 ? 100 * (windingHeat_W(run.record, ...run.rows) / least - 1) : null;
  });

/** Mean winding heat of one motor. */
export const windingHeat = (band: Band) =>
  score('winding heat', 'W', band, (run) =>
    isElectric(run.build.motor) ? windingHeat_W(run.record, ...run.rows) : null,
  );

export const energyPerMinute = (band: Band) =>
  score('energy per minute', 'kJ/min', band, ({ record, rows }) => power_W(record, ...rows) * 0.06);

/** Nominal cell voltage over a discharge, V; common practice. */
const NOMINAL_CELL_V = 3.7;

/** Energy per minute as a share of the pack's. */
export const packPerMinute = (pct: number) =>
  score('pack per minute', '%/min', most(pct), ({ record, rows, build }) => {
    const pack_J = build.battery.cells * NOMINAL_CELL_V * build.battery.capacity_Ah * 3600;
    return (100 * 60 * power_W(record, ...rows)) / pack_J;
  });

/** Time until anything solid was touched; the whole scored time when nothing was. */
export const timeToTouch = (least_s: number) =>
  score('time to touch ground', 's', { least: least_s }, ({ record, rows }) =>
    timeToTouch_s(record, ...rows),
  );

/** Rms rate error once the disturbance is over. */
export const leftOver = (dps: number, from_s: (run: TrialRun) => Window) =>
  score('left over', 'deg/s', most(dps), (run) => {
    const t = run.record.column('t_s');
    const [from, to] = from_s(run);
    const first = t.findIndex((time) => time >= from);
    const end = t.findIndex((time) => time > to);
    return first === -1 ? NaN : rateError_dps(run.record, first, end === -1 ? t.length : end);
  });

/** Rise, overshoot, settling and steady error of a rate step, in the shares of its own size. */
export function stepScoreSet(
  axis: AxisName,
  stepOf: (run: TrialRun) => { readonly start_s: number; readonly end_s: number; readonly size_dps: number },
  bands: {
    readonly rise_s: number;
    readonly overshoot_pct: number;
    readonly settle_s: number;
    readonly steady_pct: number;
  },
): ScoreDefinition[] {
  const metrics = (run: TrialRun) => {
    const { start_s, end_s, size_dps } = stepOf(run);
    return stepScores(
      run.record.column('t_s'),
      run.record.column(`rate_${axis}_dps`),
      start_s,
      end_s,
      size_dps,
    );
  };
  return [
    score('rise', 's', most(bands.rise_s), (run) => metrics(run).rise_s),
    score('overshoot', '%', most(bands.overshoot_pct), (run) => metrics(run).overshoot_pct),
    score('settling', 's', most(bands.settle_s), (run) => metrics(run).settle_s),
    score('steady error', '%', most(bands.steady_pct), (run) => metrics(run).steadyError_pct),
  ];
}
