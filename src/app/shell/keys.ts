/**
 * Keys that work everywhere. Places are on Alt + digit and the frame's own things on Alt + letter, because
 * plain letters, digits, arrows and Space belong to flying and to fields. Read by `code`, so that a keyboard
 * which writes other signs with Alt works too.
 */
export interface KeyActions {
  readonly place: (index: number) => void;
  readonly undo: () => void;
  readonly redo: () => void;
  readonly help: () => void;
  readonly work: () => void;
  readonly settings: () => void;
}

/** Handles one key press; returns whether it was the frame's. */
export function handleKey(event: KeyboardEvent, actions: KeyActions): boolean {
  const action = actionOf(event, actions);
  if (action === null) return false;
  event.preventDefault();
  action();
  return true;
}

function actionOf(event: KeyboardEvent, actions: KeyActions): (() => void) | null {
  const command = event.ctrlKey || event.metaKey;
  if (command && !event.altKey) {
    if (typesText(event.target)) return null;
    if (event.code === 'KeyZ') return event.shiftKey ? actions.redo : actions.undo;
    if (event.code === 'KeyY') return actions.redo;
    return null;
  }
  if (!event.altKey || command || event.shiftKey) return null;
  const digit = /^Digit([1-6])$/.exec(event.code);
  if (digit !== null) return () => actions.place(Number(digit[1]) - 1);
  if (event.code === 'KeyH') return actions.help;
  if (event.code === 'KeyW') return actions.work;
  if (event.code === 'KeyS') return actions.settings;
  return null;
}

/** A field in which the browser's own undo must stay. */
function typesText(target: EventTarget | null): boolean {
  if (target instanceof HTMLTextAreaElement) return true;
  return target instanceof HTMLInputElement && target.type !== 'range' && target.type !== 'checkbox';
}
