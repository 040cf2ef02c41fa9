import type { Signal } from '@preact/signals';
import { useEffect, useRef, useState } from 'preact/hooks';
import uPlot from 'uplot';
import 'uplot/dist/uPlot.min.css';
import { useStore, useTheme } from '../store/context.ts';
import type { Palette } from '../store/theme.ts';
import { readable } from '../store/units.ts';
import { axisTitle, haloText, PLOT_FONT } from './frame.ts';
import { LineSample } from './LineSample.tsx';
import { colourOf, dashOf, hatchPattern, type TraceAxis } from './lineStyle.ts';

type Numbers = Float64Array | Float32Array | readonly number[];

export interface PlotSeries {
  readonly label: string;
  readonly axis: TraceAxis;
  readonly values: Numbers;
  /** Its own abscissas, ascending; absent: the plot's. */
  readonly x?: Numbers;
  /** B is drawn thinner and lighter under A. */
  readonly side?: 'A' | 'B';
  /** Measured: dots, without a line between them. */
  readonly dots?: boolean;
  /** Shown in the read-out; default 4 significant digits. */
  readonly digits?: number;
}

export interface PlotSpan {
  readonly from: number;
  readonly to: number;
  /** gust: shaded; saturated: hatched; used: a bar along the foot. */
  readonly kind: 'gust' | 'saturated' | 'used';
  readonly label?: string;
}

export interface PlotMarker {
  readonly label: string;
  /** A line at this x, or at this y. */
  readonly x?: number;
  readonly y?: number;
  readonly axis?: TraceAxis;
}

export interface LinePlotProps {
  /** Says what is plotted; the screen reader's name. */
  readonly label: string;
  readonly x: Numbers;
  readonly series: readonly PlotSeries[];
  readonly xLabel: string;
  readonly xUnit: string;
  readonly yLabel: string;
  readonly yUnit: string;
  readonly logX?: boolean;
  readonly logY?: boolean;
  readonly xRange?: readonly [number, number];
  readonly yRange?: readonly [number, number];
  readonly spans?: readonly PlotSpan[];
  readonly markers?: readonly PlotMarker[];
  /** Shared by plots over the same abscissa, so that their cursors go together. */
  readonly cursor?: Signal<number | null>;
  /** CSS pixels; default 180. */
  readonly height?: number;
  readonly noLegend?: boolean;
}

const FAR_STEP = 0.02;

