/** The pool under every misfortune: order, death, cancelling, pausing; workers are made for the test. */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { refuse } from '../../src/craft/problem.ts';
import {
  inPlaceWorker,
  runTasks,
  type PoolWork,
  type Progress,
  type TrialWorker,
} from '../../src/trials/pool.ts';
import { serveTrials, type TaskAnswer, type TaskMessage } from '../../src/trials/protocol.ts';
import type { TrialTask } from '../../src/trials/runTrial.ts';
import { webTrialWorker, type WorkerLike } from '../../src/trials/webWorker.ts';
import { demo } from './demo.ts';

const task = (seed: number): TrialTask => ({ ...demo('sandpiper'), trial: 'rate-step-yaw-large', seed });
const answerOf = (id: number): TaskAnswer => ({ id, kind: 'failed', reason: `answer ${id}` });

/** A worker that answers when the test says so, or dies. */
class ToyWorker implements TrialWorker {
  message: TaskMessage | null = null;
  ended = false;
  private hear: (answer: TaskAnswer) => void = () => undefined;
  private dead: (reason: string) => void = () => undefined;

  send(message: TaskMessage): void {
    this.message = message;
  }
  onAnswer(hear: (answer: TaskAnswer) => void): void {
    this.hear = hear;
  }
  onDeath(hear: (reason: string) => void): void {
    this.dead = hear;
  }
  end(): void {
    this.ended = true;
  }
  answer(): void {
    const { message } = this;
    this.message = null;
    if (message !== null) this.hear(answerOf(message.id));
  }
  die(): void {
    this.message = null;
    this.dead('killed by the test');
  }
}

function toyPool(count: number, workers: number, extra: Partial<PoolWork> = {}) {
  const made: ToyWorker[] = [];
  const heard: number[] = [];
  const reasons: string[] = [];
  const run = runTasks(
    () => {
      const worker = new ToyWorker();
      made.push(worker);
      return worker;
    },
    workers,
    {
      count,
      taskAt: task,
      hear: (index, answer) => {
        heard.push(index);
        if (answer.kind === 'failed') reasons.push(answer.reason);
      },
      ...extra,
    },
  );
  const busy = () => made.filter((worker) => worker.message !== null && !worker.ended);
  return { run, made, heard, reasons, busy };
}

const turn = () => new Promise<void>((resolve) => setTimeout(resolve, 0));

