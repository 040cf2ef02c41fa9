/** Prove: repeatable trials with bands, the map of derivative gain and cutoff, spread over what is not known. */
import { useEffect, useMemo, useRef, useState } from 'preact/hooks';
import type { Gains } from '../../../craft/gains.ts';
import { runPool, type PoolRun, type TaskAnswer } from '../../../trials/pool.ts';
import { TRIALS } from '../../../trials/registry.ts';
import { bandText, reportHtml } from '../../../trials/report.ts';
import type { TrialTask } from '../../../trials/runTrial.ts';
import type { TrialResult } from '../../../trials/trial.ts';
import { saveFile } from '../../storage/saveFile.ts';
import { useStore } from '../../store/context.ts';
import { Button } from '../../widgets/Button.tsx';
import { DataTable, type Column } from '../../widgets/DataTable.tsx';
import { NumberField } from '../../widgets/NumberField.tsx';
import { webWorker, workerCount } from './browserPool.ts';
import { DerivativeMap } from './DerivativeMap.tsx';
import './prove.css';
import { SpreadPanel } from './SpreadPanel.tsx';
import { proveTexts as words } from './texts.ts';

/** What is kept of a run: the results and what they were of. */
interface Kept {
  readonly key: string;
  readonly a: Readonly<Record<string, TrialResult>>;
  readonly b: Readonly<Record<string, TrialResult>>;
  readonly notes: string;
  readonly seed: number;
}
const EMPTY: Kept = { key: '', a: {}, b: {}, notes: '', seed: 1 };

function keptOf(raw: unknown): Kept {
  return typeof raw === 'object' && raw !== null && 'a' in raw && 'b' in raw ? (raw as Kept) : EMPTY;
}

export default function Prove() {
  const store = useStore();
  const build = store.build.value;
  const gainsA = store.gainsA.value;
  const gainsB = store.gainsB.value;
  const kept = keptOf(store.craft.value.sheets.prove);
  const key = useMemo(
    () => JSON.stringify([build, gainsA, gainsB, kept.seed]),
    [build, gainsA, gainsB, kept.seed],
  );
  const stale = kept.key !== '' && kept.key !== key;
  const [busy, setBusy] = useState(false);
  const run = useRef<PoolRun | null>(null);
  useEffect(() => () => run.current?.cancel(), []);
  const keep = (change: Partial<Kept>) =>
    store.setSheet('prove', { ...keptOf(store.craft.value.sheets.prove), ...change }, words.runJob);

  const start = (names: readonly string[]): void => {
    const sides: ['a' | 'b', Gains][] =
      gainsB === null
        ? [['a', gainsA]]
        : [
            ['a', gainsA],
            ['b', gainsB],
          ];
    const tasks = names.flatMap((trial) => sides.map(([side, gains]) => ({ trial, side, gains })));
    const workers = Array.from({ length: Math.min(workerCount(), tasks.length) }, webWorker);
    const found: Kept = { ...(stale ? EMPTY : kept), seed: kept.seed, notes: kept.notes, key };
    const sets = { a: { ...found.a }, b: { ...found.b } };
    let done = 0;
    const job = store.jobs.start(words.runJob, () => run.current?.cancel());
    setBusy(true);
    run.current = runPool(
      workers,
      tasks.length,
      (index): TrialTask => ({
        trial: tasks[index].trial,
        build,
        gains: tasks[index].gains,
        wind: null,
        seed: kept.seed,
      }),
      (index, answer: TaskAnswer) => {
        done++;
        job.progress(done / tasks.length);
        const { trial, side } = tasks[index];
        if (answer.kind === 'done') sets[side][trial] = answer.result;
        else
          store.notices.tell(
            'error',
            `${trial}: ${answer.kind === 'failed' ? answer.reason : (answer.problems[0]?.allowed ?? '')}`,
            { topic: `prove:${trial}` },
          );
        if (done % 6 === 0 || done === tasks.length) keep({ ...found, a: { ...sets.a }, b: { ...sets.b } });
      },
    );
    void run.current.done.then(() => {
      workers.forEach((worker) => worker.end());
      job.end();
      setBusy(false);
    });
  };

  const results = Object.values(kept.a);
  return (
    <div class="prove">
      <section class="prove-bar">
        <Button primary disabled={busy} onClick={() => start(TRIALS.map((trial) => trial.name))}>
          {words.run}
        </Button>
        <NumberField
          label={words.seed}
          value={kept.seed}
          min={0}
          max={999_999}
          step={1}
          noSlider
          onChange={(seed) => keep({ seed: Math.round(seed) })}
        />
        <Button
          disabled={results.length === 0}
          onClick={() =>
            saveFile(
              `${build.name}-trials.html`,
              reportHtml({
                build,
                gains: gainsB ?? gainsA,
                results: gainsB === null ? results : Object.values(kept.b),
                ...(gainsB === null ? {} : { baseline: { gains: gainsA, results } }),
                notes: kept.notes,
                seed: kept.seed,
              }),
              'text/html',
            )
          }
        >
          {words.report}
        </Button>
        <span role="status">
          {results.length > 0 && words.tally(results.filter((result) => result.pass).length, results.length)}
          {stale && <em class="warn"> ({words.stale})</em>}
        </span>
        <span class="prove-clear">{words.clearance}</span>
      </section>
      {gainsB === null && <p class="faint small">{words.noB}</p>}
      <TrialTable kept={kept} busy={busy} compare={gainsB !== null} onRun={(name) => start([name])} />
      <label class="prove-notes">
        {words.notes}
        <textarea
          rows={2}
          value={kept.notes}
          onChange={(event) => keep({ notes: event.currentTarget.value })}
        />
      </label>
      <DerivativeMap />
      <SpreadPanel seed={kept.seed} />
    </div>
  );
}

