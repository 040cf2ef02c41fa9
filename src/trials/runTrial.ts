/** Flies one trial and scores it. The same trial, build, gains and seed give the same result, anywhere. */
import type { Build } from '../craft/build.ts';
import type { Gains } from '../craft/gains.ts';
import { InputError, refuse } from '../craft/problem.ts';
import type { Wind } from '../craft/wind.ts';
import { Flight } from '../flight/flight.ts';
import { NEUTRAL_STICKS, type Sticks } from '../flight/pilot.ts';
import { Recorder } from '../flight/record.ts';
import { TRIAL_SIGNALS } from './measures.ts';
import { trialByName } from './registry.ts';
import type { Band, Score, Trial, TrialResult, TrialRun } from './trial.ts';

export interface TrialTask {
  readonly trial: string;
  readonly build: Build;
  readonly gains: Gains;
  readonly seed: number;
  /** Wind in place of the trial's own. */
  readonly wind?: Wind;
  /** Bands in place of the trial's own: "peak tilt" → band. */
  readonly bands?: Readonly<Record<string, Band>>;
}

/**
 * Runs a trial.
 * @throws InputError for an unknown trial or a craft that cannot hover.
 */
export function runTrial(task: TrialTask): TrialResult {
  const trial = trialByName(task.trial);
  const run = flyTrial(trial, task);
  const values = run.flight.stopped === null ? trial.score(run) : trial.scores.map(() => NaN);
  const scores = trial.scores.map((definition, i): Score => {
    const band = task.bands?.[definition.name] ?? definition.band;
    const value = Number.isFinite(values[i]) ? values[i] : null;
    return { ...definition, value, band, pass: within(value, band) };
  });
  return {
    trial: trial.name,
    title: trial.title,
    seed: task.seed,
    scores,
    pass: scores.every((score) => score.pass),
    stopped: run.flight.stopped === null ? null : `${run.flight.stopped.reason}: ${run.flight.stopped.what}`,
  };
}

/** A score that was never reached is outside every band. */
function within(value: number | null, band: Band): boolean {
  return (
    value !== null &&
    (band.least === undefined || value >= band.least) &&
    (band.most === undefined || value <= band.most)
  );
}

/** The flight of a trial with its record: for plots and for flying it again. */
export function flyTrial(
  trial: Trial,
  task: Pick<TrialTask, 'build' | 'gains' | 'seed' | 'wind'>,
  signals: readonly string[] = TRIAL_SIGNALS,
): TrialRun {
  const { gains, seed } = task;
  const setup = trial.setup({ build: task.build, gains, wind: task.wind ?? null });
  const flight = newFlight(task.build, { ...setup, gains, seed, start: trial.start });
  const ticks = Math.round(trial.duration_s * gains.loop_Hz);
  const record = new Recorder(signals, ticks);
  const sticks: Sticks = { ...NEUTRAL_STICKS, armed: true };
  for (let k = 0; k < ticks && flight.stopped === null; k++) {
    setup.act?.(flight.time_s, flight);
    setup.sticks(flight.time_s, flight, sticks);
    flight.tick(sticks);
    record.take(flight.signals);
  }
  return { record, flight, gains, build: setup.build };
}

function newFlight(build: Build, setup: ConstructorParameters<typeof Flight>[0]): Flight {
  try {
    return new Flight(setup);
  } catch (error) {
    if (error instanceof RangeError && !(error instanceof InputError)) {
      throw refuse(build.name, 'propeller', error.message, 'a craft that can hover in this trial');
    }
    throw error;
  }
}
