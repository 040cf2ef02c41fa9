import { useStore } from '../store/context.ts';
import type { Job } from '../store/jobs.ts';
import { readable } from '../store/units.ts';
import { Button } from '../widgets/Button.tsx';
import { ProgressLine } from '../widgets/ProgressLine.tsx';
import { windInWords } from './windWords.ts';

export type ShellDialog = 'work' | 'settings' | 'help';

/** What is on the bench, and what runs in the background. */
export function TopLine(props: { open: (dialog: ShellDialog) => void }) {
  const store = useStore();
  const { texts } = store;
  const words = texts.topLine;
  const labels = store.undoLabels.value;
  return (
    <header class="top" aria-label={words.label}>
      <CraftItem />
      <GainsItem />
      <div class="top-item" data-item="wind">
        <span class="name">{words.wind}</span>
        {windInWords(store.wind.value, store.settings.value.units, texts.wind)}
      </div>
      <div class="top-item" data-item="loop">
        <span class="name">{words.loop}</span>
        <span>
          {readable(store.gains.value.loop_Hz)}
          <span class="unit"> Hz</span>
        </span>
      </div>
      <div class="top-fill">
        <div class="jobs" role="group" aria-label={texts.jobs.label}>
          {store.jobs.current.value.map((job) => (
            <JobItem key={job.id} job={job} />
          ))}
        </div>
        <SaveItem />
      </div>
      <div class="top-tools">
        <Button
          quiet
          disabled={labels.undo === null}
          title={`${words.undo(labels.undo)} (Ctrl+Z)`}
          onClick={() => store.undo()}
        >
          {words.undoShort}
        </Button>
        <Button
          quiet
          disabled={labels.redo === null}
          title={`${words.redo(labels.redo)} (Ctrl+Shift+Z)`}
          onClick={() => store.redo()}
        >
          {words.redoShort}
        </Button>
        <Button quiet title={words.workHint} onClick={() => props.open('work')}>
          {words.work}
        </Button>
        <Button quiet title={`${words.settings} (Alt+S)`} onClick={() => props.open('settings')}>
          {words.settings}
        </Button>
        <Button quiet title={`${words.help} (Alt+H)`} onClick={() => props.open('help')}>
          {words.help}
        </Button>
      </div>
    </header>
  );
}

function CraftItem() {
  const store = useStore();
  const words = store.texts.topLine;
  return (
    <div class="top-item" data-item="craft">
      <label class="name" for="top-craft">
        {words.craft}
      </label>
      <select
        id="top-craft"
        aria-label={words.craft}
        value={store.craft.value.id}
        onChange={(event) => store.chooseCraft(event.currentTarget.value)}
      >
        {store.crafts.value.map((craft) => (
          <option key={craft.id} value={craft.id}>
            {craft.build.name}
          </option>
        ))}
      </select>
      {store.buildChanged.value ? <ChangedMark /> : null}
    </div>
  );
}

function GainsItem() {
  const store = useStore();
  const words = store.texts.topLine;
  const nameOf = (gains: { name?: string } | null) => gains?.name ?? words.unnamed;
  const b = store.gainsB.value;
  return (
    <div class="top-item" data-item="gains">
      <span class="name">{words.gains}</span>
      {b === null ? (
        <strong>{nameOf(store.gains.value)}</strong>
      ) : (
        <select
          aria-label={words.side}
          value={store.side.value}
          onChange={(event) => store.chooseSide(event.currentTarget.value === 'B' ? 'B' : 'A')}
        >
          <option value="A">A {nameOf(store.gainsA.value)}</option>
          <option value="B">B {nameOf(b)}</option>
        </select>
      )}
      {store.gainsChanged.value ? <ChangedMark /> : null}
    </div>
  );
}

function ChangedMark() {
  const words = useStore().texts.topLine;
  return (
    <span class="changed" role="img" aria-label={words.changed} title={words.changed}>
      {words.changedMark}
    </span>
  );
}

function JobItem(props: { job: Job }) {
  const words = useStore().texts.jobs;
  const { job } = props;
  const share = job.share.value;
  return (
    <div class="job">
      <span class="job-label">{job.label}</span>
      <ProgressLine share={share} label={job.label} />
      <span>{words.share(share)}</span>
      <span class="faint">{words.left(job.left_s.value)}</span>
      {job.stop === null ? null : (
        <Button quiet name={words.stopNamed(job.label)} onClick={job.stop}>
          {words.stop}
        </Button>
      )}
    </div>
  );
}

function SaveItem() {
  const store = useStore();
  const words = store.texts.save;
  const state = store.saveState.value;
  const title =
    state.kind === 'off'
      ? words.offLong(state.reason)
      : state.kind === 'failed'
        ? words.failedLong(state.reason)
        : undefined;
  return (
    <span
      class="save-state"
      data-kind={state.kind}
      data-revision={state.kind === 'saved' ? (state.revision ?? undefined) : undefined}
      title={title}
    >
      {words[state.kind]}
    </span>
  );
}
