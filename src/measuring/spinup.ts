/**
 * Motor spin-up recording to first-order lags: steps in command (or in speed, without a command column), and
 * for each speed = y₀ + Δ (1 − e^(−(t − t₀)/τ)), fitted in the least-squares sense (Levenberg–Marquardt),
 * sigma from the Jacobian, widened where neighbouring residuals agree (first-order autocorrelation).
 */
import { inverse, Matrix } from 'ml-matrix';
import { median } from 'simple-statistics';
import { refuse } from '../craft/problem.ts';
import { columnInSI, proposeMapping, type ColumnMapping, type Table } from './columns.ts';
import { quantified, stepSigma, type Estimate, type Quantified } from './estimate.ts';
import { extent, robustScale } from './regression.ts';
import { timeBase, type TimeBase } from './sampling.ts';
import { joinEstimates } from './swing.ts';

const RPM = 30 / Math.PI;
/** A change of command by this share of its range is a step. */
const COMMAND_STEP = 0.08;
/** A change of speed below this share of the top speed is no step: without a command, and with one. */
const SPEED_STEP = 0.04;
const COMMANDED_STEP = 0.01;
/** Fitted span after the onset, in lags. */
const SPAN_LAGS = 8;
const LEAST_POINTS = 6;
const ITERATIONS = 60;

export interface SpinupStep {
  readonly direction: 'up' | 'down';
  /** Where the command changed, or where the speed began to, s. */
  readonly time_s: number;
  readonly from_rpm: number;
  readonly to_rpm: number;
  readonly lag: Estimate;
  /** Command to first movement; null without a command column. */
  readonly delay: Estimate | null;
  /** Rms of the residual, and that over the step. */
  readonly residual_rpm: number;
  readonly residual_pct: number;
  readonly points: number;
  /** The fit for plotting: onset and levels, rad/s. */
  readonly fit: { readonly onset_s: number; readonly start_radps: number; readonly change_radps: number };
}

interface SpinupSampling {
  readonly rate_Hz: number;
  readonly jitter_s: number;
  readonly lost: number;
  readonly rows: number;
}

export interface SpinupResult {
  readonly measurement: 'spinup';
  readonly quantities: Partial<
    Record<'lag_s' | 'lagDown_s' | 'delay_s' | 'topSpeed_rpm' | 'speedNoise_rpm', Quantified>
  >;
  /** As the build file's lagged motor takes it. */
  readonly motor: { readonly lag_s?: number; readonly lagDown_s?: number; readonly maxSpeed_rpm: number };
  readonly steps: readonly SpinupStep[];
  readonly sampling: SpinupSampling;
  readonly notes: readonly string[];
}

export interface SpinupOptions {
  readonly mapping?: ColumnMapping;
  readonly poles?: number;
}

/**
 * @throws InputError for missing columns, falling time, a speed that never steps.
 */
export function analyseSpinup(table: Table, options: SpinupOptions = {}): SpinupResult {
  const mapping: ColumnMapping = { ...proposeMapping(table), ...options.mapping };
  const base = timeBase(table, mapping.time);
  const notes = [...table.notes, ...base.notes];
  const speed = speedOf(table, mapping, options.poles);
  const command = commandOf(table, mapping);
  const noise = noiseOf(speed);
  const top = extent(speed)[1];
  const byCommand = command === null ? [] : commandEdges(base.time_s, command);
  const least = Math.max((byCommand.length > 0 ? COMMANDED_STEP : SPEED_STEP) * top, 8 * noise);
  const spread = extent(speed);
  if (!(spread[1] - spread[0] > least)) {
    throw refuse(
      table.file,
      `column ${mapping.speed?.column ?? 'speed'}`,
      `a speed that stays within ${((spread[1] - spread[0]) * RPM).toFixed(0)} rev/min`,
      'a recording in which the speed steps up or down and settles',
    );
  }
  const edges = byCommand.length > 0 ? byCommand : speedEdges(base, speed, noise, least);
  if (command !== null && byCommand.length === 0)
    notes.push('The command makes no steps; they were looked for in the speed.');
  const steps = edges.flatMap((edge, i): SpinupStep[] => {
    const until = edges[i + 1] ?? base.time_s[base.time_s.length - 1] + base.interval_s;
    const step = fitStep(base, speed, edge, until, byCommand.length > 0, least);
    return step === null ? [] : [step];
  });
  if (steps.length === 0) {
    throw refuse(
      table.file,
      `column ${mapping.speed?.column ?? 'speed'}`,
      'no step that settles',
      'steps held until the speed has settled, at least five lags',
    );
  }
  notes.push(...stepNotes(steps, base, byCommand.length > 0));
  const sampling = { rate_Hz: base.rate_Hz, jitter_s: base.jitter_s, lost: base.lost, rows: table.rows };
  return resultOf(steps, sampling, RPM * noise, notes);
}

