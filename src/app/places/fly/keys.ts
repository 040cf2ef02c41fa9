/** Keys of Fly. Fields, sliders, the tape and buttons reached by Tab keep their own keys while they have the focus. */
import { actionOn, type FlyKey } from '../../input/keyMap.ts';
import { CAMERAS } from '../../view3d/cameras.ts';
import type { FlightView } from '../../view3d/flightView.ts';
import type { FlightSession } from './session.ts';

const BACK_S = 5;
/** One key press of the view: a turn, a factor of distance. */
const VIEW_TURN_RAD = Math.PI / 12;
const VIEW_ZOOM = 1.25;
const GUST_MPS = 6;

/** What the keys reach besides the flight itself. */
export interface KeyTargets {
  readonly view: () => FlightView | null;
  /** Something modal is open, or a key is being chosen. */
  readonly blocked: boolean;
  readonly onKeys: () => void;
  readonly onTerms: () => void;
}

/** Listens while mounted; returns the end of it. */
export function flightKeys(session: FlightSession, targets: KeyTargets): () => void {
  const down = (event: KeyboardEvent): void => {
    if (targets.blocked || event.altKey || event.ctrlKey || event.metaKey) return;
    if (event.defaultPrevented || keepsKey(event.target, event.code)) return;
    if (session.seat.keys.press(event.code, event.shiftKey)) {
      event.preventDefault();
      return;
    }
    if (event.repeat) return;
    const action = actionOn(session.keys.value, NUMPAD[event.code] ?? event.code);
    if (action === null) return;
    event.preventDefault();
    act(action, session, targets);
  };
  const up = (event: KeyboardEvent): void => session.seat.keys.release(event.code, event.shiftKey);
  const blur = (): void => session.seat.keys.releaseAll();
  window.addEventListener('keydown', down);
  window.addEventListener('keyup', up);
  window.addEventListener('blur', blur);
  return () => {
    blur();
    window.removeEventListener('keydown', down);
    window.removeEventListener('keyup', up);
    window.removeEventListener('blur', blur);
  };
}

/** The same signs elsewhere on the keyboard. */
const NUMPAD: Readonly<Record<string, string>> = {
  NumpadAdd: 'Equal',
  NumpadSubtract: 'Minus',
  NumpadEnter: 'Enter',
};

function act(action: FlyKey, session: FlightSession, targets: KeyTargets): void {
  const view = targets.view();
  switch (action) {
    case 'arm':
      return session.toggleArmed(performance.now());
    case 'restart':
      return session.restart();
    case 'upright':
      return session.client.setUpright();
    case 'drop':
      return session.client.dropPayload();
    case 'levelling':
    case 'heightHold':
      return session.setAssist(action);
    case 'gust':
      return session.gustNow(GUST_MPS);
    case 'pause':
      return session.togglePause();
    case 'camera':
      return view?.setCamera(CAMERAS[(CAMERAS.indexOf(view.camera) + 1) % CAMERAS.length]);
    case 'lookLeft':
      return view?.lookBy(-VIEW_TURN_RAD, 0);
    case 'lookRight':
      return view?.lookBy(VIEW_TURN_RAD, 0);
    case 'nearer':
      return view?.zoomBy(1 / VIEW_ZOOM);
    case 'farther':
      return view?.zoomBy(VIEW_ZOOM);
    case 'singleTick':
      return session.client.singleTick();
    case 'back':
      return session.seek(Math.max(0, (session.at_s.value ?? session.client.newest[0]) - BACK_S));
    case 'flyOn':
      return session.resume();
    case 'terms':
      return targets.onTerms();
    case 'keys':
      return targets.onKeys();
  }
}

/** Elements that want this key for themselves. */
function keepsKey(target: EventTarget | null, code: string): boolean {
  if (!(target instanceof HTMLElement)) return false;
  if (target instanceof HTMLInputElement) return target.type !== 'checkbox' || code === 'Space';
  if (target.matches('select, textarea, [role="slider"], dialog *')) return true;
  // A button that was reached by Tab is pressed by Space or Enter; one that was clicked has done its work.
  const pressed = code === 'Space' || code === 'Enter';
  return pressed && target.matches('button, [role="button"], a') && target.matches(':focus-visible');
}

/** A click leaves no focus on a button, so that Space and Enter go on flying; Tab and its focus are untouched. */
export function flyOnAfterClick(event: MouseEvent): void {
  // `detail` counts clicks of a pointer; a key press that works a button has none.
  if (event.detail === 0) return;
  const active = document.activeElement;
  if (active instanceof HTMLElement && active.matches('button, [role="button"], input[type="checkbox"]')) {
    active.blur();
  }
}
