/** One trial over a Latin hypercube of what is not known well: share of failures, what matters, the worst. */
import { TRIALS } from '../../../trials/registry.ts';
import type { TaskAnswer } from '../../../trials/pool.ts';
import type { TrialTask } from '../../../trials/runTrial.ts';
import {
  latinHypercube,
  spreadSchema,
  spreadsOf,
  spreadTasks,
  summariseSpread,
  type Proportion,
  type SpreadShares,
  type SpreadSummary,
} from '../../../trials/uncertainty.ts';
import { useStore } from '../../store/context.ts';
import { sameJson } from '../../store/document.ts';
import { Button } from '../../widgets/Button.tsx';
import { NumberField } from '../../widgets/NumberField.tsx';
import { Select } from '../../widgets/Select.tsx';
import type { RunOf, SpreadKept } from './kept.ts';
import { three, useDesk } from './shared.ts';
import { proveTexts as words } from './texts.ts';
import { useFlyTask } from './toFly.ts';
import { TracePlots } from './TracePlots.tsx';
import { WorkLine } from './WorkLine.tsx';

const SHARES = Object.keys(words.share) as (keyof SpreadShares)[];
/** As the schema allows. */
const MOST_SHARE: Readonly<Record<keyof SpreadShares, number>> = {
  mass: 0.3,
  inertia: 0.3,
  thrust: 0.3,
  voltage: 0.95,
  delay: 1,
  noise: 0.32,
};
const DEFAULT_SHARES = spreadSchema.parse({});

export function SpreadPanel() {
  const { kept, keep, runs } = useDesk();
  const { spread } = kept;
  const fly = useSpreadRun();
  const busy = runs.work.value !== null;
  const change = (next: Partial<SpreadKept>) => keep({ spread: { ...spread, ...next } }, words.spreadJob);
  return (
    <section class="prove-part prove-spread" aria-label={words.spread}>
      <div class="prove-spread-form">
        <h3>{words.spread}</h3>
        <p class="faint small">{words.spreadText}</p>
        <Select
          label={words.trialChoice}
          value={spread.trial}
          options={TRIALS.map((one) => ({ value: one.name, label: one.title }))}
          onChange={(trial) => change({ trial })}
        />
        <NumberField
          label={words.samples}
          value={spread.samples}
          min={10}
          max={2000}
          step={10}
          noSlider
          onChange={(samples) => change({ samples: Math.round(samples) })}
        />
        {SHARES.map((name) => (
          <NumberField
            key={name}
            label={words.share[name]}
            value={Number((100 * spread.shares[name]).toPrecision(6))}
            saved={100 * DEFAULT_SHARES[name]}
            unit="%"
            min={0}
            max={100 * MOST_SHARE[name]}
            onChange={(percent) =>
              change({ shares: { ...spread.shares, [name]: Number((percent / 100).toPrecision(6)) } })
            }
          />
        ))}
        <div class="row">
          <Button
            primary={!busy}
            disabled={busy}
            title={busy ? words.busy : undefined}
            onClick={() => void fly()}
          >
            {words.spreadRun(spread.samples)}
          </Button>
          {!sameJson(spread.shares, DEFAULT_SHARES) && (
            <Button onClick={() => change({ shares: DEFAULT_SHARES })}>{words.shareBack}</Button>
          )}
        </div>
      </div>
      <div class="prove-spread-result">
        <WorkLine kind="spread" label={words.spreadJob} />
        {spread.result !== null && <Outcome of={spread.result.of} summary={spread.result.summary} />}
      </div>
    </section>
  );
}

function useSpreadRun() {
  const store = useStore();
  const { kept, now, keep, runs } = useDesk();
  return async (): Promise<void> => {
    const { trial, samples, shares } = kept.spread;
    const of: RunOf = { ...now, gainsA: store.gains.value };
    const spreads = spreadsOf(shares);
    const factors = latinHypercube(spreads, samples, of.seed);
    const bands = kept.bands[trial];
    const tasks: TrialTask[] = [];
    const refused = store.attempt({}, () => {
      const subject = { build: of.build, gains: of.gainsA, wind: of.wind };
      for (const task of spreadTasks(trial, subject, spreads, factors, of.seed))
        tasks.push(bands === undefined ? task : { ...task, bands });
    });
    if (refused.length > 0) return;
    const answers: (TaskAnswer | undefined)[] = tasks.map(() => undefined);
    const craftId = store.craft.value.id;
    await runs.run('spread', words.spreadJob, {
      count: tasks.length,
      taskAt: (index) => tasks[index],
      hear: (index, answer) => {
        answers[index] = answer;
      },
    });
    if (answers.every((answer) => answer === undefined) || store.craft.value.id !== craftId) return;
    const summary = summariseSpread(tasks, spreads, factors, answers);
    keep({ spread: { ...kept.spread, result: { of, summary } } }, words.spreadJob);
  };
}

