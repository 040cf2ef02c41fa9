/** How a trace looks: the axis gives colour and line style together (roll solid, pitch dashed, yaw dotted). */
import type { Palette } from '../store/theme.ts';

export type TraceAxis = 'roll' | 'pitch' | 'yaw' | 'ink' | 'faint' | 'accent';

/** Dash in CSS pixels: on, off; empty for solid. */
const DASHES: Readonly<Record<TraceAxis, readonly number[]>> = {
  roll: [],
  pitch: [9, 4],
  yaw: [2, 3],
  ink: [],
  faint: [],
  accent: [],
};

export function dashOf(axis: TraceAxis): readonly number[] {
  return DASHES[axis];
}

export function colourOf(axis: TraceAxis, palette: Palette): string {
  return palette[axis];
}

/** The same colour for SVG and CSS. */
export function colourOfVariable(axis: TraceAxis): string {
  return `var(--${axis})`;
}

/** Diagonal hatching that tiles every `HATCH_PX` device pixels. */
export const HATCH_PX = 8;

export function hatchPattern(context: CanvasRenderingContext2D, colour: string): CanvasPattern | string {
  const tile = document.createElement('canvas');
  tile.width = HATCH_PX;
  tile.height = HATCH_PX;
  const pen = tile.getContext('2d');
  if (pen === null) return colour;
  pen.strokeStyle = colour;
  pen.lineWidth = 1.5;
  pen.beginPath();
  for (const shift of [-HATCH_PX, 0, HATCH_PX]) {
    pen.moveTo(shift - 1, HATCH_PX + 1);
    pen.lineTo(shift + HATCH_PX + 1, -1);
  }
  pen.stroke();
  return context.createPattern(tile, 'repeat') ?? colour;
}
