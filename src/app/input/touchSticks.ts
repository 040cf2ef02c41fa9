/** Two thumb areas on a touch screen: each touch is a stick from where it began. */

export interface TouchStick {
  /** Deflection, −1 … 1: right and away from the pilot are positive. */
  x: number;
  y: number;
  active: boolean;
}

/** Travel to full deflection, CSS pixels. */
const REACH_PX = 70;

/** Follows the pointers on one thumb area; returns the end of it. */
export function followThumb(area: HTMLElement, stick: TouchStick, onMove: () => void): () => void {
  let pointer: number | null = null;
  let x0 = 0;
  let y0 = 0;
  const down = (event: PointerEvent): void => {
    if (pointer !== null || event.pointerType === 'mouse') return;
    pointer = event.pointerId;
    area.setPointerCapture(pointer);
    x0 = event.clientX;
    y0 = event.clientY;
    stick.active = true;
    event.preventDefault();
    onMove();
  };
  const move = (event: PointerEvent): void => {
    if (event.pointerId !== pointer) return;
    stick.x = clamp((event.clientX - x0) / REACH_PX);
    stick.y = clamp((y0 - event.clientY) / REACH_PX);
    onMove();
  };
  const up = (event: PointerEvent): void => {
    if (event.pointerId !== pointer) return;
    pointer = null;
    stick.x = 0;
    stick.y = 0;
    stick.active = false;
    onMove();
  };
  area.addEventListener('pointerdown', down);
  area.addEventListener('pointermove', move);
  area.addEventListener('pointerup', up);
  area.addEventListener('pointercancel', up);
  return () => {
    area.removeEventListener('pointerdown', down);
    area.removeEventListener('pointermove', move);
    area.removeEventListener('pointerup', up);
    area.removeEventListener('pointercancel', up);
  };
}

function clamp(value: number): number {
  return Math.max(-1, Math.min(1, value));
}
