import { useEffect, useState } from 'preact/hooks';
import { PLACE_LIST } from '../places/registry.ts';
import { useStore } from '../store/context.ts';
import { NoticeStack } from '../widgets/NoticeStack.tsx';
import { guideMemory } from './guideMemory.ts';
import type HelpDialog from './HelpDialog.tsx';
import { handleKey } from './keys.ts';
import { Later } from './Later.tsx';
import { PlaceFrame } from './PlaceFrame.tsx';
import { Rail } from './Rail.tsx';
import { hashOf, placeInHash } from './route.ts';
import { takeFromLink } from './takeFromLink.ts';
import { TopLine, type ShellDialog } from './TopLine.tsx';
import { useFileDrop } from './useFileDrop.ts';
import { useUncaught } from './useUncaught.ts';

/** Loaded when they are first opened. */
const DIALOGS: Readonly<Record<ShellDialog, () => Promise<{ default: typeof HelpDialog }>>> = {
  work: () => import('./WorkDialog.tsx'),
  help: () => import('./HelpDialog.tsx'),
  settings: () => import('./SettingsDialog.tsx'),
};

/** The frame that all places live in. */
export function App() {
  const store = useStore();
  const [dialog, setDialog] = useState<ShellDialog | null>(null);
  useUncaught();
  const fileOver = useFileDrop();
  const here = store.place.value;
  const place = PLACE_LIST.find(({ name }) => name === here) ?? PLACE_LIST[0];

  useEffect(() => {
    const follow = () => {
      const wanted = placeInHash(location.hash);
      if (wanted !== null) store.choosePlace(wanted);
      else void takeFromLink(store);
    };
    const press = (event: KeyboardEvent) => {
      handleKey(event, {
        place: (index) => {
          location.hash = hashOf(PLACE_LIST[index].name);
        },
        undo: () => store.undo(),
        redo: () => store.redo(),
        help: () => setDialog('help'),
        work: () => setDialog('work'),
        settings: () => setDialog('settings'),
      });
    };
    follow();
    window.addEventListener('hashchange', follow);
    window.addEventListener('keydown', press);
    return () => {
      window.removeEventListener('hashchange', follow);
      window.removeEventListener('keydown', press);
    };
  }, [store]);

  useEffect(() => {
    document.title = `${store.texts.places[here]} · ${store.texts.title}`;
    if (placeInHash(location.hash) !== here) history.replaceState(null, '', hashOf(here));
  }, [here]);

  const close = () => setDialog(null);
  return (
    <div class="frame">
      <a
        class="skip"
        href="#place"
        onClick={(event) => {
          event.preventDefault();
          document.getElementById('place')?.focus();
        }}
      >
        {store.texts.skip}
      </a>
      <Rail />
      <TopLine open={setDialog} />
      {guideMemory(store.settings.value).hidden ? null : (
        <Later load={() => import('./GuideLine.tsx')} with={{}} />
      )}
      <main class="place" id="place" tabIndex={-1} aria-label={store.texts.places[here]}>
        <PlaceFrame key={here} place={place} />
      </main>
      <NoticeStack />
      {fileOver ? <div class="aim-drop">{store.texts.drop.over}</div> : null}
      {dialog === null ? null : (
        <Later
          key={dialog}
          load={DIALOGS[dialog]}
          with={{ onClose: close }}
          onFailure={() => {
            close();
            store.notices.tell('error', store.texts.states.failedLoad(store.texts.topLine[dialog]));
          }}
        />
      )}
    </div>
  );
}
