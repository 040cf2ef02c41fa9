/** The table of trials: verdicts of A and B, scores against bands that can be edited, traces over each other. */
import { useState } from 'preact/hooks';
import type { Gains } from '../../../craft/gains.ts';
import { TRIALS, trialByName } from '../../../trials/registry.ts';
import { bandText } from '../../../trials/report.ts';
import type { TrialTask } from '../../../trials/runTrial.ts';
import type { Band, Score, TrialResult } from '../../../trials/trial.ts';
import { bandUse } from '../../../trials/uncertainty.ts';
import { useStore } from '../../store/context.ts';
import { sameJson } from '../../store/document.ts';
import { Button } from '../../widgets/Button.tsx';
import { DataTable, type Column } from '../../widgets/DataTable.tsx';
import type { Kept, RunOf } from './kept.ts';
import { failureText, three, useDesk } from './shared.ts';
import { proveTexts as words } from './texts.ts';
import { TracePlots, type TracedFlight } from './TracePlots.tsx';
import { WorkLine } from './WorkLine.tsx';

/** Results are written down after so many flights, and at the end. */
const KEEP_EVERY = 8;

interface Row {
  readonly name: string;
  readonly title: string;
  readonly purpose: string;
  readonly a: TrialResult | null;
  readonly b: TrialResult | null;
}

export function TrialsPanel() {
  const { kept, now, keep, runs } = useDesk();
  const run = useRunTrials();
  const busy = runs.work.value !== null;
  const rows = TRIALS.map(({ name, title, purpose }): Row => ({
    name,
    title,
    purpose,
    a: kept.a[name] ?? null,
    b: kept.b[name] ?? null,
  }));
  return (
    <section class="prove-part" aria-label={words.tab.trials}>
      <div class="row">
        <Button
          primary={!busy}
          disabled={busy}
          title={busy ? words.busy : undefined}
          onClick={() => void run(TRIALS.map((trial) => trial.name))}
        >
          {words.run}
        </Button>
        {Object.keys(kept.bands).length > 0 && (
          <Button onClick={() => keep({ bands: {} }, words.bandEdit)}>{words.bandsBack}</Button>
        )}
        {now.gainsB === null && <span class="faint small">{words.noB}</span>}
      </div>
      <WorkLine kind="trials" label={words.runJob} />
      <TrialTable rows={rows} busy={busy} onRun={(name) => void run([name])} />
    </section>
  );
}

/** Flies trials on A and, where there is one, B; results of something else than now are let go. */
function useRunTrials() {
  const store = useStore();
  const { kept, now, keep, runs } = useDesk();
  return async (names: readonly string[]): Promise<void> => {
    const sides: ['a' | 'b', Gains][] = [['a', now.gainsA]];
    if (now.gainsB !== null) sides.push(['b', now.gainsB]);
    const todo = names.flatMap((trial) => sides.map(([side, gains]) => ({ trial, side, gains })));
    const fresh = kept.of === null || !sameJson(kept.of, now);
    const sets: Record<'a' | 'b', Record<string, TrialResult>> = {
      a: fresh ? {} : { ...kept.a },
      b: fresh ? {} : { ...kept.b },
    };
    const put = () => keep({ of: now, a: { ...sets.a }, b: { ...sets.b } }, words.edit.results);
    let told = 0;
    const craftId = store.craft.value.id;
    await runs.run('trials', words.runJob, {
      count: todo.length,
      taskAt: (index) => taskOf(todo[index].trial, todo[index].gains, now, kept),
      hear: (index, answer) => {
        if (store.craft.value.id !== craftId) return;
        const { trial, side } = todo[index];
        if (answer.kind === 'done') sets[side][trial] = answer.result;
        else
          store.notices.tell('error', words.failedTask(trial, failureText(answer)), {
            topic: `prove:${trial}`,
          });
        told++;
        if (told % KEEP_EVERY === 0) put();
      },
    });
    if (told % KEEP_EVERY !== 0 && store.craft.value.id === craftId) put();
  };
}

function taskOf(trial: string, gains: Gains, of: RunOf, kept: Pick<Kept, 'bands'>): TrialTask {
  const bands = kept.bands[trial];
  const { build, wind, seed } = of;
  return { trial, build, gains, wind, seed, ...(bands === undefined ? {} : { bands }) };
}

