import { useRef, useState } from 'preact/hooks';
import { useStore, useTheme } from '../store/context.ts';
import type { Palette } from '../store/theme.ts';
import { readable } from '../store/units.ts';
import {
  areaIn,
  axisTitle,
  drawFrame,
  haloText,
  xToPx,
  yToPx,
  type PlotArea,
  type PlotAxis,
} from './frame.ts';
import { colourOf, hatchPattern, type TraceAxis } from './lineStyle.ts';
import { contourLines, filledIn, type ContourLine, type MapGrid } from './mapGrid.ts';
import { shareOf, valueAt } from './scale.ts';
import { useCanvas } from './useCanvas.ts';

export interface MapLevel {
  readonly at: number;
  readonly label: string;
  /** The outline that matters (what passes): thick, in the accent. */
  readonly strong?: boolean;
}

export interface MapCurve {
  readonly label: string;
  readonly x: ArrayLike<number>;
  readonly y: ArrayLike<number>;
  readonly axis: TraceAxis;
}

export interface MapPoint {
  readonly x: number;
  readonly y: number;
}

export interface MapPlotProps {
  readonly label: string;
  readonly x: PlotAxis;
  readonly y: PlotAxis;
  readonly grid: MapGrid;
  /** Goes up when cells of `grid` were written. */
  readonly version: number;
  /** Ascending; they also part the tones. */
  readonly levels: readonly MapLevel[];
  /** What the values are: "score", "µs". */
  readonly valueLabel: string;
  readonly valueUnit: string;
  /** Texts set into the map at a place, naming a region. */
  readonly regions?: readonly (MapPoint & { readonly label: string })[];
  readonly curves?: readonly MapCurve[];
  /** Where the gains in use stand, and the other set's. */
  readonly point?: MapPoint;
  readonly pointB?: MapPoint;
  /** What the first point is called; default "A". */
  readonly pointName?: string;
  /** A click on the first point picks it too. */
  readonly picksPoint?: boolean;
  /** Dragging the point or moving it with the arrow keys. */
  readonly onMove?: (point: MapPoint) => void;
  /** A click elsewhere, or Enter. */
  readonly onPick?: (point: MapPoint) => void;
  readonly height?: number;
}

const GRAB_PX = 14;
const KEY_STEPS = 50;
const FINE = 0.1;

/** Two parameters against a value: tones, contours with their labels, a point to drag. */
export function MapPlot(props: MapPlotProps) {
  const words = useStore().texts.plot;
  const palette = useTheme().palette.value;
  const [hover, setHover] = useState<MapPoint | null>(null);
  const area = useRef<PlotArea | null>(null);
  const dragging = useRef(false);
  /** A point that was pressed and let go where it was is picked. */
  const moved = useRef(false);

  const canvas = useCanvas(
    (pen, width, height) => {
      area.current = areaIn(width, height);
      pen.fillStyle = palette.ground;
      pen.fillRect(0, 0, width, height);
      drawMap(pen, area.current, props, palette, words.unstable);
      drawFrame(pen, area.current, props.x, props.y, palette, false);
    },
    [
      props.grid,
      props.version,
      props.levels,
      props.curves,
      props.regions,
      props.point,
      props.pointB,
      props.x,
      props.y,
      props.height,
      palette,
    ],
  );

  const at = (event: MouseEvent): MapPoint | null => {
    const box = canvas.current?.getBoundingClientRect();
    if (box === undefined || area.current === null) return null;
    const { left, top, width, height } = area.current;
    const sx = (event.clientX - box.left - left) / width;
    const sy = 1 - (event.clientY - box.top - top) / height;
    if (!dragging.current && (sx < 0 || sx > 1 || sy < 0 || sy > 1)) return null;
    return { x: valueAt(props.x, held(sx)), y: valueAt(props.y, held(sy)) };
  };
  const nearPoint = (event: MouseEvent): boolean => {
    const box = canvas.current?.getBoundingClientRect();
    if (box === undefined || area.current === null || props.point === undefined || !props.onMove)
      return false;
    const dx = event.clientX - box.left - xToPx(area.current, props.x, props.point.x);
    const dy = event.clientY - box.top - yToPx(area.current, props.y, props.point.y);
    return Math.hypot(dx, dy) < GRAB_PX;
  };
  const press = (event: KeyboardEvent): void => {
    const { point, onMove, onPick } = props;
    if (point === undefined) return;
    const by = (event.shiftKey ? FINE : 1) / KEY_STEPS;
    const dx = event.key === 'ArrowRight' ? by : event.key === 'ArrowLeft' ? -by : 0;
    const dy = event.key === 'ArrowUp' ? by : event.key === 'ArrowDown' ? -by : 0;
    if (event.key === 'Enter' && onPick) onPick(point);
    else if ((dx !== 0 || dy !== 0) && onMove) {
      onMove({
        x: valueAt(props.x, held(shareOf(props.x, point.x) + dx)),
        y: valueAt(props.y, held(shareOf(props.y, point.y) + dy)),
      });
    } else return;
    event.preventDefault();
  };
  const spoken = describePoint(props, hover ?? props.point ?? null, words.unstable);
  return (
    <figure class="plot">
      <figcaption class="plot-legend">
        <span class="plot-title">{props.label}</span>
        <span class="plot-at faint">{spoken}</span>
      </figcaption>
      <div
        class="plot-body map"
        style={{ height: `${props.height ?? 320}px` }}
        role="slider"
        tabIndex={0}
        aria-label={words.pointOf(props.label)}
        aria-valuemin={props.x.low}
        aria-valuemax={props.x.high}
        aria-valuenow={props.point?.x ?? props.x.low}
        aria-valuetext={spoken === '' ? words.noData : spoken}
        title={words.mapKeys}
        onKeyDown={press}
        onPointerDown={(event) => {
          if (event.button !== 0) return;
          if (nearPoint(event)) {
            dragging.current = true;
            moved.current = false;
            event.currentTarget.setPointerCapture(event.pointerId);
          } else {
            const picked = at(event);
            if (picked !== null) (props.onPick ?? props.onMove)?.(picked);
          }
        }}
        onPointerMove={(event) => {
          const place = at(event);
          setHover(place);
          if (!dragging.current || place === null) return;
          moved.current = true;
          props.onMove?.(place);
        }}
        onPointerUp={() => {
          const still = dragging.current && !moved.current;
          if (still && props.picksPoint === true && props.point !== undefined) props.onPick?.(props.point);
          dragging.current = false;
        }}
        onPointerCancel={() => {
          dragging.current = false;
        }}
        onPointerLeave={() => setHover(null)}
      >
        <canvas ref={canvas} aria-hidden="true" />
      </div>
    </figure>
  );
}