function speedOf(table: Table, mapping: ColumnMapping, poles: number | undefined): Float64Array {
  const key = mapping.speed === undefined ? 'electricalSpeed' : 'speed';
  const choice = mapping[key];
  if (choice === undefined) {
    throw refuse(
      table.file,
      'speed',
      undefined,
      `a column of rotor speed such as "rpm" (found ${table.heads.join(', ')})`,
    );
  }
  if (key === 'electricalSpeed' && poles === undefined) {
    throw refuse(
      table.file,
      `column ${choice.column}`,
      'no number of poles',
      'the number of magnet poles of the motor',
    );
  }
  const speed = columnInSI(table, key, choice);
  for (let i = 0; i < speed.length; i++) {
    if (Number.isNaN(speed[i]))
      throw refuse(table.file, `row ${i + 1}, ${choice.column}`, undefined, 'a number');
    speed[i] = Math.abs(speed[i]) / (key === 'electricalSpeed' ? (poles ?? 2) / 2 : 1);
    if (speed[i] > 20_944)
      throw refuse(table.file, `row ${i + 1}, ${choice.column}`, speed[i] * RPM, 'up to 200000 rev/min');
  }
  return speed;
}

/** Any unit will do: only where it changes counts. */
function commandOf(table: Table, mapping: ColumnMapping): Float64Array | null {
  const choice = mapping.command;
  if (choice === undefined) return null;
  const values = columnInSI(table, 'command', { ...choice, unit: choice.unit ?? '1' });
  return values.some((value) => Number.isNaN(value)) ? null : values;
}

/** Standard deviation of the noise, from second differences, which a slow motion leaves near zero. */
function noiseOf(speed: Float64Array): number {
  const second: number[] = [];
  const stride = Math.max(1, Math.floor(speed.length / 50_000));
  for (let i = 1; i + 1 < speed.length; i += stride) second.push(speed[i + 1] - 2 * speed[i] + speed[i - 1]);
  return robustScale(second) / Math.sqrt(6);
}

function commandEdges(time: Float64Array, command: Float64Array): number[] {
  const [low, high] = extent(command);
  const edges: number[] = [];
  let last = -Infinity;
  for (let i = 1; i < command.length; i++) {
    if (!(Math.abs(command[i] - command[i - 1]) > COMMAND_STEP * (high - low))) continue;
    // A step written over two or three samples is one step.
    if (i - last > 3) edges.push(time[i]);
    last = i;
  }
  return edges;
}

/**
 * Without a command: the speed leaves a steady level where the means of the windows before and after part by
 * more than noise, and a later level differs enough. Onsets are refined by the fit.
 */
function speedEdges(base: TimeBase, speed: Float64Array, noise: number, least: number): number[] {
  const window = Math.max(4, Math.round(0.02 / base.interval_s));
  const edges: number[] = [];
  const sums = new Float64Array(speed.length + 1);
  for (let i = 0; i < speed.length; i++) sums[i + 1] = sums[i] + speed[i];
  const mean = (from: number, to: number) => (sums[to] - sums[from]) / (to - from);
  const calm = Math.max(6 * noise * Math.sqrt(2 / window), 0.1 * least);
  let i = window;
  while (i + window <= speed.length) {
    const change = mean(i, i + window) - mean(i - window, i);
    if (Math.abs(change) <= calm) {
      i++;
      continue;
    }
    const sign = Math.sign(change);
    let j = i;
    // Ride along as long as the speed goes on in the same direction.
    while (j + window < speed.length && sign * (mean(j, j + window) - mean(j - window, j)) > calm) j++;
    const before = mean(Math.max(0, i - window), i);
    const after = mean(j, Math.min(speed.length, j + window));
    if (Math.abs(after - before) > least) edges.push(base.time_s[i]);
    i = j + 1;
  }
  return edges;
}

interface Window {
  readonly t: Float64Array;
  readonly y: Float64Array;
}