interface Row {
  readonly name: string;
  readonly title: string;
  readonly purpose: string;
  readonly a: TrialResult | null;
  readonly b: TrialResult | null;
}

const three = (value: number | null | undefined): string =>
  value === null || value === undefined ? '—' : String(Number(value.toPrecision(3)));

function TrialTable(props: { kept: Kept; busy: boolean; compare: boolean; onRun: (name: string) => void }) {
  const { kept, compare } = props;
  const [opened, setOpened] = useState<string | null>(null);
  const rows = TRIALS.map((trial): Row => ({
    name: trial.name,
    title: trial.title,
    purpose: trial.purpose,
    a: kept.a[trial.name] ?? null,
    b: kept.b[trial.name] ?? null,
  }));
  const verdict = (result: TrialResult | null) =>
    result === null ? (
      <span class="faint">{words.notRun}</span>
    ) : result.pass ? (
      words.within
    ) : (
      <strong class="bad">{words.outside}</strong>
    );
  const columns: Column<Row>[] = [
    {
      key: 'trial',
      label: words.trial,
      show: (row) => (
        <button
          type="button"
          class="link"
          aria-expanded={opened === row.name}
          onClick={() => setOpened(opened === row.name ? null : row.name)}
        >
          {row.title}
        </button>
      ),
      sortBy: (row) => row.title,
    },
    {
      key: 'a',
      label: words.a,
      show: (row) => verdict(row.a),
      sortBy: (row) => (row.a === null ? 2 : row.a.pass ? 1 : 0),
    },
    ...(compare ? [{ key: 'b', label: words.b, show: (row: Row) => verdict(row.b) }] : []),
    {
      key: 'scores',
      label: words.score,
      show: (row) =>
        row.a === null ? (
          <span class="faint">{row.purpose}</span>
        ) : (
          row.a.scores.map((score) => `${score.name} ${three(score.value)} ${score.unit}`).join(' · ')
        ),
    },
    {
      key: 'run',
      label: '',
      show: (row) => (
        <Button
          quiet
          disabled={props.busy}
          name={`${words.runOne} ${row.title}`}
          onClick={() => props.onRun(row.name)}
        >
          {words.runOne}
        </Button>
      ),
    },
  ];
  return (
    <DataTable
      label={words.table}
      columns={columns}
      rows={rows}
      rowKey={(row) => row.name}
      opened={opened}
      inside={(row) => (row.a === null ? <p>{row.purpose}</p> : <ScoreTable row={row} compare={compare} />)}
    />
  );
}

function ScoreTable(props: { row: Row; compare: boolean }) {
  const { a, b } = props.row;
  if (a === null) return null;
  return (
    <div>
      <p>{props.row.purpose}</p>
      <table class="prove-scores">
        <thead>
          <tr>
            <th>{words.score}</th>
            <th>{words.a}</th>
            {props.compare && <th>{words.b}</th>}
            {props.compare && <th>{words.difference}</th>}
            <th>{words.band}</th>
            <th>{words.source}</th>
          </tr>
        </thead>
        <tbody>
          {a.scores.map((score, i) => {
            const other = b?.scores[i] ?? null;
            const difference =
              other?.value == null || score.value === null ? null : other.value - score.value;
            return (
              <tr key={score.name}>
                <th scope="row">{score.name}</th>
                <td class={score.pass ? '' : 'bad'}>
                  {three(score.value)} <span class="unit">{score.unit}</span>
                </td>
                {props.compare && (
                  <td class={other === null || other.pass ? '' : 'bad'}>{three(other?.value)}</td>
                )}
                {props.compare && <td>{three(difference)}</td>}
                <td>{bandText(score.band, score.unit)}</td>
                <td class="faint">{score.source}</td>
              </tr>
            );
          })}
        </tbody>
      </table>
    </div>
  );
}
