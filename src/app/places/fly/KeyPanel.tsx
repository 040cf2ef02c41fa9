/** The keys beside the flight: what each does, and putting an action on another key. Flying goes on meanwhile. */
import { useEffect, useState } from 'preact/hooks';
import { FLY_KEYS, keyName, rebound, type FlyKey } from '../../input/keyMap.ts';
import { Button } from '../../widgets/Button.tsx';
import type { FlightSession } from './session.ts';
import { flyTexts } from './texts.ts';

const words = flyTexts.keyHelp;

export function KeyPanel(props: {
  session: FlightSession;
  layout: ReadonlyMap<string, string> | null;
  /** Told while a key is being chosen: flying keys rest. */
  onChoosing: (choosing: boolean) => void;
  onClose: () => void;
}) {
  const { session, onChoosing } = props;
  const map = session.keys.value;
  const [choosing, setChoosing] = useState<FlyKey | null>(null);
  const [refused, setRefused] = useState<string | null>(null);
  useEffect(() => onChoosing(choosing !== null), [choosing]);
  useEffect(() => () => onChoosing(false), []);
  useEffect(() => {
    if (choosing === null) return;
    const take = (event: KeyboardEvent): void => {
      if (event.altKey || event.ctrlKey || event.metaKey || event.key === 'Shift') return;
      event.preventDefault();
      event.stopPropagation();
      if (event.code === 'Escape') return setChoosing(null);
      const next = rebound(map, choosing, event.code);
      if (next === null) return setRefused(words.refused(event.key));
      session.setKeys(next);
      setRefused(null);
      setChoosing(null);
    };
    window.addEventListener('keydown', take, true);
    return () => window.removeEventListener('keydown', take, true);
  }, [choosing, map, session]);
  return (
    <aside class="fly-keys" aria-label={words.title}>
      <header>
        <h2>{words.title}</h2>
        <Button quiet onClick={props.onClose}>
          {words.close}
        </Button>
      </header>
      <p class="faint small">{refused ?? words.how}</p>
      <ul>
        {FLY_KEYS.map((action) => (
          <li key={action}>
            <span>{words.actions[action]}</span>
            <button
              type="button"
              class="key-cap"
              aria-label={words.change(words.actions[action], keyName(map[action], props.layout))}
              aria-pressed={choosing === action}
              onClick={() => setChoosing(choosing === action ? null : action)}
            >
              {choosing === action ? words.press : keyName(map[action], props.layout)}
            </button>
          </li>
        ))}
        <li>
          <span>{words.strong}</span>
          <kbd class="key-cap">Shift</kbd>
        </li>
      </ul>
      <Button onClick={() => session.setKeys(null)}>{words.reset}</Button>
    </aside>
  );
}

/** What stands on this keyboard's keys, where the browser tells it (Keyboard API of the WICG). */
export function useKeyboardLayout(): ReadonlyMap<string, string> | null {
  const [layout, setLayout] = useState<ReadonlyMap<string, string> | null>(null);
  useEffect(() => {
    const { keyboard } = navigator as Navigator & {
      keyboard?: { getLayoutMap?: () => Promise<ReadonlyMap<string, string>> };
    };
    // Not told in a frame of another site or by other browsers: the keys' own letters do then.
    keyboard?.getLayoutMap?.().then(setLayout, () => undefined);
  }, []);
  return layout;
}
