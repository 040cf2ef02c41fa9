/** The frame of a canvas plot: drawing area, grid, ticks, axis names. */
import type { Palette } from '../store/theme.ts';
import { shareOf, ticksOf, tickText, type AxisRange } from './scale.ts';

export interface PlotAxis extends AxisRange {
  readonly label: string;
  readonly unit: string;
}

/** The drawing area in CSS pixels. */
export interface PlotArea {
  readonly left: number;
  readonly top: number;
  readonly width: number;
  readonly height: number;
}

export const PLOT_FONT = '12px system-ui, -apple-system, "Segoe UI", Roboto, "Noto Sans", sans-serif';
const LEFT = 56;
const RIGHT = 12;
const TOP = 22;
const BOTTOM = 36;

export function areaIn(width: number, height: number): PlotArea {
  return {
    left: LEFT,
    top: TOP,
    width: Math.max(10, width - LEFT - RIGHT),
    height: Math.max(10, height - TOP - BOTTOM),
  };
}

export function xToPx(area: PlotArea, axis: AxisRange, value: number): number {
  return area.left + shareOf(axis, value) * area.width;
}

export function yToPx(area: PlotArea, axis: AxisRange, value: number): number {
  return area.top + (1 - shareOf(axis, value)) * area.height;
}

export function axisTitle(axis: { readonly label: string; readonly unit: string }): string {
  return axis.unit === '' ? axis.label : `${axis.label} (${axis.unit})`;
}

/** Ticks with their texts and both axis names; `grid` also lines across. */
export function drawFrame(
  pen: CanvasRenderingContext2D,
  area: PlotArea,
  x: PlotAxis,
  y: PlotAxis,
  palette: Palette,
  grid: boolean,
): void {
  pen.font = PLOT_FONT;
  pen.lineWidth = 1;
  pen.strokeStyle = palette.line;
  pen.fillStyle = palette.faint;
  pen.textBaseline = 'top';
  pen.textAlign = 'center';
  const bottom = area.top + area.height;
  for (const tick of ticksOf(x, Math.max(2, area.width / 80))) {
    const px = Math.round(xToPx(area, x, tick)) + 0.5;
    line(pen, px, grid ? area.top : bottom, px, bottom + 4);
    pen.fillText(tickText(tick), px, bottom + 5);
  }
  pen.textAlign = 'right';
  pen.textBaseline = 'middle';
  for (const tick of ticksOf(y, Math.max(2, area.height / 44))) {
    const py = Math.round(yToPx(area, y, tick)) + 0.5;
    line(pen, area.left - 4, py, grid ? area.left + area.width : area.left, py);
    pen.fillText(tickText(tick), area.left - 6, py);
  }
  pen.strokeRect(area.left + 0.5, area.top + 0.5, area.width - 1, area.height - 1);
  pen.fillStyle = palette.ink;
  pen.textAlign = 'right';
  pen.textBaseline = 'bottom';
  pen.fillText(axisTitle(x), area.left + area.width, area.top + area.height + BOTTOM - 1);
  pen.textAlign = 'left';
  pen.textBaseline = 'top';
  pen.fillText(axisTitle(y), 4, 3);
}

function line(pen: CanvasRenderingContext2D, x0: number, y0: number, x1: number, y1: number): void {
  pen.beginPath();
  pen.moveTo(x0, y0);
  pen.lineTo(x1, y1);
  pen.stroke();
}

/** Text with a halo of the ground's colour, legible over lines. */
export function haloText(
  pen: CanvasRenderingContext2D,
  text: string,
  x: number,
  y: number,
  palette: Palette,
  colour: string,
): void {
  pen.lineWidth = 3;
  pen.strokeStyle = palette.ground;
  pen.lineJoin = 'round';
  pen.strokeText(text, x, y);
  pen.fillStyle = colour;
  pen.fillText(text, x, y);
}
