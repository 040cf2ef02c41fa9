import { useEffect, useId, useState } from 'preact/hooks';
import { openFile } from '../storage/openFile.ts';
import { saveArchive } from '../storage/saveArchive.ts';
import { fileStem, saveJson } from '../storage/saveFile.ts';
import type { AsideRecord, WorkStorage } from '../storage/workStorage.ts';
import { useStorage, useStore } from '../store/context.ts';
import { differences } from '../store/differences.ts';
import type { CraftWork, GainsVersion } from '../store/document.ts';
import type { Store } from '../store/store.ts';
import { withUnit } from '../store/units.ts';
import { Button } from '../widgets/Button.tsx';
import { DataTable } from '../widgets/DataTable.tsx';
import { Dialog } from '../widgets/Dialog.tsx';
import { FileDrop } from '../widgets/FileDrop.tsx';

/** Crafts, gain sets with their history, files. */
export default function WorkDialog(props: { onClose: () => void }) {
  const words = useStore().texts.work;
  const storage = useStorage();
  return (
    <Dialog title={words.title} wide onClose={props.onClose}>
      <Crafts />
      <GainHistory />
      <Files />
      {storage === null ? null : <Aside storage={storage} />}
    </Dialog>
  );
}

function Crafts() {
  const store = useStore();
  const words = store.texts.work;
  const here = store.craft.value.id;
  return (
    <section class="panel">
      <h2>{words.crafts}</h2>
      <DataTable<CraftWork>
        label={words.crafts}
        rows={store.crafts.value}
        rowKey={(craft) => craft.id}
        chosen={here}
        columns={[
          { key: 'name', label: words.name, show: (craft) => <CraftName craft={craft} /> },
          {
            key: 'mass',
            label: words.mass,
            numeric: true,
            show: (craft) => withUnit(craft.build.airframe.mass_kg, 'kg', store.settings.value.units),
          },
          {
            key: 'gains',
            label: words.gainsColumn,
            show: (craft) =>
              [craft.gainsA, craft.gainsB]
                .flatMap((set) => (set === null ? [] : [set.working.name ?? store.texts.topLine.unnamed]))
                .join(' / '),
          },
          {
            key: 'do',
            label: '',
            show: (craft) => (
              <div class="row end">
                {craft.id === here ? (
                  <span class="faint">{words.onBench}</span>
                ) : (
                  <Button
                    name={`${words.open}: ${craft.build.name}`}
                    onClick={() => store.chooseCraft(craft.id)}
                  >
                    {words.open}
                  </Button>
                )}
                <Button
                  quiet
                  name={`${words.copy}: ${craft.build.name}`}
                  onClick={() => copyCraft(store, craft)}
                >
                  {words.copy}
                </Button>
                <Button
                  quiet
                  name={`${words.remove}: ${craft.build.name}`}
                  disabled={store.crafts.value.length < 2}
                  onClick={() => store.removeCraft(craft.id, store.texts.edits.removeCraft(craft.build.name))}
                >
                  {words.remove}
                </Button>
              </div>
            ),
          },
        ]}
      />
    </section>
  );
}

/** Both gain sets with their history go along; worksheets and results stay with the craft they are of. */
function copyCraft(store: Store, craft: CraftWork): void {
  const copy = { ...craft, id: crypto.randomUUID(), sheets: {} };
  store.addCrafts([copy], store.texts.edits.copyCraft(craft.build.name));
}

/** The name of the craft on the bench can be changed in place. */
function CraftName(props: { craft: CraftWork }) {
  const store = useStore();
  const { build, id } = props.craft;
  if (id !== store.craft.value.id) return <span>{build.name}</span>;
  return (
    <input
      class="text-input"
      type="text"
      aria-label={store.texts.work.rename}
      maxLength={120}
      value={build.name}
      onChange={(event) => {
        const name = event.currentTarget.value.trim();
        const problems = store.setBuild((old) => ({ ...old, name }), store.texts.edits.renameCraft);
        if (problems.length > 0) event.currentTarget.value = build.name;
      }}
    />
  );
}

