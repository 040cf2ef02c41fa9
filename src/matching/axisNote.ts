/** What is said of a fitted axis: what it stands on, and in which conditions the model fails. */
import type { Build } from '../craft/build.ts';
import type { AxisFit } from './axisFitter.ts';
import { motorCommands_us } from './axisCommand.ts';
import type { FlightLog } from './log.ts';
import type { ReducedEstimates } from './reducedEstimates.ts';
import type { LeftOut } from './usable.ts';
import { errorWhere, HORIZON_S, type Residual, type Validation } from './validation.ts';

/** Errors this much larger in one condition than elsewhere are worth a sentence. */
const WORSE_BY = 1.4;
const LEAST_SHARE = 0.02;
/** Descent through the own wash begins about here, m/s; common practice, no source. */
const DESCENT_MPS = 1;
const NEAR_LIMIT_US = 25;

/** The reasons of what was left out, the longest first. */
export function reasonsOf(leftOut: readonly LeftOut[]): string {
  const seconds = new Map<string, number>();
  for (const { from_s, to_s, reason } of leftOut) {
    seconds.set(reason, (seconds.get(reason) ?? 0) + to_s - from_s);
  }
  const sorted = [...seconds].sort((a, b) => b[1] - a[1]);
  if (sorted.length === 0) return 'it is no longer than that';
  return sorted.map(([reason, total]) => `${reason} ${total.toFixed(1)} s`).join(', ');
}

export function describeFit(
  context: { readonly log: FlightLog; readonly build: Build },
  fit: AxisFit,
  estimates: ReducedEstimates,
  validation: Validation | null,
  residual: Residual,
  fitted_s: number,
): string {
  const sentences = [
    `Fitted on ${fitted_s.toFixed(0)} s.`,
    validation === null
      ? 'Too little was left to check it on.'
      : `Checked on ${validation.seconds.toFixed(0)} s held back, simulated ${HORIZON_S} s at a time.`,
    ...formSentences(fit, estimates),
    ...failureSentences(context, residual),
  ];
  if (!fit.converged) sentences.push('The search did not settle; take the numbers with care.');
  if (fit.whiteness > 2) {
    sentences.push('What is left over is not white noise: the stated intervals were widened by half.');
  }
  return sentences.join(' ');
}

function formSentences(fit: AxisFit, estimates: ReducedEstimates): string[] {
  const sentences: string[] = [];
  if (fit.lead_s !== undefined) {
    sentences.push(
      `The log shows a lead of ${(1000 * fit.lead_s.value).toFixed(0)} ms on a steady gain of ${fit.gain_dps2_per_us.value.toPrecision(3)} deg/s² per µs and a motor lag of ${(1000 * fit.lag_s.value).toFixed(0)} ms: the rotors’ own reaction when they speed up.`,
    );
  }
  if (fit.damping_per_s !== undefined) {
    sentences.push(`The log shows a damping of ${fit.damping_per_s.value.toPrecision(2)} per second.`);
  }
  if (fit.lead_s !== undefined || fit.damping_per_s !== undefined) {
    sentences.push(
      `Gain, lag and delay tell it from 2 to 25 Hz within ${estimates.error_dB.toFixed(1)} dB and ${estimates.error_deg.toFixed(0)} degrees.`,
    );
  }
  if (estimates.delayBelowZero_s !== null) {
    sentences.push(
      `The fit found a delay of ${(1000 * estimates.delayBelowZero_s).toFixed(2)} ms; 0 stands in its place.`,
    );
  }
  return sentences;
}

function failureSentences(
  context: { readonly log: FlightLog; readonly build: Build },
  residual: Residual,
): string[] {
  const { log, build } = context;
  const sentences: string[] = [];
  for (const order of ['once per turn', 'blade pass'] as const) {
    const line = residual.lines.find((one) => one.order === order);
    if (line === undefined) continue;
    sentences.push(
      `Vibration of ${line.amplitude_dps.toPrecision(2)} deg/s at ${line.f_Hz.toFixed(0)} Hz, ${order} of the rotors.`,
    );
  }
  const unknown = residual.lines.find((one) => one.order === null);
  if (unknown !== undefined) {
    sentences.push(
      `A line of ${unknown.amplitude_dps.toPrecision(2)} deg/s at ${unknown.f_Hz.toFixed(0)} Hz is left over.`,
    );
  }
  const { descent_mps } = log;
  if (descent_mps !== undefined) {
    const wash = errorWhere(residual, (t) => descent_mps[rowAt(log, t)] > DESCENT_MPS);
    if (wash.share > LEAST_SHARE && wash.inside > WORSE_BY * wash.outside) {
      sentences.push(
        `In descent above ${DESCENT_MPS} m/s the model is ${(wash.inside / wash.outside).toFixed(1)} times worse: the rotors sink into their own wash.`,
      );
    }
  }
  const motors = motorCommands_us(log);
  if (motors !== null) {
    const low = build.esc.idle_us + NEAR_LIMIT_US;
    const high = build.esc.max_us - NEAR_LIMIT_US;
    const near = errorWhere(residual, (t) => {
      const row = rowAt(log, t);
      return motors.some((motor) => motor[row] < low || motor[row] > high);
    });
    if (near.share > LEAST_SHARE && near.inside > WORSE_BY * near.outside) {
      sentences.push(
        `Near the motors’ limits the model is ${(near.inside / near.outside).toFixed(1)} times worse.`,
      );
    }
  }
  return sentences;
}

/** Row whose time is nearest below `t_s`. */
function rowAt(log: FlightLog, t_s: number): number {
  let low = 0;
  let high = log.t_s.length - 1;
  while (low < high) {
    const middle = (low + high + 1) >> 1;
    if (log.t_s[middle] <= t_s + 1e-9) low = middle;
    else high = middle - 1;
  }
  return low;
}