function held(share: number): number {
  return Math.min(1, Math.max(0, share));
}

function describePoint(props: MapPlotProps, place: MapPoint | null, unstable: string): string {
  if (place === null) return '';
  const { grid, x, y } = props;
  const column = Math.min(grid.columns - 1, Math.max(0, Math.floor(shareOf(x, place.x) * grid.columns)));
  const row = Math.min(grid.rows - 1, Math.max(0, Math.floor(shareOf(y, place.y) * grid.rows)));
  const { values, known } = filledIn(grid);
  const cell = row * grid.columns + column;
  const value =
    known[cell] === 2
      ? unstable
      : known[cell] === 1
        ? `${props.valueLabel} ${readable(values[cell])} ${props.valueUnit}`
        : '…';
  return `${axisTitle(x)} ${readable(place.x)}, ${axisTitle(y)} ${readable(place.y)}: ${value}`;
}

function drawMap(
  pen: CanvasRenderingContext2D,
  area: PlotArea,
  props: MapPlotProps,
  palette: Palette,
  unstable: string,
): void {
  const { grid, levels } = props;
  const { values, known } = filledIn(grid);
  const tones = tonesOf(levels.length + 1, palette);
  const hatch = hatchPattern(pen, palette.faint);
  const left = (column: number) => Math.round(area.left + (column / grid.columns) * area.width);
  const top = (row: number) => Math.round(area.top + (1 - row / grid.rows) * area.height);
  for (let row = 0; row < grid.rows; row++) {
    for (let column = 0; column < grid.columns; column++) {
      const cell = row * grid.columns + column;
      if (known[cell] === 0) continue;
      pen.fillStyle = known[cell] === 2 ? hatch : tones[levels.filter(({ at }) => values[cell] >= at).length];
      pen.fillRect(left(column), top(row + 1), left(column + 1) - left(column), top(row) - top(row + 1));
    }
  }
  pen.font = '12px system-ui, sans-serif';
  for (const level of levels) {
    const lines = contourLines(values, grid.columns, grid.rows, level.at);
    drawContour(pen, area, grid, lines, level, palette);
  }
  drawUnstableName(pen, area, grid, known, palette, unstable);
  for (const curve of props.curves ?? []) drawCurve(pen, area, props, curve, palette);
  pen.textAlign = 'center';
  pen.textBaseline = 'middle';
  for (const { x, y, label } of props.regions ?? []) {
    haloText(pen, label, xToPx(area, props.x, x), yToPx(area, props.y, y), palette, palette.ink);
  }
  if (props.pointB !== undefined) drawPoint(pen, area, props, props.pointB, 'B', palette);
  if (props.point !== undefined) drawPoint(pen, area, props, props.point, props.pointName ?? 'A', palette);
}