function GainHistory() {
  const store = useStore();
  const words = store.texts.work;
  const noteId = useId();
  const [note, setNote] = useState('');
  const set = store.gainSet.value;
  const versions = [...set.history].reverse();
  return (
    <section class="panel">
      <h2>
        {words.gainSets(store.side.value)}: {set.working.name ?? store.texts.topLine.unnamed}
      </h2>
      <div class="row">
        <label for={noteId}>{words.note}</label>
        <input
          id={noteId}
          class="text-input grow"
          type="text"
          maxLength={500}
          placeholder={words.noteHint}
          value={note}
          onInput={(event) => setNote(event.currentTarget.value)}
        />
        <Button
          primary
          onClick={() => {
            store.saveGains(note.trim());
            setNote('');
          }}
        >
          {words.saveGains}
        </Button>
        {store.gainsB.value === null ? (
          <Button onClick={() => store.copyToB()}>{words.copyToB}</Button>
        ) : (
          <Button onClick={() => store.dropB()}>{words.dropB}</Button>
        )}
      </div>
      {versions.length === 0 ? null : (
        <DataTable<GainsVersion>
          label={words.saved}
          rows={versions}
          rowKey={(version) => version.savedAt}
          columns={[
            { key: 'when', label: words.when, show: (version) => new Date(version.savedAt).toLocaleString() },
            { key: 'note', label: words.note, show: (version) => version.note },
            { key: 'diff', label: words.differs, show: (version) => <Differences version={version} /> },
            {
              key: 'do',
              label: '',
              show: (version) => (
                <Button onClick={() => store.setGains(version.gains, store.texts.edits.recallGains)}>
                  {words.bringBack}
                </Button>
              ),
            },
          ]}
        />
      )}
    </section>
  );
}

const MOST_SHOWN = 6;

function Differences(props: { version: GainsVersion }) {
  const store = useStore();
  const words = store.texts.work;
  const found = differences(props.version.gains, store.gains.value);
  if (found.length === 0) return <span class="faint">{words.same}</span>;
  return (
    <ul class="bare small">
      {found.slice(0, MOST_SHOWN).map(({ path, before, after }) => (
        <li key={path}>
          {path.replace(/^axes\./, '')}{' '}
          <span class="faint">
            {before} → {after}
          </span>
        </li>
      ))}
      {found.length > MOST_SHOWN ? <li>{store.texts.notices.more(found.length - MOST_SHOWN)}</li> : null}
    </ul>
  );
}

function Files() {
  const store = useStore();
  const words = store.texts.work;
  const stem = fileStem(store.build.value.name);
  const openAll = async (files: readonly File[]): Promise<void> => {
    for (const file of files) await openFile(store, file);
  };
  return (
    <section class="panel">
      <h2>{words.files}</h2>
      <FileDrop
        label={words.fileHint}
        multiple
        accept=".json,.zip,.csv,.txt"
        onFiles={(files) => void openAll(files)}
      />
      <div class="row above">
        <Button
          onClick={() => {
            saveJson(`${stem}.build.json`, store.build.value);
            store.saveBuild();
          }}
        >
          {words.saveBuildFile}
        </Button>
        <Button onClick={() => saveJson(`${stem}.gains.json`, store.gains.value)}>
          {words.saveGainsFile}
        </Button>
        <Button onClick={() => saveJson(`${stem}.wind.json`, store.wind.value)}>{words.saveWindFile}</Button>
        <Button primary onClick={() => void saveArchive(store)}>
          {words.exportArchive}
        </Button>
      </div>
    </section>
  );
}

/** Records that could not be read; shown only when there are any. */
function Aside(props: { storage: WorkStorage }) {
  const words = useStore().texts.work;
  const [records, setRecords] = useState<readonly AsideRecord[]>([]);
  const read = () => void props.storage.listAside().then(setRecords, () => setRecords([]));
  useEffect(read, [props.storage]);
  if (records.length === 0) return null;
  return (
    <section class="panel">
      <h2>{words.aside}</h2>
      <p class="faint">{words.asideText}</p>
      <DataTable<AsideRecord>
        label={words.aside}
        rows={records}
        rowKey={(record) => String(record.id)}
        columns={[
          { key: 'name', label: words.name, show: (record) => record.name },
          { key: 'why', label: words.asideWhy, show: (record) => record.reason },
          {
            key: 'do',
            label: '',
            show: (record) => (
              <div class="row end">
                <Button onClick={() => saveJson(`${fileStem(record.name)}.aside.json`, record.content)}>
                  {words.asideSave}
                </Button>
                <Button quiet onClick={() => void props.storage.removeAside(record.id).then(read)}>
                  {words.asideRemove}
                </Button>
              </div>
            ),
          },
        ]}
      />
    </section>
  );
}