describe('the pool', () => {
  it('tells every task once in any order of answers and any number of workers', async () => {
    await fc.assert(
      fc.asyncProperty(
        fc.integer({ min: 1, max: 30 }),
        fc.integer({ min: 1, max: 6 }),
        fc.array(fc.nat(), { minLength: 40, maxLength: 40 }),
        async (count, workers, picks) => {
          const pool = toyPool(count, workers);
          await Promise.resolve();
          for (let k = 0; pool.busy().length > 0; k++) {
            const busy = pool.busy();
            busy[picks[k % picks.length] % busy.length].answer();
          }
          const outcome = await pool.run.done;
          expect(outcome).toEqual({ end: 'finished', done: count, deaths: [] });
          expect([...pool.heard].sort((a, b) => a - b)).toEqual(Array.from({ length: count }, (_, i) => i));
          expect(pool.made.every((worker) => worker.ended)).toBe(true);
          expect(pool.made.length).toBe(Math.min(count, workers));
        },
      ),
      { numRuns: 50 },
    );
  });

  it('nothing to do is done at once', async () => {
    expect((await toyPool(0, 2).run.done).end).toBe('finished');
  });

  it('a worker that dies is replaced and its task flown by another', async () => {
    const pool = toyPool(4, 2);
    await turn();
    pool.busy()[0].die();
    while (pool.busy().length > 0) pool.busy()[0].answer();
    const outcome = await pool.run.done;
    expect(outcome.end).toBe('finished');
    expect(outcome.deaths).toEqual(['killed by the test']);
    expect([...pool.heard].sort()).toEqual([0, 1, 2, 3]);
    expect(pool.reasons.every((reason) => reason.startsWith('answer'))).toBe(true);
  });

  it('a task that kills twice is told as failed, the rest goes on', async () => {
    const pool = toyPool(5, 2);
    await turn();
    for (;;) {
      const killer = pool.busy().find((worker) => worker.message?.id === 2);
      if (killer !== undefined) killer.die();
      else if (pool.busy().length > 0) pool.busy()[0].answer();
      else break;
    }
    const outcome = await pool.run.done;
    expect(outcome).toMatchObject({ end: 'finished', done: 5 });
    expect(pool.reasons.filter((reason) => reason.includes('died of it twice'))).toHaveLength(1);
  });

  it('a worker that hangs is ended, said, and its task flown by another; twice: told as failed', async () => {
    const pool = toyPool(3, 1, { patience_s: 0.2 });
    await turn();
    // Hangs at the first task; the next worker answers it and hangs at the rest.
    await expect.poll(() => pool.made.length, { interval: 5 }).toBe(2);
    expect(pool.made[0].ended).toBe(true);
    pool.busy()[0].answer();
    const outcome = await pool.run.done;
    expect(outcome).toMatchObject({ end: 'finished', done: 3 });
    expect(outcome.deaths.every((reason) => reason === 'no answer within 0.2 s')).toBe(true);
    expect(pool.reasons[0]).toMatch(/^answer/);
    expect(pool.reasons.slice(1).every((reason) => /twice: no answer within 0.2 s/.test(reason))).toBe(true);
  });

  it('workers that cannot live end the run as crashed, with what is finished kept', async () => {
    const pool = toyPool(50, 2);
    await turn();
    pool.busy()[0].answer();
    while (pool.busy().length > 0) pool.busy()[0].die();
    const outcome = await pool.run.done;
    expect(outcome.end).toBe('crashed');
    expect(outcome.done).toBeLessThan(10);
    expect(outcome.done).toBe(pool.heard.length);
    expect(outcome.deaths.length).toBeGreaterThan(2);
  });

  it('cancelling ends at once; a late answer is dropped', async () => {
    const pool = toyPool(10, 2);
    await turn();
    pool.busy()[0].answer();
    const late = pool.busy()[0];
    pool.run.cancel();
    late.answer();
    expect(await pool.run.done).toEqual({ end: 'cancelled', done: 1, deaths: [] });
    expect(pool.heard).toHaveLength(1);
    expect(pool.made.every((worker) => worker.ended)).toBe(true);
  });

  it('paused it gives out nothing, resumed it goes on', async () => {
    const pool = toyPool(6, 2);
    await turn();
    pool.run.pause();
    for (const worker of pool.busy()) worker.answer();
    expect(pool.heard).toHaveLength(2);
    expect(pool.busy()).toHaveLength(0);
    pool.run.resume();
    while (pool.busy().length > 0) pool.busy()[0].answer();
    expect((await pool.run.done).done).toBe(6);
  });

  it('progress counts up to all and ends with no time left', async () => {
    const steps: Progress[] = [];
    const pool = toyPool(3, 1, { progress: (progress) => steps.push(progress) });
    await turn();
    while (pool.busy().length > 0) pool.busy()[0].answer();
    await pool.run.done;
    expect(steps.map(({ done, count }) => [done, count])).toEqual([
      [1, 3],
      [2, 3],
      [3, 3],
    ]);
    expect(steps[2].left_s).toBe(0);
  });

  it('a task whose values are refused is told as such, the rest goes on', async () => {
    const answers: TaskAnswer[] = [];
    const pool = toyPool(3, 1, {
      taskAt: (index) => {
        if (index === 1) throw refuse('sweep', 'x', 5, 'less');
        return task(index);
      },
      hear: (_index, answer) => answers.push(answer),
    });
    await turn();
    while (pool.busy().length > 0) pool.busy()[0].answer();
    expect((await pool.run.done).done).toBe(3);
    expect(answers.map((answer) => answer.kind)).toEqual(['failed', 'refused', 'failed']);
  });

  it('what the listener throws ends the run and reaches the caller', async () => {
    const pool = toyPool(3, 1, {
      hear: () => {
        throw new Error('the disk is full');
      },
    });
    await turn();
    const failed = expect(pool.run.done).rejects.toThrow('the disk is full');
    pool.busy()[0].answer();
    await failed;
    expect(pool.made.every((worker) => worker.ended)).toBe(true);
  });

  it('given workers that cannot be replaced, goes on with those that are left', async () => {
    const workers = [new ToyWorker(), new ToyWorker()];
    const heard: number[] = [];
    const free = [...workers];
    const run = runTasks(() => free.shift() ?? null, workers.length, {
      count: 4,
      taskAt: task,
      hear: (index) => heard.push(index),
    });
    await turn();
    workers[0].die();
    while (workers[1].message !== null) workers[1].answer();
    expect((await run.done).end).toBe('finished');
    expect([...heard].sort()).toEqual([0, 1, 2, 3]);
  });
});

