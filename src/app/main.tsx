/** The page's start: kept work, store, theme, frame. */
import { render } from 'preact';
import './styles/tokens.css';
import './styles/base.css';
import './styles/widgets.css';
import './styles/plots.css';
import './styles/shell.css';
import { App } from './shell/App.tsx';
import { startOffline } from './shell/offline.ts';
import { takeFromLink } from './shell/takeFromLink.ts';
import { startAutosave, type Autosave } from './storage/autosave.ts';
import { saveArchive } from './storage/saveArchive.ts';
import { openWork } from './storage/start.ts';
import { BenchContext } from './store/context.ts';
import { Store } from './store/store.ts';
import { startTheme } from './store/theme.ts';

async function start(root: HTMLElement): Promise<void> {
  const closing: { autosave: Autosave | null } = { autosave: null };
  const opened = await openWork({
    onClosedForUpdate: () => {
      closing.autosave?.stop(store.texts.save.closedForUpdate);
      store.notices.tell('warning', store.texts.save.closedForUpdate);
    },
  });
  const store = new Store(opened.document);
  const words = store.texts.save;
  const theme = startTheme(store.settings);
  const exportNow = () => void saveArchive(store);
  if (opened.storage === null) {
    store.saveState.value = { kind: 'off', reason: opened.reason };
    store.notices.tell('warning', words.offLong(opened.reason), {
      action: { label: words.exportNow, run: exportNow },
    });
  } else {
    const autosave = startAutosave(store, opened.storage, exportNow);
    closing.autosave = autosave;
    document.addEventListener('visibilitychange', () => {
      if (document.visibilityState === 'hidden') void autosave.flush();
    });
    window.addEventListener('pagehide', () => void autosave.flush());
  }
  for (const { name, reason } of opened.aside) store.notices.tell('error', words.aside(name, reason));
  await takeFromLink(store);
  const running = new Map<string, unknown>();
  startOffline(store, () => running.get('armed') === true);
  render(
    <BenchContext.Provider value={{ store, theme, storage: opened.storage, running }}>
      <App />
    </BenchContext.Provider>,
    root,
  );
}

const root = document.getElementById('app');
if (root !== null) void start(root);
