/** Two thumb areas on a touch screen: each touch is a stick from where it began. */

export interface TouchStick {
  /** Deflection, −1 … 1: right and away from the pilot are positive. */
  x: number;
  y: number;
  active: boolean;
}

/** Travel to full deflection, CSS pixels. */
const REACH_PX = 70;

/**
 * Follows the pointers on one thumb area; returns the end of it. Where the touch began and where it stands go to
 * the area's style as `--from-x`, `--from-y`, `--to-x`, `--to-y`, for whoever draws it; class `held` while held.
 */
export function followThumb(area: HTMLElement, stick: TouchStick): () => void {
  let pointer: number | null = null;
  let from = { x: 0, y: 0 };
  const show = (name: string, x: number, y: number): void => {
    const box = area.getBoundingClientRect();
    area.style.setProperty(`--${name}-x`, `${x - box.left}px`);
    area.style.setProperty(`--${name}-y`, `${y - box.top}px`);
  };
  const down = (event: PointerEvent): void => {
    if (pointer !== null || event.pointerType === 'mouse') return;
    pointer = event.pointerId;
    area.setPointerCapture(pointer);
    from = { x: event.clientX, y: event.clientY };
    stick.active = true;
    area.classList.add('held');
    show('from', from.x, from.y);
    show('to', from.x, from.y);
    event.preventDefault();
  };
  const move = (event: PointerEvent): void => {
    if (event.pointerId !== pointer) return;
    stick.x = clamp((event.clientX - from.x) / REACH_PX);
    stick.y = clamp((from.y - event.clientY) / REACH_PX);
    show('to', from.x + stick.x * REACH_PX, from.y - stick.y * REACH_PX);
  };
  const letGo = (): void => {
    pointer = null;
    stick.x = 0;
    stick.y = 0;
    stick.active = false;
    area.classList.remove('held');
  };
  const up = (event: PointerEvent): void => {
    if (event.pointerId === pointer) letGo();
  };
  area.addEventListener('pointerdown', down);
  area.addEventListener('pointermove', move);
  for (const name of ['pointerup', 'pointercancel', 'lostpointercapture'] as const) {
    area.addEventListener(name, up);
  }
  return () => {
    letGo();
    area.removeEventListener('pointerdown', down);
    area.removeEventListener('pointermove', move);
    for (const name of ['pointerup', 'pointercancel', 'lostpointercapture'] as const) {
      area.removeEventListener(name, up);
    }
  };
}

function clamp(value: number): number {
  return Math.max(-1, Math.min(1, value));
}
