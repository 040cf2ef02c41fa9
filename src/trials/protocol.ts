/** What goes between the pool and its workers, the same over node's threads and the browser's workers. */
import { InputError, type Problem } from '../craft/problem.ts';
import { runTrial, type TrialTask } from './runTrial.ts';
import type { TrialResult } from './trial.ts';

export interface TaskMessage {
  readonly id: number;
  readonly task: TrialTask;
}

export type TaskAnswer =
  | { readonly id: number; readonly kind: 'done'; readonly result: TrialResult }
  /** The task cannot be flown: its values are not allowed. */
  | {
      readonly id: number;
      readonly kind: 'refused';
      readonly file: string;
      readonly problems: readonly Problem[];
    }
  /** The program failed at it, or the worker died of it twice. */
  | { readonly id: number; readonly kind: 'failed'; readonly reason: string };

/** A worker's end of the line to the pool. */
export interface TrialPort {
  post(answer: TaskAnswer): void;
  listen(hear: (message: TaskMessage) => void): void;
}

/** The body of a worker: answers every task that comes. */
export function serveTrials(port: TrialPort): void {
  port.listen((message) => port.post(answerTask(message)));
}

export function answerTask({ id, task }: TaskMessage): TaskAnswer {
  try {
    return { id, kind: 'done', result: runTrial(task) };
  } catch (error) {
    if (error instanceof InputError)
      return { id, kind: 'refused', file: error.file, problems: error.problems };
    return { id, kind: 'failed', reason: error instanceof Error ? error.message : String(error) };
  }
}