function Outcome(props: { of: RunOf; summary: SpreadSummary }) {
  const { now } = useDesk();
  const store = useStore();
  const { of, summary } = props;
  const { failures, flown, lost } = summary;
  const percent = (share: number) => (100 * share).toFixed(1);
  const stale = !sameJson(
    [of.build, of.gainsA, of.wind, of.seed],
    [now.build, store.gains.value, now.wind, now.seed],
  );
  const title = TRIALS.find(({ name }) => name === summary.trial)?.title ?? summary.trial;
  return (
    <>
      <h3>
        {title} {stale && <em class="warn">({words.stale})</em>}
      </h3>
      <p role="status">
        {words.spreadResult(percent(failures.share), percent(failures.low), percent(failures.high), flown)}
      </p>
      <IntervalBar failures={failures} />
      {lost > 0 && <p>{words.spreadLost(lost)}</p>}
      <h3>{words.matters}</h3>
      <p class="faint small">{words.mattersText}</p>
      <table class="prove-scores" aria-label={words.matters}>
        <tbody>
          {summary.matters.map(({ name, correlation }) => (
            <tr key={name}>
              <th scope="row">{name}</th>
              <td>
                <CorrelationBar correlation={correlation} />
              </td>
              <td class="numeric">{correlation.toFixed(2).replace('-', '−')}</td>
            </tr>
          ))}
        </tbody>
      </table>
      {summary.worst !== null && <Worst of={of} summary={summary} worst={summary.worst} />}
    </>
  );
}

/** From 0 to 100 %: the interval as a bar, the share as a mark. */
function IntervalBar({ failures: { share, low, high } }: { failures: Proportion }) {
  const at = (value: number) => 300 * value;
  return (
    <svg class="prove-interval" width="302" height="16" role="img" aria-label={words.interval}>
      <path class="ground" d="M1 8H301M1 4V12M301 4V12M151 6V10" />
      <rect x={1 + at(low)} y="4" width={Math.max(1, at(high) - at(low))} height="8" />
      <path class="mark" d={`M${1 + at(share)} 1V15`} />
    </svg>
  );
}

function CorrelationBar({ correlation }: { correlation: number }) {
  const width = 80 * Math.abs(correlation);
  return (
    <svg class="prove-correlation" width="162" height="10" aria-hidden="true">
      <rect x={correlation < 0 ? 81 - width : 81} y="1" width={width} height="8" />
      <path d="M81 0V10" />
    </svg>
  );
}

function Worst(props: { of: RunOf; summary: SpreadSummary; worst: NonNullable<SpreadSummary['worst']> }) {
  const fly = useFlyTask();
  const { of, summary, worst } = props;
  const nominal: TrialTask = {
    trial: summary.trial,
    build: of.build,
    gains: of.gainsA,
    wind: of.wind,
    seed: worst.seed,
  };
  const task: TrialTask = { ...nominal, overrides: worst.overrides };
  return (
    <>
      <h3>{words.worst}</h3>
      <p>
        {Object.entries(worst.factors)
          .map(([name, factor]) => `${name} × ${factor.toFixed(2)}`)
          .join(', ')}
        .{' '}
        {worst.result.scores
          .filter((score) => !score.pass)
          .map((score) => `${score.name} ${three(score.value)} ${score.unit}`)
          .join(', ')}
        {worst.result.stopped !== null && ` ${worst.result.stopped}`}
      </p>
      <div class="row">
        <Button title={words.worstHint} onClick={() => fly(task, words.worstName(of.build.name))}>
          {words.worstFly}
        </Button>
        <span class="faint small">{words.worstHint}</span>
      </div>
      <TracePlots
        flights={[
          { label: words.worst, task },
          { label: of.build.name, task: nominal },
        ]}
      />
    </>
  );
}
