/**
 * Many trials over several workers, in any order. A worker is anything that answers a task; node's and the
 * browser's are made elsewhere. A worker that dies loses only the task it had; that task is given out again
 * once, and told as failed if it dies there too.
 */
import { InputError, type Problem } from '../craft/problem.ts';
import { runTrial, type TrialTask } from './runTrial.ts';
import type { TrialResult } from './trial.ts';

export type TaskAnswer =
  | { readonly id: number; readonly kind: 'done'; readonly result: TrialResult }
  | {
      readonly id: number;
      readonly kind: 'refused';
      readonly file: string;
      readonly problems: readonly Problem[];
    }
  | { readonly id: number; readonly kind: 'failed'; readonly reason: string };

export interface TaskMessage {
  readonly id: number;
  readonly task: TrialTask;
}

/** What a worker does with a message. */
export function answerTask({ id, task }: TaskMessage): TaskAnswer {
  try {
    return { id, kind: 'done', result: runTrial(task) };
  } catch (error) {
    if (error instanceof InputError)
      return { id, kind: 'refused', file: error.file, problems: error.problems };
    return { id, kind: 'failed', reason: error instanceof Error ? error.message : String(error) };
  }
}

export interface TrialWorker {
  send(message: TaskMessage): void;
  onAnswer(hear: (answer: TaskAnswer) => void): void;
  /** Told when the worker died. */
  onDeath(hear: (reason: string) => void): void;
  end(): void;
}

export interface PoolRun {
  readonly done: Promise<void>;
  /** Stops after the tasks that are under way; what is finished stays. */
  cancel(): void;
  pause(): void;
  resume(): void;
}

/**
 * Runs `count` tasks. `taskAt` may throw InputError: that task is told as refused and the rest goes on.
 * @param hear told each answer once, in the order of finishing
 */
export function runPool(
  workers: readonly TrialWorker[],
  count: number,
  taskAt: (index: number) => TrialTask,
  hear: (index: number, answer: TaskAnswer) => void,
): PoolRun {
  let next = 0;
  let finished = 0;
  let stopped = false;
  let paused = false;
  const again: number[] = [];
  const tries = new Map<number, number>();
  const underWay = new Map<TrialWorker, number>();
  const dead = new Set<TrialWorker>();
  let settle: () => void = () => undefined;
  const done = new Promise<void>((resolve) => {
    settle = resolve;
  });
  const check = (): void => {
    const idle = underWay.size === 0;
    if (finished >= count || (stopped && idle) || (dead.size === workers.length && idle)) settle();
  };
  const tell = (index: number, answer: TaskAnswer): void => {
    finished++;
    hear(index, answer);
  };
  const give = (worker: TrialWorker): void => {
    while (!stopped && !paused && !dead.has(worker) && !underWay.has(worker)) {
      const index = again.pop() ?? (next < count ? next++ : -1);
      if (index === -1) break;
      let task: TrialTask;
      try {
        task = taskAt(index);
      } catch (error) {
        if (!(error instanceof InputError)) throw error;
        tell(index, { id: index, kind: 'refused', file: error.file, problems: error.problems });
        continue;
      }
      underWay.set(worker, index);
      worker.send({ id: index, task });
    }
    check();
  };
  for (const worker of workers) {
    worker.onAnswer((answer) => {
      underWay.delete(worker);
      tell(answer.id, answer);
      give(worker);
    });
    worker.onDeath((reason) => {
      dead.add(worker);
      const index = underWay.get(worker);
      underWay.delete(worker);
      if (index !== undefined) {
        const tried = (tries.get(index) ?? 0) + 1;
        tries.set(index, tried);
        if (tried < 2 && dead.size < workers.length) again.push(index);
        else tell(index, { id: index, kind: 'failed', reason: `the worker died: ${reason}` });
      }
      for (const other of workers) if (!dead.has(other)) give(other);
      check();
    });
  }
  queueMicrotask(() => workers.forEach(give));
  return {
    done,
    cancel: () => {
      stopped = true;
      check();
    },
    pause: () => {
      paused = true;
    },
    resume: () => {
      paused = false;
      workers.forEach(give);
    },
  };
}

/** A worker that is none: runs in place, one task a turn of the event loop. For one core and for tests. */
export function inPlaceWorker(): TrialWorker {
  let hear: (answer: TaskAnswer) => void = () => undefined;
  return {
    send: (message) => void setTimeout(() => hear(answerTask(message)), 0),
    onAnswer: (listener) => {
      hear = listener;
    },
    onDeath: () => undefined,
    end: () => undefined,
  };
}
