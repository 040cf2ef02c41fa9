/** What the parts of Prove have in common. */
import { createContext } from 'preact';
import { useContext, useEffect, useState } from 'preact/hooks';
import { runTasks, type TaskAnswer } from '../../../trials/pool.ts';
import type { TrialTask } from '../../../trials/runTrial.ts';
import type { Traces } from '../../../trials/trial.ts';
import type { Wind } from '../../../craft/wind.ts';
import { webWorker } from './browserPool.ts';
import type { Kept, RunOf } from './kept.ts';
import type { ProveRuns } from './runs.ts';

export interface ProveDesk {
  readonly runs: ProveRuns;
  readonly kept: Kept;
  /** What a run begun now would be of. */
  readonly now: RunOf;
  /** Changes what is kept with the craft; can be undone. */
  readonly keep: (change: Partial<Kept>, label: string) => void;
}

export const DeskContext = createContext<ProveDesk | null>(null);

export function useDesk(): ProveDesk {
  const desk = useContext(DeskContext);
  if (desk === null) throw new Error('no DeskContext around this component');
  return desk;
}

export const three = (value: number | null | undefined): string =>
  value === null || value === undefined || !Number.isFinite(value)
    ? '—'
    : String(Number(value.toPrecision(3))).replace('-', '−');

export type TracesState =
  { readonly kind: 'waiting' } | { readonly kind: 'failed'; readonly why: string } | TracesReady;
interface TracesReady {
  readonly kind: 'ready';
  readonly traces: readonly Traces[];
}

/** Flies the tasks in a worker of its own for their traces; again when they change. */
export function useTraces(tasks: readonly TrialTask[]): TracesState {
  const [state, setState] = useState<TracesState>({ kind: 'waiting' });
  const key = JSON.stringify(tasks);
  useEffect(() => {
    if (tasks.length === 0) return;
    setState({ kind: 'waiting' });
    const found: Traces[] = [];
    let why = '';
    const run = runTasks(webWorker, 1, {
      count: tasks.length,
      taskAt: (index) => ({ ...tasks[index], traces: true }),
      hear: (index, answer) => {
        if (answer.kind === 'done' && answer.result.traces !== undefined) found[index] = answer.result.traces;
        else why = failureText(answer);
      },
    });
    void run.done.then(({ end }) => {
      if (end === 'cancelled') return;
      setState(
        found.filter((one) => one !== undefined).length === tasks.length
          ? { kind: 'ready', traces: found }
          : { kind: 'failed', why },
      );
    });
    return () => run.cancel();
  }, [key]);
  return state;
}

/** Why there is no result; the note of a trial that says nothing about this build. */
export function failureText(answer: TaskAnswer): string {
  if (answer.kind === 'failed') return answer.reason;
  if (answer.kind === 'done') return answer.result.note ?? '';
  const problem = answer.problems[0];
  return problem === undefined
    ? answer.file
    : `${problem.path}: ${String(problem.value)}; allowed: ${problem.allowed}`;
}

/** A wind worth taking along: one that is there all the time, not a single gust at a moment of the trial. */
export function lasting(wind: Wind): boolean {
  return wind.mean_mps > 0 || wind.turbulence.model !== 'none';
}

/** The unit that the last named part of a path bears, for a person. */
export function unitOfPath(path: string): string {
  const keys = path.split('.').reverse();
  for (const key of keys) {
    const suffix = /^[A-Za-z0-9]+?_(.+?)(\[\d+\])?$/.exec(key)?.[1];
    if (suffix !== undefined) return UNITS[suffix] ?? '';
  }
  return '';
}

/** The path without its file and its unit. */
export function nameOfPath(path: string): string {
  return path
    .replace(/^[a-z]+\./, '')
    .replace(
      /_(us_per_dps2|us_per_dps|us_per_deg|kgm2|kg|Hz|mps|dps|deg|us|ohm|rpm_per_V|s|m|V)(?=$|[.[])/g,
      '',
    );
}

/** The unit of a signal, by the end of its name. */
export function unitOfSignal(name: string): string {
  return UNITS[name.split('_').at(-1) ?? ''] ?? '';
}

const UNITS: Readonly<Record<string, string>> = {
  us_per_dps2: 'µs/(deg/s²)',
  us_per_dps: 'µs/(deg/s)',
  us_per_deg: 'µs/deg',
  rpm_per_V: 'rpm/V',
  dps_per_rtHz: 'deg/s/√Hz',
  kgm2: 'kg·m²',
  kg: 'kg',
  Hz: 'Hz',
  mps: 'm/s',
  dps: 'deg/s',
  deg: 'deg',
  us: 'µs',
  ohm: 'Ω',
  rpm: 'rpm',
  Ah: 'A·h',
  s: 's',
  m: 'm',
  m2: 'm²',
  V: 'V',
  A: 'A',
  W: 'W',
};