function fitStep(
  base: TimeBase,
  speed: Float64Array,
  edge: number,
  until: number,
  fromCommand: boolean,
  least: number,
): SpinupStep | null {
  const { time_s, interval_s } = base;
  const from = lowerIndex(time_s, edge - Math.max(10 * interval_s, 0.05));
  let to = lowerIndex(time_s, until - 0.5 * interval_s);
  if (to - from < LEAST_POINTS + 4) return null;
  let fitted: StepFit | null = null;
  // Twice: the second time over the span that the first one's lag calls for.
  for (let pass = 0; pass < 2; pass++) {
    const window = { t: time_s.subarray(from, to), y: speed.subarray(from, to) };
    fitted = fitWindow(window, edge);
    if (fitted === null) return null;
    const span = lowerIndex(time_s, fitted.onset + SPAN_LAGS * fitted.lag);
    if (span >= to || span - from < LEAST_POINTS + 4) break;
    to = span;
  }
  if (fitted === null || Math.abs(fitted.change) < least) return null;
  const settled = time_s[to - 1] - fitted.onset;
  if (settled < 2 * fitted.lag) return null;
  // A step shorter than a tenth of the sampling interval cannot be told from an instant one.
  if (!(fitted.lag > 0.1 * interval_s) || !Number.isFinite(fitted.lagSigma)) return null;
  const delay = fromCommand ? { value: fitted.onset - edge, sigma: fitted.onsetSigma, unit: 's' } : null;
  return {
    direction: fitted.change > 0 ? 'up' : 'down',
    time_s: fromCommand ? edge : fitted.onset,
    from_rpm: RPM * fitted.start,
    to_rpm: RPM * (fitted.start + fitted.change),
    lag: { value: fitted.lag, sigma: fitted.lagSigma, unit: 's' },
    delay,
    residual_rpm: RPM * fitted.rms,
    residual_pct: (100 * fitted.rms) / Math.abs(fitted.change),
    points: to - from,
    fit: { onset_s: fitted.onset, start_radps: fitted.start, change_radps: fitted.change },
  };
}

/** First index with time ≥ value. */
function lowerIndex(time: Float64Array, value: number): number {
  let low = 0;
  let high = time.length;
  while (low < high) {
    const middle = (low + high) >> 1;
    if (time[middle] < value) low = middle + 1;
    else high = middle;
  }
  return low;
}

interface StepFit {
  readonly start: number;
  readonly change: number;
  readonly lag: number;
  readonly onset: number;
  readonly lagSigma: number;
  readonly onsetSigma: number;
  readonly rms: number;
}

function fitWindow(window: Window, edge: number): StepFit | null {
  const { t, y } = window;
  const n = t.length;
  const before = Array.from(y.slice(0, Math.max(1, lowerIndex(t, edge))));
  const start = median(before);
  const end = median(Array.from(y.slice(Math.max(0, n - Math.max(3, Math.floor(n / 5))))));
  const change = end - start;
  if (change === 0) return null;
  const crossing = (share: number) => {
    const i = y.findIndex((value, k) => t[k] >= edge && (value - start) / change >= share);
    return t[i === -1 ? n - 1 : i];
  };
  const interval = (t[n - 1] - t[0]) / (n - 1);
  const t20 = crossing(0.2);
  const t63 = crossing(0.632);
  // From 20 to 63 % a first-order rise takes 0.777 lags; it began 0.223 lags before 20 %.
  const lag = Math.max((t63 - t20) / 0.777, 0.3 * interval);
  let best: { p: number[]; cost: number } | null = null;
  for (const shift of [0, -1, 1, 3]) {
    const guess = [start, change, lag, t20 - 0.223 * lag + shift * interval];
    const found = levenberg(window, guess);
    if (found !== null && (best === null || found.cost < best.cost)) best = found;
  }
  return best === null ? null : withSigmas(window, best.p, best.cost);
}

function model(p: readonly number[], t: number): number {
  return t <= p[3] ? p[0] : p[0] + p[1] * (1 - Math.exp(-(t - p[3]) / p[2]));
}

function costOf(window: Window, p: readonly number[]): number {
  let sum = 0;
  for (let i = 0; i < window.t.length; i++) sum += (window.y[i] - model(p, window.t[i])) ** 2;
  return sum;
}