function TrialTable(props: { rows: readonly Row[]; busy: boolean; onRun: (name: string) => void }) {
  const { now } = useDesk();
  const compare = now.gainsB !== null;
  const [opened, setOpened] = useState<string | null>(null);
  const columns: Column<Row>[] = [
    {
      key: 'trial',
      label: words.trial,
      show: ({ name, title, purpose }) => (
        <button
          type="button"
          class="link"
          title={purpose}
          aria-expanded={opened === name}
          onClick={() => setOpened(opened === name ? null : name)}
        >
          {title}
        </button>
      ),
      sortBy: (row) => row.title,
    },
    { key: 'a', label: words.a, show: (row) => <Verdict result={row.a} />, sortBy: (row) => order(row.a) },
    ...(compare
      ? [
          {
            key: 'b',
            label: words.b,
            show: (row: Row) => <Verdict result={row.b} />,
            sortBy: (row: Row) => order(row.b),
          },
        ]
      : []),
    {
      key: 'hardest',
      label: words.hardest,
      show: (row) => (row.a === null ? <span class="faint">{row.purpose}</span> : <Hardest row={row} />),
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
      rows={props.rows}
      rowKey={(row) => row.name}
      opened={opened}
      inside={(row) => <Inside row={row} compare={compare} />}
    />
  );
}

const order = (result: TrialResult | null): number => (result === null ? 2 : result.pass ? 1 : 0);

function Verdict({ result }: { result: TrialResult | null }) {
  if (result === null) return <span class="faint prove-verdict">{words.notRun}</span>;
  return result.pass ? <span>{words.within}</span> : <strong class="bad">{words.outside}</strong>;
}

/** The score that uses its band most, A and B as bars up to the limit. */
function Hardest({ row: { a, b } }: { row: Row }) {
  if (a === null) return null;
  if (a.note !== null) return <span class="faint">{a.note}</span>;
  const index = a.scores.reduce((best, score, i) => (use(score) > use(a.scores[best]) ? i : best), 0);
  const score = a.scores[index];
  const other = b?.scores[index];
  return (
    <span class="prove-hardest">
      <span>
        {score.name} {three(score.value)}
        {other !== undefined && ` / ${three(other.value)}`} <span class="unit">{score.unit}</span>
      </span>
      <UseBar share={use(score)} pass={score.pass} />
      {other !== undefined && <UseBar share={use(other)} pass={other.pass} />}
      {a.stopped !== null && <span class="bad">{a.stopped}</span>}
    </span>
  );
}

const use = (score: Score): number => (score.applies ? (bandUse(score.value, score.band) ?? 0) : 0);

/** Two thirds of the width are the band. */
function UseBar(props: { share: number; pass: boolean }) {
  const width = 40 * Math.min(1.5, props.share);
  return (
    <svg class="prove-use" width="62" height="10" aria-hidden="true">
      <rect class={props.pass ? '' : 'over'} y="2" width={width} height="6" />
      <path d="M40 0V10" />
    </svg>
  );
}

function Inside(props: { row: Row; compare: boolean }) {
  const { kept, now } = useDesk();
  const { row } = props;
  const of = kept.of ?? now;
  const flights: TracedFlight[] = [{ label: words.a, task: taskOf(row.name, of.gainsA, of, kept) }];
  if (of.gainsB !== null && row.b !== null)
    flights.push({ label: words.b, task: taskOf(row.name, of.gainsB, of, kept) });
  return (
    <div class="prove-inside">
      <p>{row.purpose}</p>
      <ScoreTable row={row} compare={props.compare} />
      {row.a !== null && row.a.note === null && <TracePlots flights={flights} />}
    </div>
  );
}

function ScoreTable(props: { row: Row; compare: boolean }) {
  const { row, compare } = props;
  return (
    <table class="prove-scores">
      <thead>
        <tr>
          <th>{words.score}</th>
          <th>{words.a}</th>
          {compare && <th>{words.b}</th>}
          {compare && <th>{words.difference}</th>}
          <th>{words.band}</th>
          <th>{words.source}</th>
        </tr>
      </thead>
      <tbody>
        {trialByName(row.name).scores.map((score, i) => {
          const a = row.a?.scores[i];
          const b = row.b?.scores[i];
          const difference = a?.value == null || b?.value == null ? null : b.value - a.value;
          return (
            <tr key={score.name}>
              <th scope="row">{score.name}</th>
              <td class={a === undefined || a.pass ? '' : 'bad'}>
                {three(a?.value)} <span class="unit">{score.unit}</span>
              </td>
              {compare && <td class={b === undefined || b.pass ? '' : 'bad'}>{three(b?.value)}</td>}
              {compare && <td>{three(difference)}</td>}
              <td>
                <BandFields trial={row.name} score={score} />
              </td>
              <td class="faint">{a?.source ?? score.source}</td>
            </tr>
          );
        })}
      </tbody>
    </table>
  );
}

/** Least and most as fields; an edited band says so and leads back to the trial's own. */
function BandFields(props: { trial: string; score: Pick<Score, 'name' | 'unit' | 'band'> }) {
  const { kept, keep } = useDesk();
  const [message, setMessage] = useState<string | null>(null);
  const { trial, score } = props;
  const own = kept.bands[trial]?.[score.name];
  const band = own ?? score.band;
  const set = (next: Band | null): void => {
    const { [score.name]: _old, ...others } = kept.bands[trial] ?? {};
    const same = next !== null && next.least === score.band.least && next.most === score.band.most;
    const bands = next === null || same ? others : { ...others, [score.name]: next };
    const { [trial]: _bands, ...rest } = kept.bands;
    keep({ bands: Object.keys(bands).length === 0 ? rest : { ...rest, [trial]: bands } }, words.bandEdit);
  };
  const change = (which: 'least' | 'most', text: string): void => {
    const value = text.trim() === '' ? undefined : Number(text.replace(',', '.').replace('−', '-'));
    if (value !== undefined && !Number.isFinite(value)) return setMessage(words.bandBad(text));
    const least = which === 'least' ? value : band.least;
    const most = which === 'most' ? value : band.most;
    if (least !== undefined && most !== undefined && least > most)
      return setMessage(words.bandOrder(least, most));
    setMessage(null);
    set({ ...(least === undefined ? {} : { least }), ...(most === undefined ? {} : { most }) });
  };
  return (
    <span class="prove-band">
      {(['least', 'most'] as const).map((which) => (
        <label key={which}>
          <span class="faint small">{words[which]}</span>
          <input
            class="text-input"
            inputMode="decimal"
            aria-label={words.bandField(words[which], score.name)}
            value={band[which] ?? ''}
            placeholder={words.open}
            onChange={(event) => change(which, event.currentTarget.value)}
          />
        </label>
      ))}
      <span class="unit">{score.unit}</span>
      {own !== undefined && (
        <>
          <em title={bandText(score.band, score.unit)}>{words.bandEdited}</em>
          <Button quiet onClick={() => set(null)}>
            {words.bandBack}
          </Button>
        </>
      )}
      {message !== null && (
        <span class="bad small" role="alert">
          {message}
        </span>
      )}
    </span>
  );
}