/** Lines over a common abscissa, with a cursor that mouse and keyboard move and a read-out of every line. */
export function LinePlot(props: LinePlotProps) {
  const words = useStore().texts.plot;
  const palette = useTheme().palette.value;
  const host = useRef<HTMLDivElement>(null);
  const plot = useRef<uPlot | null>(null);
  const latest = useRef(props);
  latest.current = props;
  const [index, setIndex] = useState<number | null>(null);
  const shape = JSON.stringify([
    props.series.map(({ label, axis, side, dots }) => [label, axis, side, dots]),
    [
      props.logX,
      props.logY,
      props.xRange,
      props.yRange,
      props.xLabel,
      props.xUnit,
      props.yLabel,
      props.yUnit,
    ],
  ]);
  const empty = props.x.length === 0 || props.series.length === 0;

  useEffect(() => {
    if (host.current === null || empty) return;
    const made = makePlot(host.current, latest, palette, (at) => {
      setIndex(at);
      const shared = latest.current.cursor;
      if (shared !== undefined) shared.value = at === null ? null : (made.data[0][at] ?? null);
    });
    plot.current = made;
    const parent = host.current;
    const observer = new ResizeObserver(() => {
      if (parent.clientWidth > 0)
        made.setSize({ width: parent.clientWidth, height: heightOf(latest.current) });
    });
    observer.observe(parent);
    return () => {
      observer.disconnect();
      made.destroy();
      plot.current = null;
    };
  }, [shape, palette, empty]);

  useEffect(() => {
    plot.current?.setData(aligned(props));
  }, [props.x, props.series]);
  useEffect(() => {
    plot.current?.redraw(false);
  }, [props.spans, props.markers]);
  useEffect(() => {
    const parent = host.current;
    if (parent !== null) plot.current?.setSize({ width: parent.clientWidth, height: heightOf(props) });
  }, [props.height]);
  useEffect(
    () =>
      props.cursor?.subscribe((x) => {
        const shown = plot.current;
        if (shown !== null && x !== (shown.data[0][shown.cursor.idx ?? -1] ?? null)) showCursor(shown, x);
      }),
    [props.cursor],
  );

  const press = (event: KeyboardEvent): void => {
    const shown = plot.current;
    if (shown === null) return;
    const last = shown.data[0].length - 1;
    const step = event.shiftKey ? 1 : Math.max(1, Math.round(last * FAR_STEP));
    const now = shown.cursor.idx ?? index ?? 0;
    const to =
      event.key === 'ArrowRight'
        ? now + step
        : event.key === 'ArrowLeft'
          ? now - step
          : event.key === 'Home'
            ? 0
            : event.key === 'End'
              ? last
              : null;
    if (event.key === 'Escape' && index !== null) showCursor(shown, null);
    else if (to !== null) showCursor(shown, shown.data[0][Math.min(last, Math.max(0, to))]);
    else return;
    event.preventDefault();
  };

  const data = index === null ? null : plot.current?.data;
  const readX = data ? `${readable(Number(data[0][index ?? 0]))} ${props.xUnit}` : '';
  const spoken = data
    ? `${readX}: ${props.series.map((one, i) => `${one.label} ${valueText(data[i + 1]?.[index ?? 0], one)}`).join(', ')}`
    : words.noData;
  return (
    <figure class="plot">
      {props.noLegend ? null : (
        <figcaption class="plot-legend">
          <span class="plot-title">{props.label}</span>
          {props.series.map((one, i) => (
            <span class="plot-key" key={`${one.label} ${one.side ?? ''}`}>
              <LineSample axis={one.axis} faded={one.side === 'B'} thin={one.side === 'B'} />
              {one.label}
              <span class="plot-value">{data ? valueText(data[i + 1]?.[index ?? 0], one) : ''}</span>
            </span>
          ))}
          <span class="plot-at faint">{data ? `${props.xLabel} ${readX}` : ''}</span>
        </figcaption>
      )}
      <div
        class="plot-body"
        style={{ minHeight: `${heightOf(props)}px` }}
        role="slider"
        tabIndex={0}
        aria-label={words.cursorOf(props.label)}
        aria-valuemin={0}
        aria-valuemax={Math.max(0, props.x.length - 1)}
        aria-valuenow={index ?? 0}
        aria-valuetext={spoken}
        title={words.keys}
        onKeyDown={press}
      >
        {empty ? <p class="plot-empty faint">{words.noData}</p> : <div ref={host} class="plot-host" />}
      </div>
    </figure>
  );
}

function heightOf(props: LinePlotProps): number {
  return props.height ?? 180;
}

function valueText(value: number | null | undefined, series: PlotSeries): string {
  return value === null || value === undefined ? '–' : readable(value, series.digits ?? 4);
}

function showCursor(plot: uPlot, x: number | null): void {
  if (x === null) plot.setCursor({ left: -10, top: -10 });
  else plot.setCursor({ left: plot.valToPos(x, 'x'), top: plot.over.clientHeight / 2 });
}

/** Series with abscissas of their own are joined onto the union of all abscissas. */
function aligned(props: LinePlotProps): uPlot.AlignedData {
  const table = (x: Numbers, ...columns: Numbers[]) => [x, ...columns] as unknown as uPlot.AlignedData;
  if (props.series.every(({ x }) => x === undefined)) {
    return table(props.x, ...props.series.map(({ values }) => values));
  }
  const shared = props.series.filter(({ x }) => x === undefined).map(({ values }) => values);
  const tables = [table(props.x, ...shared)];
  const order: number[] = [];
  let nextShared = 1;
  let nextOwn = 1 + shared.length;
  for (const one of props.series) {
    if (one.x === undefined) order.push(nextShared++);
    else {
      tables.push(table(one.x, one.values));
      order.push(nextOwn++);
    }
  }
  const joined = uPlot.join(tables);
  return [joined[0], ...order.map((place) => joined[place])] as uPlot.AlignedData;
}