/** JᵀJ and Jᵀr of the model in (start, change, lag, onset). */
function normalEquations(window: Window, p: readonly number[]): { jj: Matrix; jr: Float64Array } {
  const jj = new Matrix(4, 4);
  const jr = new Float64Array(4);
  const row = new Float64Array(4);
  for (let i = 0; i < window.t.length; i++) {
    const t = window.t[i];
    row[0] = 1;
    row[1] = row[2] = row[3] = 0;
    if (t > p[3]) {
      const u = (t - p[3]) / p[2];
      const e = Math.exp(-u);
      row[1] = 1 - e;
      row[2] = (-p[1] * e * u) / p[2];
      row[3] = (-p[1] * e) / p[2];
    }
    const residual = window.y[i] - model(p, t);
    for (let a = 0; a < 4; a++) {
      jr[a] += row[a] * residual;
      for (let b = 0; b < 4; b++) jj.set(a, b, jj.get(a, b) + row[a] * row[b]);
    }
  }
  return { jj, jr };
}

function levenberg(window: Window, guess: readonly number[]): { p: number[]; cost: number } | null {
  let p = guess.slice();
  let cost = costOf(window, p);
  let damping = 1e-3;
  for (let k = 0; k < ITERATIONS && damping < 1e12; k++) {
    const { jj, jr } = normalEquations(window, p);
    for (let a = 0; a < 4; a++) jj.set(a, a, jj.get(a, a) * (1 + damping) + 1e-300);
    const move = inverse(jj, true)
      .mmul(Matrix.columnVector(Array.from(jr)))
      .to1DArray();
    const next = p.map((value, a) => value + move[a]);
    const nextCost = next[2] > 0 ? costOf(window, next) : Infinity;
    if (nextCost < cost) {
      const small = cost - nextCost < 1e-12 * cost;
      p = next;
      cost = nextCost;
      damping = Math.max(damping / 5, 1e-9);
      if (small) break;
    } else {
      damping *= 6;
    }
  }
  return p.every(Number.isFinite) && p[2] > 0 ? { p, cost } : null;
}

function withSigmas(window: Window, p: readonly number[], cost: number): StepFit | null {
  const { jj } = normalEquations(window, p);
  const n = window.t.length;
  const [start, change, lag, onset] = p;
  // Time, level: scaled so that the inverse is well conditioned.
  const size = [1, 1, Math.abs(change) / lag, Math.abs(change) / lag];
  const scaled = Matrix.zeros(4, 4);
  for (let a = 0; a < 4; a++)
    for (let b = 0; b < 4; b++) scaled.set(a, b, jj.get(a, b) / (size[a] * size[b]));
  const covariance = inverse(scaled, true);
  const variance = Math.max(cost / Math.max(1, n - 4), smallestStep(window.y) ** 2 / 12);
  const alike = autocorrelation(window, p);
  const widen = Math.sqrt((variance * (1 + alike)) / (1 - alike));
  const sigma = (a: number) => (widen * Math.sqrt(Math.max(0, covariance.get(a, a)))) / size[a];
  return { start, change, lag, onset, lagSigma: sigma(2), onsetSigma: sigma(3), rms: Math.sqrt(cost / n) };
}

/** Lag-one autocorrelation of the residuals, from 0 to 0.95. */
function autocorrelation(window: Window, p: readonly number[]): number {
  let product = 0;
  let square = 0;
  let last = window.y[0] - model(p, window.t[0]);
  square += last * last;
  for (let i = 1; i < window.t.length; i++) {
    const residual = window.y[i] - model(p, window.t[i]);
    product += residual * last;
    square += residual * residual;
    last = residual;
  }
  // Chance alone gives up to 2/√n.
  const value = square > 0 ? product / square - 2 / Math.sqrt(window.t.length) : 0;
  return Math.min(0.95, Math.max(0, value));
}

function smallestStep(values: Float64Array): number {
  let least = Infinity;
  for (let i = 1; i < values.length; i++) {
    const step = Math.abs(values[i] - values[i - 1]);
    if (step > 1e-9 && step < least) least = step;
  }
  return least === Infinity ? 0 : least;
}

function stepNotes(steps: readonly SpinupStep[], base: TimeBase, fromCommand: boolean): string[] {
  const notes: string[] = [];
  if (!fromCommand) notes.push('No command column: the delay from command to movement cannot be told.');
  const shortest = Math.min(...steps.map((step) => step.lag.value));
  if (base.interval_s > shortest / 3) {
    notes.push(
      `Sampled every ${(1000 * base.interval_s).toFixed(1)} ms for a lag of ${(1000 * shortest).toFixed(1)} ms: record faster.`,
    );
  }
  const odd = steps.filter((step) => step.residual_pct > 4);
  if (odd.length > 0) {
    notes.push(
      `${odd.length} of ${steps.length} steps leave more than 4 % of the step: the motor is not first order there (current limit, desynchronised ESC, or a speed filter in the recording).`,
    );
  }
  const early = steps.filter((step) => step.delay !== null && step.delay.value < -2 * step.delay.sigma);
  if (early.length > 0)
    notes.push(
      `In ${early.length} steps the speed moves before the command: the two columns are not on one clock.`,
    );
  for (const direction of ['up', 'down'] as const) {
    if (!steps.some((step) => step.direction === direction)) notes.push(`No step ${direction} was found.`);
  }
  return notes;
}

