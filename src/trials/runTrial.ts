/** Flies one trial and scores it. The same trial, build, gains, overrides and seed give the same bytes, anywhere. */
import type { Build } from '../craft/build.ts';
import { InputError, refuse } from '../craft/problem.ts';
import { Flight, type FlightSetup } from '../flight/flight.ts';
import { NEUTRAL_STICKS, type Sticks } from '../flight/pilot.ts';
import { Recorder } from '../flight/record.ts';
import { checkBands, type Bands } from './bands.ts';
import { rowsBetween, TRIAL_SIGNALS } from './measures.ts';
import { resolve, type Overrides, type Resolved, type Subject } from './overrides.ts';
import { trialByName } from './registry.ts';
import type { Band, Score, ScoreDefinition, Traces, Trial, TrialResult, TrialRun } from './trial.ts';

export interface TrialOptions extends Subject {
  readonly seed: number;
  /** Numbers of build, gains, wind and the trial's parameters in place of what stands there. */
  readonly overrides?: Overrides;
  readonly bands?: Bands;
  /** Brings the trial's signals along with the result, for plots. */
  readonly traces?: boolean;
}

/** A trial by name, as it goes to a worker. */
export interface TrialTask extends TrialOptions {
  readonly trial: string;
}

/**
 * Flies and scores.
 * @throws InputError for an unknown trial, overrides that cannot be, a band of no score, or a craft that cannot hover.
 */
export function runTrial(options: TrialTask): TrialResult {
  const { seed, bands = {} } = options;
  const trial = trialByName(options.trial);
  checkBands(trial, bands);
  const resolved = resolve(trial, options, options.overrides);
  const about = {
    trial: trial.name,
    title: trial.title,
    seed,
    parameters: resolved.parameters,
    traceSignals: trial.traceSignals,
  };
  const note = trial.inapplicable?.(resolved.build) ?? null;
  if (note !== null) {
    const scores = trial.scores.map((one) => scoreOf(one, null, bands));
    return { ...about, scores, pass: true, stopped: null, note };
  }
  const signals = options.traces === true ? withTraced(trial) : TRIAL_SIGNALS;
  const run = flyResolved(trial, resolved, seed, signals, 1);
  const { stopped } = run.flight;
  const scores = trial.scores.map((one) => scoreOf(one, stopped === null ? one.of(run) : NaN, bands));
  return {
    ...about,
    scores,
    pass: scores.every((score) => score.pass),
    stopped: stopped === null ? null : `${stopped.reason} at ${stopped.time_s.toFixed(2)} s: ${stopped.what}`,
    note,
    ...(options.traces === true ? { traces: tracesOf(run, trial.traceSignals) } : {}),
  };
}

function withTraced(trial: Trial): readonly string[] {
  return [...new Set([...TRIAL_SIGNALS, ...trial.traceSignals])];
}

/** Rows of a plot at most. */
const MOST_TRACE_ROWS = 600;

/** Time and signals at equal steps of ticks, few enough for a plot. */
function tracesOf({ record }: TrialRun, signals: readonly string[]): Traces {
  const stride = Math.max(1, Math.ceil(record.length / MOST_TRACE_ROWS));
  const thinned = (name: string): number[] => {
    const column = record.column(name);
    return Array.from({ length: Math.ceil(column.length / stride) }, (_, i) => column[i * stride]);
  };
  return {
    t_s: thinned('t_s'),
    signals: signals.map((name) => ({ name, values: thinned(name) })),
  };
}

/**
 * The same flight judged by other bands: its values stay, what passes may change.
 * @param bands in place of the trial's own; a score without one has the trial's own again
 */
export function judgedBy(result: TrialResult, bands: Bands): TrialResult {
  const definitions = trialByName(result.trial).scores;
  const scores = result.scores.map((score): Score => {
    const definition = definitions.find((one) => one.name === score.name);
    if (definition === undefined) return score;
    const raw = score.applies ? (score.value ?? NaN) : null;
    return scoreOf(definition, raw, bands);
  });
  return { ...result, scores, pass: scores.every((score) => score.pass) };
}

/** The flight of a trial with its record: for plots and for flying it again. @throws InputError as runTrial */
export function flyTrial(
  trial: Trial,
  options: TrialOptions,
  signals: readonly string[] = TRIAL_SIGNALS,
): TrialRun {
  return flyResolved(trial, resolve(trial, options, options.overrides), options.seed, signals, 1);
}

function scoreOf(definition: ScoreDefinition, raw: number | null, bands: Bands): Score {
  const { name, unit, source } = definition;
  const own = bands[name];
  const band = own ?? definition.band;
  const value = raw !== null && Number.isFinite(raw) ? raw : null;
  const from = own === undefined ? source : 'set by the user';
  return {
    name,
    unit,
    value,
    applies: raw !== null,
    band,
    source: from,
    pass: raw === null || within(value, band),
  };
}

/** A value that was never reached is outside every band. */
function within(value: number | null, band: Band): boolean {
  return value !== null && value >= (band.least ?? -Infinity) && value <= (band.most ?? Infinity);
}

function flyResolved(
  trial: Trial,
  resolved: Resolved,
  seed: number,
  signals: readonly string[],
  noise: number,
): TrialRun {
  const { gains, wind, parameters: p } = resolved;
  const build = trial.build?.(resolved.build, p) ?? resolved.build;
  const faults = trial.faults?.(build, gains, p) ?? [];
  const { scene } = trial;
  const setup: FlightSetup = {
    build,
    gains,
    wind,
    seed,
    faults,
    start: trial.start(p),
    ...(scene === undefined ? {} : { scene }),
  };
  const flight = newFlight(build, setup);
  if (noise !== 1) flight.setNoise(noise, noise);
  const duration_s = trial.duration_s(p);
  const ticks = Math.round(duration_s * gains.loop_Hz);
  const record = new Recorder(signals, ticks);
  const sticks: Sticks = { ...NEUTRAL_STICKS, armed: true };
  for (let k = 0; k < ticks && flight.stopped === null; k++) {
    trial.sticks(flight.time_s, sticks, flight, p);
    flight.tick(sticks);
    record.take(flight.signals);
  }
  const rows = rowsBetween(record, ...(trial.scored?.(p) ?? [0, duration_s]));
  let twin: TrialRun | null = null;
  const quiet = (): TrialRun => (twin ??= flyResolved(trial, resolved, seed, signals, 0));
  return { record, flight, build, gains, wind, parameters: p, rows, quiet };
}

/** A craft that finds no trim in this trial is bad input, not a crash. */
function newFlight(build: Build, setup: FlightSetup): Flight {
  try {
    return new Flight(setup);
  } catch (error) {
    if (!(error instanceof RangeError) || error instanceof InputError) throw error;
    throw refuse(build.name, 'propeller', error.message, 'a craft that can hover in this trial');
  }
}
