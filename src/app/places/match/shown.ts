/** From a match to what the page shows of it. */
import type { Build } from '../../../craft/build.ts';
import { AXES, parseGains, type AxisName, type Gains } from '../../../craft/gains.ts';
import { correctedBuild } from '../../../matching/correctedBuild.ts';
import { plantOf } from '../../../matching/fitAxis.ts';
import type { FlightLog } from '../../../matching/log.ts';
import type { MatchResult } from '../../../matching/matchLog.ts';
import { responseOf, type ResponseAt } from '../../../matching/reducedPlant.ts';
import { axisModels, responseAt, type AxisModel } from '../../../shaping/axisModel.ts';
import type { PlotSpan } from '../../plots/LinePlot.tsx';
import type { ShownAxis, ShownMatch } from './messages.ts';
import { matchTexts as words } from './texts.ts';

/** Points of the overview: twice as many, the least and the largest of each. */
const OVERVIEW_BUCKETS = 1200;
const RESPONSE_LOW_HZ = 0.3;
const RESPONSE_HIGH_HZ = 60;
/** As far past the last trusted frequency is shown. */
const BEYOND = 1.3;
const CURVE_POINTS = 160;
/** Spans shorter than this are not to be seen in the overview, as a share of the log. */
const LEAST_SPAN_SHARE = 0.0005;
const REPLAY_S = 20;

export function shownMatch(log: FlightLog, build: Build, result: MatchResult): ShownMatch {
  const corrected = correctedBuild(build, result, log.name);
  const models = axisModels(build);
  const { t_s } = log;
  return {
    rows: t_s.length,
    seconds: t_s[t_s.length - 1] - t_s[0],
    rate_Hz: 1 / result.timeBase.period_s,
    jitter_s: result.timeBase.jitter_s,
    lostRows: result.timeBase.lostRows,
    axes: Object.fromEntries(
      AXES.map((axis) => [axis, shownAxis(axis, log, result, models[axis])]),
    ) as unknown as ShownMatch['axes'],
    offers: result.offers,
    remarks: result.remarks,
    corrected: corrected.build,
    changes: corrected.changes,
    kept: corrected.kept,
    flownGains: flownGains(log),
    hasSetpoints: AXES.some((axis) => log.setpoint_dps[axis] !== undefined),
    replayFrom_s: liveliestFrom_s(log),
  };
}

function shownAxis(axis: AxisName, log: FlightLog, result: MatchResult, model: AxisModel): ShownAxis {
  const one = result.axes[axis];
  const { estimates, fit, validation, residual } = one;
  const { gain_dps2_per_us, lag_s, delay_s } = model.plant;
  return {
    estimates:
      estimates === null
        ? null
        : {
            gain_dps2_per_us: estimates.gain_dps2_per_us,
            lag_s: estimates.lag_s,
            delay_s: estimates.delay_s,
          },
    model: { gain_dps2_per_us, lag_s, delay_s: delay_s + result.computeDelay_s },
    fit_pct: one.fit_pct,
    usable_s: one.usable_s,
    note: one.note,
    overview: overview(axis, log, result),
    check:
      validation === null
        ? null
        : {
            t_s: validation.t_s,
            measured_dps: validation.measured_dps,
            simulated_dps: validation.simulated_dps,
            residual_dps: validation.measured_dps.map((y, i) => y - validation.simulated_dps[i]),
          },
    response: shownResponse(one.response, fit === null ? null : responseOf(plantOf(fit)), (omega) => {
      const { re, im } = responseAt(model.measured, omega);
      const turn = -omega * result.computeDelay_s;
      const [c, s] = [Math.cos(turn), Math.sin(turn)];
      return { re: re * c - im * s, im: re * s + im * c };
    }),
    left:
      residual === null
        ? null
        : {
            f_Hz: residual.f_Hz.slice(1),
            density: residual.density.slice(1).map(Math.sqrt),
            lines: residual.lines.map(({ f_Hz, order }) => ({
              f_Hz,
              label: order === null ? words.unknownLine : words.orders[order],
            })),
          },
  };
}

// --- Overview -----------------------------------------------------------------------------------------------

function overview(axis: AxisName, log: FlightLog, result: MatchResult): ShownAxis['overview'] {
  const rate = log.gyro_dps[axis];
  if (rate === undefined) return null;
  const rows = extremeRows(rate);
  const setpoint = log.setpoint_dps[axis];
  const take = (column: ArrayLike<number>) => Float64Array.from(rows, (row) => column[row]);
  return {
    t_s: take(log.t_s),
    rate_dps: take(rate),
    setpoint_dps: setpoint === undefined ? null : take(setpoint),
    spans: spansOf(axis, log, result),
  };
}

/** Rows of the least and the largest value of each bucket, rising. */
function extremeRows(values: ArrayLike<number>): number[] {
  const n = values.length;
  if (n <= 2 * OVERVIEW_BUCKETS) return Array.from({ length: n }, (_, i) => i);
  const rows: number[] = [];
  for (let b = 0; b < OVERVIEW_BUCKETS; b++) {
    const end = Math.floor(((b + 1) * n) / OVERVIEW_BUCKETS);
    let least = Math.floor((b * n) / OVERVIEW_BUCKETS);
    let largest = least;
    for (let i = least + 1; i < end; i++) {
      if (values[i] < values[least]) least = i;
      if (values[i] > values[largest]) largest = i;
    }
    rows.push(Math.min(least, largest));
    if (least !== largest) rows.push(Math.max(least, largest));
  }
  return rows;
}

