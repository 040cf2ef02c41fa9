/** Keys of Fly. Fields, sliders and the tape keep their own keys while they have the focus. */
import { CAMERAS } from '../../view3d/cameras.ts';
import type { FlightView } from '../../view3d/flightView.ts';
import type { FlightSession } from './session.ts';

const BACK_S = 5;
/** One key press of the view: a turn, a factor of distance. */
const VIEW_TURN_RAD = Math.PI / 12;
const VIEW_ZOOM = 1.25;

/** Listens while mounted; returns the end of it. */
export function flightKeys(
  session: FlightSession,
  view: () => FlightView | null,
  blocked: boolean,
  onHelp: () => void,
): () => void {
  const down = (event: KeyboardEvent): void => {
    if (blocked || event.altKey || event.ctrlKey || event.metaKey || typing(event.target)) return;
    if (session.seat.keys.press(event.code, event.shiftKey)) {
      event.preventDefault();
      return;
    }
    if (event.repeat) return;
    const act = actionOf(event, session, view, onHelp);
    if (act === null) return;
    event.preventDefault();
    act();
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

function actionOf(
  event: KeyboardEvent,
  session: FlightSession,
  view: () => FlightView | null,
  onHelp: () => void,
): (() => void) | null {
  switch (event.code) {
    case 'Space':
      return () => session.toggleArmed(performance.now());
    case 'Backspace':
      return () => session.restart();
    case 'KeyU':
      return () => session.client.setUpright();
    case 'KeyX':
      return () => session.client.dropPayload();
    case 'KeyL':
      return () => session.setAssist('levelling');
    case 'KeyH':
      return () => session.setAssist('heightHold');
    case 'KeyG':
      return () => session.gustNow(6);
    case 'KeyP':
      return () => session.togglePause();
    case 'KeyC':
      return () => {
        const now = view();
        if (now !== null) now.setCamera(CAMERAS[(CAMERAS.indexOf(now.camera) + 1) % CAMERAS.length]);
      };
    case 'BracketLeft':
      return () => view()?.lookBy(-VIEW_TURN_RAD, 0);
    case 'BracketRight':
      return () => view()?.lookBy(VIEW_TURN_RAD, 0);
    case 'Equal':
    case 'NumpadAdd':
      return () => view()?.zoomBy(1 / VIEW_ZOOM);
    case 'Minus':
    case 'NumpadSubtract':
      return () => view()?.zoomBy(VIEW_ZOOM);
    case 'Period':
      return () => session.client.singleTick();
    case 'Comma':
      return () => session.seek((session.at_s.value ?? session.client.newest[0]) - BACK_S);
    case 'Enter':
      return () => session.resume();
    case 'Slash':
      return onHelp;
    default:
      return null;
  }
}

/** Elements that want letters, arrows or Space for themselves. */
function typing(target: EventTarget | null): boolean {
  if (!(target instanceof HTMLElement)) return false;
  if (target instanceof HTMLInputElement) return target.type !== 'checkbox';
  return target.matches('select, textarea, [role="slider"], dialog *');
}
