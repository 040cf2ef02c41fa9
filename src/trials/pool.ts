/**
 * Many trials over several workers, in any order of finishing. What a worker is, is made elsewhere: a thread of
 * node, a worker of the browser, or none. One that dies loses only the task it had: another takes its place and
 * the task is given out once more; a task that kills twice is told as failed and the rest goes on. One that
 * gives no answer for `PATIENCE_S` hangs: it is ended, and that counts as its death.
 */
import { InputError } from '../craft/problem.ts';
import { answerTask, type TaskAnswer, type TaskMessage } from './protocol.ts';
import type { TrialTask } from './runTrial.ts';

export type { TaskAnswer, TaskMessage } from './protocol.ts';

/** The pool's end of the line to a worker. */
export interface TrialWorker {
  send(message: TaskMessage): void;
  onAnswer(hear: (answer: TaskAnswer) => void): void;
  /** Told at most once, when it can answer no more. */
  onDeath(hear: (reason: string) => void): void;
  end(): void;
}

/** Null when there are no more to be had. */
export type MakeWorker = () => TrialWorker | null;

export interface Progress {
  readonly done: number;
  readonly count: number;
  /** Time since the start without pauses, s. */
  readonly elapsed_s: number;
  /** At the pace so far, s; null before the first task is done. */
  readonly left_s: number | null;
}

export type PoolEnd = 'finished' | 'cancelled' | 'crashed';

export interface PoolOutcome {
  readonly end: PoolEnd;
  /** Tasks told so far; the others were not begun or not finished and can be run again. */
  readonly done: number;
  /** Why workers died, one line each. */
  readonly deaths: readonly string[];
}

export interface PoolRun {
  readonly done: Promise<PoolOutcome>;
  /** Gives out nothing more; tasks under way are dropped. */
  cancel(): void;
  /** Gives out nothing more until `resume`; tasks under way are finished. */
  pause(): void;
  resume(): void;
}

export interface PoolWork {
  readonly count: number;
  /** May throw InputError: that task is told as refused and the rest goes on. */
  taskAt(index: number): TrialTask;
  /** Told each answer once; an error thrown here ends the run and comes out of `done`. */
  hear(index: number, answer: TaskAnswer): void;
  progress?(progress: Progress): void;
  /** A worker that has not answered a task for so long is ended; default PATIENCE_S. */
  readonly patience_s?: number;
}

/** The longest trials take seconds; a machine that is busy with other things ten times that. */
export const PATIENCE_S = 120;

/** Deaths beyond one a worker and this many end the run: the fault is not in single tasks. */
const SPARE_DEATHS = 4;

/** Runs the work over `workers` workers, made as they are needed and ended with the run. */
export function runTasks(makeWorker: MakeWorker, workers: number, work: PoolWork): PoolRun {
  const pool = new Pool(makeWorker, Math.max(1, Math.min(workers, work.count)), work);
  // Begun in a turn of its own, so that the caller holds the run before the first answer.
  queueMicrotask(() => pool.begin());
  return pool;
}

class Pool implements PoolRun {
  readonly done: Promise<PoolOutcome>;
  private settle: (outcome: PoolOutcome) => void = () => undefined;
  private fail: (error: unknown) => void = () => undefined;
  private next = 0;
  private told = 0;
  private paused = false;
  private ended = false;
  private readonly again: number[] = [];
  private readonly triedBefore = new Set<number>();
  private readonly underWay = new Map<TrialWorker, number | null>();
  private readonly alarms = new Map<TrialWorker, ReturnType<typeof setTimeout>>();
  private readonly deaths: string[] = [];
  private readonly clock = new Stopwatch();

  constructor(
    private readonly makeWorker: MakeWorker,
    private readonly size: number,
    private readonly work: PoolWork,
  ) {
    this.done = new Promise((settle, fail) => {
      this.settle = settle;
      this.fail = fail;
    });
  }

  begin(): void {
    if (this.ended) return;
    if (this.work.count === 0) return this.finish('finished');
    this.guard(() => {
      for (let i = 0; i < this.size; i++) this.hire();
    });
  }

  cancel(): void {
    this.finish('cancelled');
  }

  pause(): void {
    this.paused = true;
    this.clock.stop();
  }

  resume(): void {
    if (!this.paused) return;
    this.paused = false;
    this.clock.go();
    this.guard(() => {
      for (const worker of [...this.underWay.keys()]) this.give(worker);
    });
  }