function makePlot(
  host: HTMLElement,
  latest: { readonly current: LinePlotProps },
  palette: Palette,
  onCursor: (index: number | null) => void,
): uPlot {
  const props = latest.current;
  const axis = (title: string, side: 0 | 1): uPlot.Axis => ({
    label: side === 1 ? undefined : title,
    labelFont: PLOT_FONT,
    labelSize: 16,
    labelGap: 0,
    font: PLOT_FONT,
    stroke: palette.faint,
    size: side === 1 ? 54 : 26,
    gap: 3,
    grid: { stroke: palette.line, width: 1 },
    ticks: { stroke: palette.line, width: 1, size: 4 },
    values: (_plot, splits) => splits.map((value) => (value === null ? '' : readable(value, 4))),
  });
  const ends = (range: readonly [number, number] | undefined): [number, number] | undefined =>
    range === undefined ? undefined : [range[0], range[1]];
  return new uPlot(
    {
      width: Math.max(50, host.clientWidth),
      height: heightOf(props),
      legend: { show: false },
      padding: [18, 10, 0, 0],
      cursor: {
        y: false,
        drag: { x: false, y: false },
        points: { size: 6 },
      },
      scales: {
        x: { time: false, distr: props.logX ? 3 : 1, range: ends(props.xRange) ?? null },
        y: { distr: props.logY ? 3 : 1, range: ends(props.yRange) ?? null },
      } as uPlot.Scales,
      axes: [
        axis(axisTitle({ label: props.xLabel, unit: props.xUnit }), 0),
        axis(axisTitle({ label: props.yLabel, unit: props.yUnit }), 1),
      ],
      series: [
        {},
        ...props.series.map((one): uPlot.Series => ({
          label: one.label,
          stroke: colourOf(one.axis, palette),
          width: one.dots === true ? 0 : one.side === 'B' ? 1 : 1.75,
          alpha: one.side === 'B' ? 0.8 : 1,
          dash: [...dashOf(one.axis)],
          spanGaps: true,
          points:
            one.dots === true
              ? { show: true, size: 4.5, fill: colourOf(one.axis, palette) }
              : { show: false },
        })),
      ],
      hooks: {
        drawClear: [(plot) => drawSpans(plot, latest.current.spans ?? [], palette)],
        draw: [(plot) => drawMarkers(plot, latest.current, palette)],
        setCursor: [(plot) => onCursor(plot.cursor.idx ?? null)],
      },
    },
    aligned(props),
    host,
  );
}

function drawSpans(plot: uPlot, spans: readonly PlotSpan[], palette: Palette): void {
  const pen = plot.ctx;
  const { left, top, width, height } = plot.bbox;
  pen.save();
  for (const { from, to, kind, label } of spans) {
    const x0 = Math.max(left, plot.valToPos(from, 'x', true));
    const x1 = Math.min(left + width, plot.valToPos(to, 'x', true));
    if (!(x1 > x0)) continue;
    if (kind === 'used') {
      pen.fillStyle = palette.accent;
      pen.fillRect(x0, top + height - 4 * devicePixelRatio, x1 - x0, 4 * devicePixelRatio);
    } else {
      pen.fillStyle = kind === 'gust' ? palette.gust : hatchPattern(pen, palette.line);
      pen.fillRect(x0, top, x1 - x0, height);
    }
    if (label !== undefined) {
      pen.font = plotFont();
      pen.fillStyle = palette.faint;
      pen.textAlign = 'left';
      pen.textBaseline = 'top';
      pen.fillText(label, x0 + 3 * devicePixelRatio, top + 2 * devicePixelRatio);
    }
  }
  pen.restore();
}

function drawMarkers(plot: uPlot, props: LinePlotProps, palette: Palette): void {
  const pen = plot.ctx;
  const { left, top, width, height } = plot.bbox;
  const ratio = devicePixelRatio;
  pen.save();
  pen.font = plotFont();
  // The name of the upright axis stands above it, level, so that it reads.
  pen.fillStyle = palette.faint;
  pen.textAlign = 'left';
  pen.textBaseline = 'top';
  pen.fillText(axisTitle({ label: props.yLabel, unit: props.yUnit }), 4 * ratio, 1 * ratio);
  for (const { x, y, label, axis } of props.markers ?? []) {
    pen.lineWidth = ratio;
    const colour = colourOf(axis ?? 'ink', palette);
    pen.strokeStyle = colour;
    pen.beginPath();
    if (x !== undefined) {
      const px = plot.valToPos(x, 'x', true);
      if (px < left || px > left + width) continue;
      pen.moveTo(px, top);
      pen.lineTo(px, top + height);
      pen.stroke();
      pen.textBaseline = 'top';
      pen.textAlign = px > left + width * 0.7 ? 'right' : 'left';
      haloText(
        pen,
        label,
        px + (pen.textAlign === 'left' ? 4 : -4) * ratio,
        top + 3 * ratio,
        palette,
        colour,
      );
    } else if (y !== undefined) {
      const py = plot.valToPos(y, 'y', true);
      if (py < top || py > top + height) continue;
      pen.moveTo(left, py);
      pen.lineTo(left + width, py);
      pen.stroke();
      pen.textAlign = 'right';
      pen.textBaseline = 'bottom';
      haloText(pen, label, left + width - 4 * ratio, py - 2 * ratio, palette, colour);
    }
  }
  pen.restore();
}

function plotFont(): string {
  return PLOT_FONT.replace('12px', `${12 * devicePixelRatio}px`);
}