/** Joins recordings of the same motor: the steps of all of them. */
export function joinSpinup(results: readonly SpinupResult[]): SpinupResult {
  if (results.length === 1) return results[0];
  const noise = Math.max(...results.map((one) => one.quantities.speedNoise_rpm?.value ?? 0));
  const slowest = results.reduce((least, one) =>
    one.sampling.rate_Hz < least.sampling.rate_Hz ? one : least,
  );
  return resultOf(
    results.flatMap((one) => one.steps),
    slowest.sampling,
    noise,
    [...new Set(results.flatMap((one) => one.notes))],
  );
}

function resultOf(
  steps: readonly SpinupStep[],
  sampling: SpinupSampling,
  noise_rpm: number,
  notes: string[],
): SpinupResult {
  const quantities: Partial<Record<keyof SpinupResult['quantities'], Quantified>> = {};
  for (const [key, direction] of [
    ['lag_s', 'up'],
    ['lagDown_s', 'down'],
  ] as const) {
    const own = steps.filter((step) => step.direction === direction);
    if (own.length === 0) continue;
    const joined = joinEstimates(own.map((step) => step.lag));
    if (joined.disagreement > 3) {
      notes.push(
        `The lags of the ${own.length} steps ${direction} differ by more than their noise: the lag depends on speed; the mean stands for all, sigma is widened.`,
      );
    }
    quantities[key] = quantified(joined, lagSentence(joined, direction));
  }
  const delays = steps.map((step) => step.delay).filter((delay) => delay !== null);
  if (delays.length > 0) {
    const parts = joinEstimates(delays);
    // When inside the interval the command changed is the same doubt in every step; it does not average out.
    const joined = { ...parts, sigma: Math.hypot(parts.sigma, stepSigma(1 / sampling.rate_Hz)) };
    quantities.delay_s = quantified(
      joined,
      `ESC, wire and speed reading together; ±${(1960 * joined.sigma).toFixed(1)} ms (95 %) is ±${(1.96 * 360 * joined.sigma * 5).toFixed(1)}° of phase at a 5 Hz crossover.`,
    );
  }
  const levels = steps.flatMap((step) => [step.from_rpm, step.to_rpm]);
  const highest = Math.max(...levels);
  const highestStep = steps.find((step) => step.to_rpm === highest || step.from_rpm === highest);
  const levelSigma = (highestStep?.residual_rpm ?? 0) / Math.sqrt(highestStep?.points ?? 1);
  quantities.topSpeed_rpm = quantified(
    { value: highest, sigma: levelSigma, unit: 'rev/min' },
    'The highest steady speed of this recording; it is the motor’s top speed only if the step went to full command on a full pack.',
  );
  quantities.speedNoise_rpm = quantified(
    { value: noise_rpm, sigma: noise_rpm / Math.sqrt(2 * sampling.rows), unit: 'rev/min' },
    'Noise of the speed reading; it limits the lag, not the craft.',
  );
  return {
    measurement: 'spinup',
    quantities,
    motor: {
      ...(quantities.lag_s === undefined ? {} : { lag_s: quantities.lag_s.value }),
      ...(quantities.lagDown_s === undefined ? {} : { lagDown_s: quantities.lagDown_s.value }),
      maxSpeed_rpm: highest,
    },
    steps,
    sampling,
    notes,
  };
}

/** A lag τ at the frequency 1/τ turns the phase by 45°; there dφ = δτ/(2τ). */
function lagSentence(lag: Estimate, direction: 'up' | 'down'): string {
  const doubt = (1.96 * lag.sigma) / lag.value;
  const phase = (doubt / 2) * (180 / Math.PI);
  return (
    `${direction === 'up' ? 'Speeding up' : 'Slowing down'} with a lag of ${(1000 * lag.value).toFixed(1)} ms, known to ±${(100 * doubt).toFixed(1)} % (95 %): ` +
    `at ${(1 / (2 * Math.PI * lag.value)).toFixed(1)} Hz, where it takes 45° of phase, the phase margin is uncertain by ±${phase.toFixed(1)}°; ` +
    'the derivative gain has to make up for this lag.'
  );
}
