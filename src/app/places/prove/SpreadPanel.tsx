/** One trial over a Latin hypercube of what is not known well: share of failures, what matters, the worst. */
import { useEffect, useRef, useState } from 'preact/hooks';
import { runPool, type PoolRun } from '../../../trials/pool.ts';
import { TRIALS } from '../../../trials/registry.ts';
import type { Subject } from '../../../trials/sweep.ts';
import { latinHypercube, SPREADS, whatMatters, wilsonInterval } from '../../../trials/uncertainty.ts';
import { useStore } from '../../store/context.ts';
import { Button } from '../../widgets/Button.tsx';
import { Select } from '../../widgets/Select.tsx';
import { webWorker, workerCount } from './browserPool.ts';
import { proveTexts as words } from './texts.ts';

const SAMPLES = 60;

interface Outcome {
  readonly fails: number;
  readonly count: number;
  readonly matters: readonly { readonly name: string; readonly correlation: number }[];
}

export function SpreadPanel(props: { seed: number }) {
  const store = useStore();
  const [trial, setTrial] = useState('gust-front');
  const [outcome, setOutcome] = useState<Outcome | null>(null);
  const run = useRef<PoolRun | null>(null);
  useEffect(() => () => run.current?.cancel(), []);
  const start = (): void => {
    const base: Subject = { build: store.build.value, gains: store.gains.value, wind: null };
    const factors = latinHypercube(SPREADS, SAMPLES, props.seed);
    const sample = (k: number): Subject =>
      SPREADS.reduce((subject, spread, i) => spread.apply(subject, factors[i][k]), base);
    const workers = Array.from({ length: workerCount() }, webWorker);
    const job = store.jobs.start(words.spreadJob, () => run.current?.cancel());
    const values = new Array<number>(SAMPLES).fill(NaN);
    let fails = 0;
    let count = 0;
    run.current = runPool(
      workers,
      SAMPLES,
      (index) => {
        const { build, gains } = sample(index);
        return { trial, build, gains, wind: null, seed: props.seed };
      },
      (index, answer) => {
        count++;
        job.progress(count / SAMPLES);
        if (answer.kind !== 'done' || !answer.result.pass) fails++;
        if (answer.kind === 'done') values[index] = answer.result.scores[0]?.value ?? NaN;
      },
    );
    void run.current.done.then(() => {
      workers.forEach((worker) => worker.end());
      job.end();
      const usable = values.map((_, i) => i).filter((i) => Number.isFinite(values[i]));
      const picked = factors.map((column) => Float64Array.from(usable, (i) => column[i]));
      setOutcome({
        fails,
        count,
        matters: whatMatters(
          SPREADS,
          picked,
          usable.map((i) => values[i]),
        ),
      });
    });
  };
  const interval = outcome === null ? null : wilsonInterval(outcome.fails, outcome.count);
  const percent = (share: number) => (100 * share).toFixed(0);
  return (
    <section class="panel" aria-label={words.spread}>
      <h2>{words.spread}</h2>
      <div class="row">
        <Select
          label={words.trialChoice}
          value={trial}
          options={TRIALS.map((one) => ({ value: one.name, label: one.title }))}
          onChange={setTrial}
        />
        <Button onClick={start}>{words.spreadRun}</Button>
      </div>
      {outcome !== null && interval !== null && (
        <>
          <p role="status">
            {words.spreadResult(
              percent(interval.share),
              percent(interval.low),
              percent(interval.high),
              outcome.count,
            )}
          </p>
          <p class="small">
            {words.matters}:{' '}
            {outcome.matters.map((one) => `${one.name} ${one.correlation.toFixed(2)}`).join(', ')}
          </p>
        </>
      )}
    </section>
  );
}