describe('trials over workers', () => {
  it('give the same bytes in any order of work', async () => {
    const seeds = [5, 1, 4, 2, 3];
    const fly = async (order: readonly number[]) => {
      const results = new Map<number, string>();
      await runTasks(inPlaceWorker, 3, {
        count: order.length,
        taskAt: (index) => task(order[index]),
        hear: (index, answer) =>
          results.set(order[index], JSON.stringify(answer.kind === 'done' && answer.result)),
      }).done;
      return results;
    };
    const forward = await fly(seeds);
    const backward = await fly([...seeds].reverse());
    for (const seed of seeds) expect(backward.get(seed)).toBe(forward.get(seed));
    expect(new Set(forward.values()).size).toBe(5);
  });

  it('an unknown trial and values that cannot be are answers, not crashes', async () => {
    const answers: TaskAnswer[] = [];
    const tasks: TrialTask[] = [
      { ...task(1), trial: 'no-such' },
      { ...task(1), overrides: { 'build.airframe.mass_kg': -1 } },
      { ...task(1), overrides: { 'build.airframe.mass': 1 } },
    ];
    await runTasks(inPlaceWorker, 1, {
      count: 3,
      taskAt: (i) => tasks[i],
      hear: (_i, answer) => answers.push(answer),
    }).done;
    expect(answers.map((answer) => answer.kind)).toEqual(['refused', 'refused', 'refused']);
  });
});

describe('a worker of the browser', () => {
  /** The page's end; its other end runs serveTrials as the worker script would. */
  function browserWorker() {
    let hear: (message: TaskMessage) => void = () => undefined;
    const end = {
      onmessage: null as WorkerLike['onmessage'],
      onerror: null as WorkerLike['onerror'],
      onmessageerror: null as WorkerLike['onmessageerror'],
      terminated: false,
      postMessage: (message: TaskMessage) => hear(structuredClone(message)),
      terminate: () => {
        end.terminated = true;
      },
    };
    serveTrials({
      post: (answer) =>
        end.onmessage?.call(
          end as unknown as Worker,
          new MessageEvent('message', { data: structuredClone(answer) }),
        ),
      listen: (listener) => {
        hear = listener;
      },
    });
    return end;
  }

  it('answers through the same messages, all of them plain data', async () => {
    const answers: TaskAnswer[] = [];
    const end = browserWorker();
    const outcome = await runTasks(() => webTrialWorker(end as unknown as WorkerLike), 1, {
      count: 1,
      taskAt: task,
      hear: (_i, answer) => answers.push(answer),
    }).done;
    expect(outcome.end).toBe('finished');
    expect(answers[0].kind).toBe('done');
    expect(end.terminated).toBe(true);
  });

  it('an error of its script is a death, told once with its message', () => {
    const end = browserWorker();
    const reasons: string[] = [];
    webTrialWorker(end as unknown as WorkerLike).onDeath((reason) => reasons.push(reason));
    const event = { message: 'out of memory' } as ErrorEvent;
    end.onerror?.call(end as unknown as Worker, event);
    end.onerror?.call(end as unknown as Worker, event);
    expect(reasons).toEqual(['out of memory']);
    expect(end.terminated).toBe(true);
  });
});
