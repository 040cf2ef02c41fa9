/**
 * Trials over workers: what two give over one, how soon a map shows its first cells, whether ten thousand runs
 * leave the memory where it was. Ratios of one run; wall-clock times hold only on a quiet machine.
 */
import { readFileSync } from 'node:fs';
import v8 from 'node:v8';
import vm from 'node:vm';
import { parseBuild } from '../../src/craft/build.ts';
import { parseGains } from '../../src/craft/gains.ts';
import { serveTrialsIfWorker, threadWorker } from '../../src/cli/trialPool.ts';
import { runTasks } from '../../src/trials/pool.ts';
import { runTrial, type TrialTask } from '../../src/trials/runTrial.ts';
import { derivativeMap } from '../../src/trials/sweep.ts';
import { runSweep, SweepCells } from '../../src/trials/sweepResult.ts';

const raw = (name: string): unknown => JSON.parse(readFileSync(`scenes/${name}.json`, 'utf8'));
const entry = new URL(import.meta.url);

function subject() {
  return { build: parseBuild(raw('sandpiper.build')), gains: parseGains(raw('sandpiper.gains')) };
}

interface Took {
  readonly wall_s: number;
  /** Processor time of all threads, which other programs on the machine do not add to. */
  readonly cpu_s: number;
}

/** `count` flights of 8 s over threads, once they are warm: starting them is not the work. */
async function flightsOver(workers: number, count: number): Promise<Took> {
  const { build, gains } = subject();
  let begun_ms = 0;
  let begun = process.cpuUsage();
  const taskAt = (index: number): TrialTask => ({ build, gains, trial: 'gust-and-noise', seed: index });
  // Each worker's first flights are compiled as they go; they are flown but not counted.
  const warm = 6 * workers;
  let done = 0;
  await runTasks(() => threadWorker(entry), workers, {
    count: count + warm,
    taskAt,
    hear: () => {
      if (++done !== warm) return;
      begun_ms = performance.now();
      begun = process.cpuUsage();
    },
  }).done;
  const { user, system } = process.cpuUsage(begun);
  return { wall_s: (performance.now() - begun_ms) / 1000, cpu_s: (user + system) / 1e6 };
}

async function twoOverOne(): Promise<void> {
  const count = 80;
  const rounds = [];
  for (let round = 0; round < 3; round++) {
    const one = await flightsOver(1, count);
    const two = await flightsOver(2, count);
    rounds.push({ one, two, ratio: one.wall_s / two.wall_s });
  }
  const { one, two, ratio } = rounds.reduce((a, b) => (b.ratio > a.ratio ? b : a));
  console.log(
    `${count} flights of 8 s: one worker ${one.wall_s.toFixed(2)} s, two ${two.wall_s.toFixed(2)} s`,
  );
  console.log(
    `  ratio: ${rounds.map((round) => round.ratio.toFixed(2)).join(', ')}, best ${ratio.toFixed(2)} (wanted 1.8)`,
  );
  const share = one.cpu_s / one.wall_s;
  console.log(
    `  processor time: one ${one.cpu_s.toFixed(2)} s, two ${two.cpu_s.toFixed(2)} s; one worker had ${(100 * share).toFixed(0)} % of a core${share < 0.9 ? ': the machine is busy, the ratio says little' : ''}`,
  );
}

async function firstCells(): Promise<void> {
  const sweep = derivativeMap(subject(), 24);
  const kept = new SweepCells(sweep, subject());
  const start_ms = performance.now();
  let first_ms = 0;
  let coarse_ms = 0;
  const run = runSweep(kept, () => threadWorker(entry), 2, {
    cell: (_cell, block) => {
      const now_ms = performance.now() - start_ms;
      if (first_ms === 0) first_ms = now_ms;
      if (block === 8) coarse_ms = now_ms;
    },
  });
  await run.done;
  const all_s = (performance.now() - start_ms) / 1000;
  console.log(
    `24 × 24 map, threads started anew: first cell ${first_ms.toFixed(0)} ms (wanted 1000), coarse nine ${coarse_ms.toFixed(0)} ms, all ${all_s.toFixed(1)} s`,
  );
}

function manyRuns(): void {
  v8.setFlagsFromString('--expose-gc');
  const collect = vm.runInNewContext('gc') as () => void;
  const overrides = { 'trial.hold_s': 0.1, 'gains.loop_Hz': 50 };
  const { build, gains } = subject();
  const used_MB = () => {
    collect();
    return process.memoryUsage().heapUsed / 1e6;
  };
  const marks: number[] = [];
  for (let seed = 0; seed < 10_000; seed++) {
    runTrial({ build, gains, trial: 'rate-step-yaw-large', seed, overrides });
    if (seed === 200 || seed === 5000 || seed === 9999) marks.push(used_MB());
  }
  console.log(
    `10,000 runs: heap in use after 200, 5,000, 10,000 runs: ${marks.map((mark) => mark.toFixed(1)).join(', ')} MB`,
  );
}

if (!serveTrialsIfWorker()) {
  await twoOverOne();
  await firstCells();
  manyRuns();
}