function drawContour(
  pen: CanvasRenderingContext2D,
  area: PlotArea,
  grid: MapGrid,
  lines: readonly ContourLine[],
  level: MapLevel,
  palette: Palette,
): void {
  const colour = level.strong === true ? palette.accent : palette.ink;
  const px = ([column]: readonly [number, number]) => area.left + (column / grid.columns) * area.width;
  const py = ([, row]: readonly [number, number]) => area.top + (1 - row / grid.rows) * area.height;
  pen.strokeStyle = colour;
  pen.lineWidth = level.strong === true ? 2.5 : 1;
  for (const line of lines) {
    pen.beginPath();
    for (const point of line) pen.lineTo(px(point), py(point));
    pen.stroke();
  }
  const longest = lines.reduce<ContourLine>((best, line) => (line.length > best.length ? line : best), []);
  if (longest.length < 4) return;
  const middle = longest[Math.floor(longest.length / 2)];
  pen.textAlign = 'center';
  pen.textBaseline = 'middle';
  haloText(pen, level.label, px(middle), py(middle), palette, colour);
}

/** Names the hatched region once, at its middle, when it is large enough to hold the word. */
function drawUnstableName(
  pen: CanvasRenderingContext2D,
  area: PlotArea,
  grid: MapGrid,
  known: Uint8Array,
  palette: Palette,
  text: string,
): void {
  let count = 0;
  let columns = 0;
  let rows = 0;
  for (let cell = 0; cell < known.length; cell++) {
    if (known[cell] !== 2) continue;
    count++;
    columns += (cell % grid.columns) + 0.5;
    rows += Math.floor(cell / grid.columns) + 0.5;
  }
  if (count < 0.03 * known.length) return;
  pen.textAlign = 'center';
  pen.textBaseline = 'middle';
  const x = area.left + (columns / count / grid.columns) * area.width;
  const y = area.top + (1 - rows / count / grid.rows) * area.height;
  haloText(pen, text, x, y, palette, palette.ink);
}

function drawCurve(
  pen: CanvasRenderingContext2D,
  area: PlotArea,
  props: MapPlotProps,
  curve: MapCurve,
  palette: Palette,
): void {
  if (curve.x.length === 0) return;
  const colour = colourOf(curve.axis, palette);
  pen.strokeStyle = colour;
  pen.lineWidth = 2;
  pen.beginPath();
  for (let i = 0; i < curve.x.length; i++) {
    pen.lineTo(xToPx(area, props.x, curve.x[i]), yToPx(area, props.y, curve.y[i]));
  }
  pen.stroke();
  const last = curve.x.length - 1;
  pen.textAlign = 'right';
  pen.textBaseline = 'bottom';
  haloText(
    pen,
    curve.label,
    xToPx(area, props.x, curve.x[last]),
    yToPx(area, props.y, curve.y[last]) - 4,
    palette,
    colour,
  );
}

function drawPoint(
  pen: CanvasRenderingContext2D,
  area: PlotArea,
  props: MapPlotProps,
  point: MapPoint,
  name: string,
  palette: Palette,
): void {
  const x = xToPx(area, props.x, point.x);
  const y = yToPx(area, props.y, point.y);
  pen.lineWidth = 2;
  pen.strokeStyle = palette.accent;
  pen.fillStyle = palette.ground;
  pen.beginPath();
  pen.arc(x, y, 6, 0, 2 * Math.PI);
  if (name !== 'B') pen.fill();
  pen.stroke();
  pen.textAlign = 'left';
  pen.textBaseline = 'bottom';
  haloText(pen, name, x + 8, y - 4, palette, palette.accent);
}

/** `count` tones from the ground towards a third of the ink: told apart in grey too. */
function tonesOf(count: number, palette: Palette): string[] {
  return Array.from({ length: count }, (_, i) =>
    mixed(palette.ground, palette.roll, (0.5 * i) / Math.max(1, count - 1)),
  );
}

function mixed(a: string, b: string, share: number): string {
  const part = (hex: string, from: number) => Number.parseInt(hex.slice(from, from + 2), 16);
  const channels = [1, 3, 5].map((from) => Math.round(part(a, from) * (1 - share) + part(b, from) * share));
  return `rgb(${channels.join(' ')})`;
}