  private hire(): void {
    const worker = this.makeWorker();
    if (worker === null) return;
    this.underWay.set(worker, null);
    worker.onAnswer((answer) => this.guard(() => this.answered(worker, answer)));
    worker.onDeath((reason) => this.guard(() => this.died(worker, reason)));
    this.give(worker);
  }

  private answered(worker: TrialWorker, answer: TaskAnswer): void {
    const index = this.underWay.get(worker);
    // An answer that nobody waits for (after a cancel) is dropped.
    if (this.ended || index !== answer.id) return;
    this.calm(worker);
    this.underWay.set(worker, null);
    this.tell(answer.id, answer);
    this.give(worker);
  }

  private died(worker: TrialWorker, reason: string): void {
    if (this.ended || !this.underWay.has(worker)) return;
    const index = this.underWay.get(worker) ?? null;
    this.calm(worker);
    this.underWay.delete(worker);
    this.deaths.push(reason);
    if (index !== null) {
      if (this.triedBefore.has(index)) {
        this.tell(index, { id: index, kind: 'failed', reason: `the worker died of it twice: ${reason}` });
      } else {
        this.triedBefore.add(index);
        this.again.push(index);
      }
    }
    if (this.ended) return;
    if (this.deaths.length <= this.size + SPARE_DEATHS) this.hire();
    if (this.underWay.size === 0) this.finish('crashed');
    for (const other of [...this.underWay.keys()]) this.give(other);
  }

  /** Gives an idle worker the next task, telling those that cannot be flown. */
  private give(worker: TrialWorker): void {
    while (!this.ended && !this.paused && this.underWay.get(worker) === null) {
      const index = this.again.pop() ?? (this.next < this.work.count ? this.next++ : null);
      if (index === null) return;
      let task: TrialTask;
      try {
        task = this.work.taskAt(index);
      } catch (error) {
        if (!(error instanceof InputError)) throw error;
        this.tell(index, { id: index, kind: 'refused', file: error.file, problems: error.problems });
        continue;
      }
      this.underWay.set(worker, index);
      this.watch(worker);
      worker.send({ id: index, task });
    }
  }

  /** Ends the worker when it does not answer in time. */
  private watch(worker: TrialWorker): void {
    const { patience_s = PATIENCE_S } = this.work;
    const late = (): void => {
      worker.end();
      this.guard(() => this.died(worker, `no answer within ${patience_s} s`));
    };
    this.alarms.set(worker, setTimeout(late, 1000 * patience_s));
  }

  private calm(worker: TrialWorker): void {
    clearTimeout(this.alarms.get(worker));
    this.alarms.delete(worker);
  }

  private tell(index: number, answer: TaskAnswer): void {
    this.told++;
    this.work.hear(index, answer);
    const { told: done, work } = this;
    const elapsed_s = this.clock.read_s();
    work.progress?.({ done, count: work.count, elapsed_s, left_s: (elapsed_s / done) * (work.count - done) });
    if (this.told >= work.count) this.finish('finished');
  }

  private finish(end: PoolEnd): void {
    if (this.ended) return;
    this.ended = true;
    for (const alarm of this.alarms.values()) clearTimeout(alarm);
    this.alarms.clear();
    for (const worker of this.underWay.keys()) worker.end();
    this.underWay.clear();
    this.settle({ end, done: this.told, deaths: this.deaths });
  }

  /** Runs a step of the pool; what the caller's own functions throw ends the run and reaches the caller. */
  private guard(step: () => void): void {
    try {
      step();
    } catch (error) {
      this.fail(error);
      this.finish('cancelled');
    }
  }
}

/** Time without pauses. */
class Stopwatch {
  private since_ms: number | null = performance.now();
  private before_ms = 0;

  read_s(): number {
    return (this.before_ms + (this.since_ms === null ? 0 : performance.now() - this.since_ms)) / 1000;
  }

  stop(): void {
    this.before_ms = this.read_s() * 1000;
    this.since_ms = null;
  }

  go(): void {
    this.since_ms ??= performance.now();
  }
}

/** A worker that is none: runs in place, one task a turn of the event loop. For one core, and for tests. */
export function inPlaceWorker(): TrialWorker {
  let hear: (answer: TaskAnswer) => void = () => undefined;
  let over = false;
  return {
    send: (message) =>
      void setTimeout(() => {
        if (!over) hear(answerTask(message));
      }, 0),
    onAnswer: (listener) => {
      hear = listener;
    },
    onDeath: () => undefined,
    end: () => {
      over = true;
    },
  };
}