/** Pieces used are what is left when all that was left out is taken away. */
function spansOf(axis: AxisName, log: FlightLog, result: MatchResult): PlotSpan[] {
  const { t_s } = log;
  const [first, last] = [t_s[0], t_s[t_s.length - 1]];
  const least_s = LEAST_SPAN_SHARE * (last - first);
  const one = result.axes[axis];
  const out = [...result.leftOut, ...one.leftOut].sort((a, b) => a.from_s - b.from_s);
  const limits = out
    .filter(({ reason, from_s, to_s }) => reason === 'motors at their limits' && to_s - from_s > least_s)
    .map(({ from_s, to_s }): PlotSpan => ({ from: from_s, to: to_s, kind: 'saturated' }));
  if (one.usable_s === 0) return limits;
  const used: PlotSpan[] = [];
  let at = first;
  for (const { from_s, to_s } of [...out, { from_s: last, to_s: last }]) {
    if (from_s - at > least_s) used.push({ from: at, to: from_s, kind: 'used' });
    at = Math.max(at, to_s);
  }
  return [...limits, ...used];
}

// --- Frequency response -------------------------------------------------------------------------------------

function shownResponse(
  response: MatchResult['axes'][AxisName]['response'],
  fitted: ResponseAt | null,
  build: ResponseAt,
): ShownAxis['response'] {
  if (response === null) return null;
  const trusted = response.f_Hz.filter((f, k) => response.trusted[k] === 1 && f <= RESPONSE_HIGH_HZ);
  const top_Hz =
    trusted.length > 0 ? Math.min(RESPONSE_HIGH_HZ, BEYOND * trusted[trusted.length - 1]) : RESPONSE_HIGH_HZ;
  const shown = [...response.f_Hz.keys()].filter(
    (k) => response.f_Hz[k] >= RESPONSE_LOW_HZ && response.f_Hz[k] <= top_Hz,
  );
  if (shown.length < 2) return null;
  const f_Hz = Float64Array.from(shown, (k) => response.f_Hz[k]);
  const [low, high] = [f_Hz[0], f_Hz[f_Hz.length - 1]];
  const grid = Float64Array.from(
    { length: CURVE_POINTS },
    (_, i) => low * (high / low) ** (i / (CURVE_POINTS - 1)),
  );
  const along = (of: ResponseAt) => curve(grid, (i) => of(2 * Math.PI * grid[i]));
  return {
    measured: curve(f_Hz, (i) => ({ re: response.re[shown[i]], im: response.im[shown[i]] })),
    coherence: Float64Array.from(shown, (k) => response.coherence[k]),
    fitted: fitted === null ? null : along(fitted),
    build: along(build),
  };
}

/** Phase is carried on from point to point, beginning near the −90° of an integrator. */
function curve(f_Hz: Float64Array, at: (i: number) => { re: number; im: number }) {
  const gain_dB = new Float64Array(f_Hz.length);
  const phase_deg = new Float64Array(f_Hz.length);
  let before = -90;
  for (let i = 0; i < f_Hz.length; i++) {
    const { re, im } = at(i);
    gain_dB[i] = 20 * Math.log10(Math.max(1e-12, Math.hypot(re, im)));
    const raw = (Math.atan2(im, re) * 180) / Math.PI;
    phase_deg[i] = raw + 360 * Math.round((before - raw) / 360);
    before = phase_deg[i];
  }
  return { f_Hz, gain_dB, phase_deg };
}

// --- Replay -------------------------------------------------------------------------------------------------

function flownGains(log: FlightLog): Gains | null {
  if (log.gainsJson === undefined) return null;
  try {
    return parseGains(JSON.parse(log.gainsJson), log.name);
  } catch {
    return null;
  }
}

/** Where the 20 s begin in which the setpoints of all axes move most; the log's start without setpoints. */
function liveliestFrom_s(log: FlightLog): number {
  const { t_s } = log;
  const seconds = Math.max(1, Math.ceil(t_s[t_s.length - 1]));
  const moved = new Float64Array(seconds);
  for (const axis of AXES) {
    const setpoint = log.setpoint_dps[axis];
    if (setpoint === undefined) continue;
    for (let i = 1; i < t_s.length; i++) {
      moved[Math.min(seconds - 1, Math.floor(t_s[i]))] += Math.abs(setpoint[i] - setpoint[i - 1]);
    }
  }
  let best = 0;
  let most = 0;
  let now = 0;
  for (let s = 0; s < seconds; s++) {
    now += moved[s] - (s >= REPLAY_S ? moved[s - REPLAY_S] : 0);
    if (s + 1 >= Math.min(seconds, REPLAY_S) && now > most * 1.001) {
      most = now;
      best = Math.max(0, s + 1 - REPLAY_S);
    }
  }
  return best;
}
