/** Trials over node's worker threads, from the bundle that the command line runs. */
import path from 'node:path';
import { pathToFileURL } from 'node:url';
import { beforeAll, describe, expect, it } from 'vitest';
import { bundle } from '../../src/cli/launch.mjs';
import { threadWorker } from '../../src/cli/trialPool.ts';
import { inPlaceWorker, runTasks, type MakeWorker } from '../../src/trials/pool.ts';
import type { TrialTask } from '../../src/trials/runTrial.ts';
import { demo } from './demo.ts';

let entry = new URL('file:///nothing');
beforeAll(async () => {
  const folder = await bundle(['src/cli/main.ts']);
  entry = pathToFileURL(path.join(folder, 'src/cli/main.js'));
});

const names = [
  'turbulence-light',
  'rate-step-roll-small',
  'gust-left',
  'hover-noise',
  'bridge-wake',
  'loop-jitter',
];

async function fly(order: readonly number[], makeWorker: MakeWorker, workers: number) {
  const results = new Map<number, string>();
  const taskAt = (index: number): TrialTask => ({
    ...demo('sandpiper'),
    trial: names[order[index]],
    seed: 11,
  });
  const outcome = await runTasks(makeWorker, workers, {
    count: order.length,
    taskAt,
    hear: (index, answer) => {
      results.set(order[index], answer.kind === 'done' ? JSON.stringify(answer.result) : answer.kind);
    },
  }).done;
  return { results: names.map((_, i) => results.get(i)), outcome };
}

describe('worker threads', () => {
  it('one or two, in any order: the same bytes as in this thread', async () => {
    const here = await fly([0, 1, 2, 3, 4, 5], inPlaceWorker, 1);
    const one = await fly([5, 4, 3, 2, 1, 0], () => threadWorker(entry), 1);
    const two = await fly([3, 0, 5, 1, 4, 2], () => threadWorker(entry), 2);
    expect(here.results.every((bytes) => bytes?.startsWith('{'))).toBe(true);
    expect(one.results).toEqual(here.results);
    expect(two.results).toEqual(here.results);
    expect([one.outcome.end, two.outcome.end]).toEqual(['finished', 'finished']);
  }, 60_000);

  it('one that leaves, or cannot start, is a death with a reason; the run ends as crashed', async () => {
    const leaves = new URL('data:text/javascript,process.exit(7)');
    const gone = await fly([0, 1, 2, 3, 4, 5], () => threadWorker(leaves), 2);
    expect(gone.outcome.end).toBe('crashed');
    expect(gone.outcome.deaths[0]).toMatch(/code 7/);
    const broken = await fly(
      [0],
      () => threadWorker(new URL('data:text/javascript,throw new Error("broken")')),
      1,
    );
    expect(broken.outcome.deaths[0]).toMatch(/broken/);
    // One task, killed twice: told as failed.
    expect(broken.results[0]).toBe('failed');
  }, 60_000);

  it('one that dies once costs nothing: another flies its task', async () => {
    let first = true;
    const makeWorker = () => {
      const url = first ? new URL('data:text/javascript,process.exit(1)') : entry;
      first = false;
      return threadWorker(url);
    };
    const { outcome, results } = await fly([1], makeWorker, 1);
    expect(outcome).toMatchObject({ end: 'finished', done: 1 });
    expect(results[1]).toMatch(/"trial":"rate-step-roll-small"/);
  }, 60_000);
});
