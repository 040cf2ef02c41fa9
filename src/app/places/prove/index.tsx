/** Prove: repeatable trials with bands, maps, spread over what is not known, and the pilot's own rating. */
import { useMemo } from 'preact/hooks';
import { VERSION } from '../../../flight/record.ts';
import { reportHtml, repeatDescription, type ReportContent } from '../../../trials/report.ts';
import { judgedBy } from '../../../trials/runTrial.ts';
import type { TrialResult } from '../../../trials/trial.ts';
import { fileStem, saveFile, saveJson } from '../../storage/saveFile.ts';
import { useRunning, useStore } from '../../store/context.ts';
import { sameJson } from '../../store/document.ts';
import { Button } from '../../widgets/Button.tsx';
import { NumberField } from '../../widgets/NumberField.tsx';
import { Tabs } from '../../widgets/Tabs.tsx';
import { Toggle } from '../../widgets/Toggle.tsx';
import { keptOf, type Kept, type Results, type RunOf } from './kept.ts';
import { MapsPanel } from './MapsPanel.tsx';
import './prove.css';
import { RatingPanel } from './RatingPanel.tsx';
import { ProveRuns } from './runs.ts';
import { DeskContext, useDesk, type ProveDesk } from './shared.ts';
import { SpreadPanel } from './SpreadPanel.tsx';
import { proveTexts as words } from './texts.ts';
import { TrialsPanel } from './TrialsPanel.tsx';

type Tab = keyof typeof words.tab;
const TABS = (Object.keys(words.tab) as Tab[]).map((value) => ({ value, label: words.tab[value] }));

export default function Prove() {
  const store = useStore();
  const desk = useProveDesk();
  const memory = store.settings.value.places['prove.tab'];
  const tab = TABS.find(({ value }) => value === memory)?.value ?? 'trials';
  return (
    <DeskContext.Provider value={desk}>
      <div class="prove">
        <Bar />
        <Tabs
          label={words.tabs}
          value={tab}
          tabs={TABS}
          onChange={(next) => store.setPlaceMemory('prove.tab', next)}
        >
          {tab === 'trials' && <TrialsPanel />}
          {tab === 'maps' && <MapsPanel />}
          {tab === 'spread' && <SpreadPanel />}
          {tab === 'hand' && <RatingPanel />}
        </Tabs>
        <label class="prove-notes">
          {words.notes}
          <textarea
            rows={2}
            maxLength={10_000}
            value={desk.kept.notes}
            onChange={(event) => desk.keep({ notes: event.currentTarget.value }, words.edit.notes)}
          />
        </label>
      </div>
    </DeskContext.Provider>
  );
}

/** The craft's kept results, judged by the bands that hold now; what a run would be of; the runs under way. */
function useProveDesk(): ProveDesk {
  const store = useStore();
  const running = useRunning();
  const runs = useMemo(() => {
    const before = running.get('prove');
    const one = before instanceof ProveRuns ? before : new ProveRuns(store);
    running.set('prove', one);
    return one;
  }, [store, running]);
  const raw = store.craft.value.sheets.prove;
  const kept = useMemo(() => judged(keptOf(raw)), [raw]);
  const build = store.build.value;
  const gainsA = store.gainsA.value;
  const gainsB = store.gainsB.value;
  const wind = kept.deskWind ? store.wind.value : null;
  const now: RunOf = { build, gainsA, gainsB, wind, seed: kept.seed, version: VERSION };
  const keep = (change: Partial<Kept>, label: string) =>
    store.setSheet('prove', { ...keptOf(store.craft.value.sheets.prove), ...change }, label);
  return { runs, kept, now, keep };
}

function judged(kept: Kept): Kept {
  const all = (results: Results): Results =>
    Object.fromEntries(
      Object.entries(results).map(([name, result]) => [name, judgedBy(result, kept.bands[name] ?? {})]),
    );
  return { ...kept, a: all(kept.a), b: all(kept.b) };
}

function Bar() {
  const { kept, now, keep, runs } = useDesk();
  const store = useStore();
  const results = Object.values(kept.a);
  const edited = Object.values(kept.bands).reduce((sum, bands) => sum + Object.keys(bands).length, 0);
  const stale = results.length > 0 && !sameJson(kept.of, now);
  const content = reportContent(kept, now, runs);
  const stem = fileStem(now.build.name);
  const saveReport = (): void => {
    if (runs.cells.value !== null && content.sweep === null)
      store.notices.tell('info', words.otherBuild, { topic: 'prove:report' });
    saveFile(`${stem}-trials.html`, reportHtml(content), 'text/html');
  };
  return (
    <section class="prove-bar" aria-label={words.table}>
      <NumberField
        label={words.seed}
        value={kept.seed}
        min={0}
        max={999_999}
        step={1}
        noSlider
        onChange={(seed) => keep({ seed: Math.round(seed) }, words.edit.seed)}
      />
      <Toggle
        label={words.deskWind}
        hint={words.deskWindHint}
        on={kept.deskWind}
        onChange={(deskWind) => keep({ deskWind }, words.edit.wind)}
      />
      <Button title={words.reportHint} onClick={saveReport}>
        {words.report}
      </Button>
      <Button
        title={words.descriptionHint}
        onClick={() => saveJson(`${stem}.run.json`, repeatDescription(content))}
      >
        {words.description}
      </Button>
      <span role="status">
        {results.length > 0 && words.tally(results.filter((result) => result.pass).length, results.length)}
        {edited > 0 && <em> {words.bandsEdited(edited)}.</em>}
        {stale && <em class="warn"> {words.stale}.</em>}
      </span>
      <span class="prove-clear" title={words.clearanceLong}>
        {words.clearance}
      </span>
    </section>
  );
}

/** What stands in report and description: of what the results were flown with, not of what changed since. */
function reportContent(kept: Kept, now: RunOf, runs: ProveRuns): ReportContent {
  const of = kept.of ?? now;
  const a = Object.values(kept.a) as TrialResult[];
  const b = Object.values(kept.b) as TrialResult[];
  const compared = of.gainsB !== null && b.length > 0;
  const cells = runs.cells.value;
  const spread = kept.spread.result;
  const last = kept.sessions.at(-1);
  return {
    build: of.build,
    gains: compared ? (of.gainsB ?? of.gainsA) : of.gainsA,
    results: compared ? b : a,
    ...(compared ? { baseline: { gains: of.gainsA, results: a } } : {}),
    notes: kept.notes,
    seed: of.seed,
    wind: of.wind,
    bands: kept.bands,
    sweep: cells !== null && sameJson(cells.subject.build, of.build) ? cells : null,
    spread:
      spread === null || !sameJson(spread.of.build, of.build)
        ? null
        : {
            request: {
              trials: [spread.summary.trial],
              samples: kept.spread.samples,
              shares: kept.spread.shares,
            },
            summaries: [spread.summary],
          },
    ...(last !== undefined && last.flights.length === last.order.length ? { ratings: last.flights } : {}),
  };
}
