import { useRef, useState } from 'preact/hooks';
import { useStore, useTheme } from '../store/context.ts';
import { readable } from '../store/units.ts';
import { areaIn, drawFrame, haloText, xToPx, yToPx, type PlotArea, type PlotAxis } from './frame.ts';
import { LineSample } from './LineSample.tsx';
import { colourOf, dashOf, type TraceAxis } from './lineStyle.ts';
import { shareOf, valueAt } from './scale.ts';
import { useCanvas } from './useCanvas.ts';

export interface XyCurve {
  readonly label: string;
  readonly axis: TraceAxis;
  readonly x: ArrayLike<number>;
  readonly y: ArrayLike<number>;
  readonly side?: 'A' | 'B';
}

export interface XyCircle {
  readonly x: number;
  readonly y: number;
  readonly radius: number;
  readonly label?: string;
  readonly axis?: TraceAxis;
}

export interface XyPoint {
  readonly x: number;
  readonly y: number;
  readonly label: string;
  readonly axis?: TraceAxis;
}

export interface XyPlotProps {
  readonly label: string;
  readonly curves: readonly XyCurve[];
  readonly x: PlotAxis;
  readonly y: PlotAxis;
  /** One unit is as long upwards as sideways; the wanted range is widened on one side. */
  readonly equalScales?: boolean;
  readonly circles?: readonly XyCircle[];
  readonly points?: readonly XyPoint[];
  /** What stands at point `index` of a curve: "12.4 Hz, −0.5 + 0.2 j". Default: its two numbers. */
  readonly describe?: (curve: number, index: number) => string;
  readonly height?: number;
}

interface Cursor {
  readonly curve: number;
  readonly index: number;
}

const NEAR_PX = 40;
const ZOOM_STEP = 1.2;

/** Curves in the plane (Nyquist and the like); the cursor runs along a curve, the wheel zooms. */
export function XyPlot(props: XyPlotProps) {
  const words = useStore().texts.plot;
  const palette = useTheme().palette.value;
  const [cursor, setCursor] = useState<Cursor | null>(null);
  const [zoom, setZoom] = useState<{ x: PlotAxis; y: PlotAxis } | null>(null);
  const shown = useRef<{ area: PlotArea; x: PlotAxis; y: PlotAxis } | null>(null);

  const canvas = useCanvas(
    (pen, width, height) => {
      const area = areaIn(width, height);
      const wanted = zoom ?? props;
      const axes =
        props.equalScales === true ? equalised(area, wanted.x, wanted.y) : { x: wanted.x, y: wanted.y };
      shown.current = { area, ...axes };
      pen.fillStyle = palette.ground;
      pen.fillRect(0, 0, width, height);
      drawFrame(pen, area, axes.x, axes.y, palette, true);
      pen.save();
      pen.beginPath();
      pen.rect(area.left, area.top, area.width, area.height);
      pen.clip();
      const px = (value: number) => xToPx(area, axes.x, value);
      const py = (value: number) => yToPx(area, axes.y, value);
      for (const circle of props.circles ?? []) {
        pen.strokeStyle = colourOf(circle.axis ?? 'faint', palette);
        pen.setLineDash([]);
        pen.lineWidth = 1;
        pen.beginPath();
        const rx = Math.abs(px(circle.x + circle.radius) - px(circle.x));
        const ry = Math.abs(py(circle.y + circle.radius) - py(circle.y));
        pen.ellipse(px(circle.x), py(circle.y), rx, ry, 0, 0, 2 * Math.PI);
        pen.stroke();
        if (circle.label !== undefined) {
          pen.textAlign = 'center';
          pen.textBaseline = 'bottom';
          haloText(pen, circle.label, px(circle.x), py(circle.y) - ry - 2, palette, palette.faint);
        }
      }
      for (const side of ['B', 'A'] as const) {
        for (const curve of props.curves) {
          if ((curve.side ?? 'A') === side) strokeCurve(pen, curve, px, py, colourOf(curve.axis, palette));
        }
      }
      for (const point of props.points ?? []) {
        const colour = colourOf(point.axis ?? 'ink', palette);
        cross(pen, px(point.x), py(point.y), colour);
        pen.textAlign = 'left';
        pen.textBaseline = 'bottom';
        haloText(pen, point.label, px(point.x) + 6, py(point.y) - 3, palette, colour);
      }
      if (cursor !== null && props.curves[cursor.curve] !== undefined) {
        const { x, y } = props.curves[cursor.curve];
        pen.fillStyle = palette.accent;
        pen.beginPath();
        pen.arc(px(x[cursor.index]), py(y[cursor.index]), 4, 0, 2 * Math.PI);
        pen.fill();
      }
      pen.restore();
    },
    [props.curves, props.circles, props.points, props.x, props.y, props.height, palette, cursor, zoom],
  );

  const at = (event: MouseEvent): Cursor | null => {
    const box = canvas.current?.getBoundingClientRect();
    if (box === undefined || shown.current === null) return null;
    return nearest(props.curves, shown.current, event.clientX - box.left, event.clientY - box.top);
  };
  const wheel = (event: WheelEvent): void => {
    const box = canvas.current?.getBoundingClientRect();
    if (box === undefined || shown.current === null) return;
    event.preventDefault();
    const { area, x, y } = shown.current;
    const k = event.deltaY > 0 ? ZOOM_STEP : 1 / ZOOM_STEP;
    const sx = (event.clientX - box.left - area.left) / area.width;
    const sy = 1 - (event.clientY - box.top - area.top) / area.height;
    setZoom({ x: scaled(x, sx, k), y: scaled(y, sy, k) });
  };
  const press = (event: KeyboardEvent): void => {
    const next = movedCursor(event, cursor, props.curves);
    if (next === undefined) return;
    event.preventDefault();
    setCursor(next);
  };
  const text =
    cursor === null || props.curves[cursor.curve] === undefined
      ? ''
      : (props.describe?.(cursor.curve, cursor.index) ?? plainText(props.curves[cursor.curve], cursor.index));
  return (
    <figure class="plot">
      <figcaption class="plot-legend">
        <span class="plot-title">{props.label}</span>
        {props.curves.map((curve) => (
          <span class="plot-key" key={`${curve.label} ${curve.side ?? ''}`}>
            <LineSample axis={curve.axis} faded={curve.side === 'B'} thin={curve.side === 'B'} />
            {curve.label}
          </span>
        ))}
        <span class="plot-at faint">{text}</span>
      </figcaption>
      <div
        class="plot-body"
        style={{ height: `${props.height ?? 260}px` }}
        role="slider"
        tabIndex={0}
        aria-label={words.cursorOf(props.label)}
        aria-valuemin={0}
        aria-valuemax={Math.max(0, (props.curves[cursor?.curve ?? 0]?.x.length ?? 1) - 1)}
        aria-valuenow={cursor?.index ?? 0}
        aria-valuetext={text === '' ? words.noData : text}
        title={words.xyKeys}
        onKeyDown={press}
        onPointerMove={(event) => setCursor(at(event))}
        onPointerLeave={() => setCursor(null)}
        onWheel={wheel}
        onDblClick={() => setZoom(null)}
      >
        <canvas ref={canvas} aria-hidden="true" />
      </div>
    </figure>
  );
}

function plainText(curve: XyCurve, index: number): string {
  return `${curve.label}: ${readable(curve.x[index])}, ${readable(curve.y[index])}`;
}

function strokeCurve(
  pen: CanvasRenderingContext2D,
  curve: XyCurve,
  px: (value: number) => number,
  py: (value: number) => number,
  colour: string,
): void {
  pen.strokeStyle = colour;
  pen.globalAlpha = curve.side === 'B' ? 0.8 : 1;
  pen.lineWidth = curve.side === 'B' ? 1 : 1.75;
  pen.setLineDash([...dashOf(curve.axis)]);
  pen.beginPath();
  for (let i = 0; i < curve.x.length; i++) pen.lineTo(px(curve.x[i]), py(curve.y[i]));
  pen.stroke();
  pen.setLineDash([]);
  pen.globalAlpha = 1;
}

function cross(pen: CanvasRenderingContext2D, x: number, y: number, colour: string): void {
  pen.strokeStyle = colour;
  pen.lineWidth = 1.5;
  pen.beginPath();
  pen.moveTo(x - 4, y);
  pen.lineTo(x + 4, y);
  pen.moveTo(x, y - 4);
  pen.lineTo(x, y + 4);
  pen.stroke();
}

/** Widens one of the ranges about its middle until a unit is equally long on both. */
function equalised(area: PlotArea, x: PlotAxis, y: PlotAxis): { x: PlotAxis; y: PlotAxis } {
  const perX = (x.high - x.low) / area.width;
  const perY = (y.high - y.low) / area.height;
  return perX > perY ? { x, y: scaled(y, 0.5, perX / perY) } : { x: scaled(x, 0.5, perY / perX), y };
}

function scaled(axis: PlotAxis, about: number, factor: number): PlotAxis {
  const low = valueAt(axis, about - about * factor);
  const high = valueAt(axis, about + (1 - about) * factor);
  return { ...axis, low, high };
}

function nearest(
  curves: readonly XyCurve[],
  shown: { area: PlotArea; x: PlotAxis; y: PlotAxis },
  mouseX: number,
  mouseY: number,
): Cursor | null {
  const { area } = shown;
  const targetX = (mouseX - area.left) / area.width;
  const targetY = 1 - (mouseY - area.top) / area.height;
  let best: Cursor | null = null;
  let least = NEAR_PX ** 2;
  curves.forEach((curve, c) => {
    for (let i = 0; i < curve.x.length; i++) {
      const dx = (shareOf(shown.x, curve.x[i]) - targetX) * area.width;
      const dy = (shareOf(shown.y, curve.y[i]) - targetY) * area.height;
      const distance = dx * dx + dy * dy;
      if (distance < least) {
        least = distance;
        best = { curve: c, index: i };
      }
    }
  });
  return best;
}

/** Undefined: not a key of the plot's. */
function movedCursor(
  event: KeyboardEvent,
  now: Cursor | null,
  curves: readonly XyCurve[],
): Cursor | null | undefined {
  const { curve, index } = now ?? { curve: 0, index: 0 };
  const length = curves[curve]?.x.length ?? 0;
  if (length === 0) return undefined;
  const step = event.shiftKey ? 1 : Math.max(1, Math.round(length / 50));
  const on = (to: number) => ({ curve, index: Math.min(length - 1, Math.max(0, to)) });
  const other = (by: number): Cursor => {
    const to = (curve + by + curves.length) % curves.length;
    return { curve: to, index: Math.min(index, Math.max(0, curves[to].x.length - 1)) };
  };
  switch (event.key) {
    case 'ArrowRight':
      return on(index + step);
    case 'ArrowLeft':
      return on(index - step);
    case 'ArrowUp':
      return other(-1);
    case 'ArrowDown':
      return other(1);
    case 'Home':
      return on(0);
    case 'End':
      return on(length - 1);
    case 'Escape':
      return now === null ? undefined : null;
    default:
      return undefined;
  }
}
