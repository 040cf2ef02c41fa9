import { useEffect, useMemo, useRef } from 'preact/hooks';
import { useStore, useTheme } from '../store/context.ts';
import { readable } from '../store/units.ts';
import { LineSample } from './LineSample.tsx';
import { firstRowAfter, newestTime_s, oldestTime_s, type SignalRing } from './ring.ts';
import { TapePainter, type TapeLane } from './tapePainter.ts';

export interface TapeProps {
  readonly label: string;
  readonly ring: SignalRing;
  readonly lanes: readonly TapeLane[];
  /** Seconds from edge to edge. */
  readonly span_s: number;
  /** Shaded while this channel is above one half (a gust). */
  readonly shadeChannel?: number;
  /** Time at the right edge: null follows the newest row. */
  readonly at_s: number | null;
  /** The person moved the tape; null: back to live. */
  readonly onSeek: (time_s: number | null) => void;
  /** Enter on the tape: go on from here. */
  readonly onResume?: () => void;
  /** Time shown as "now" while live, when it is known better than by the newest row. */
  readonly now_s?: () => number;
}

/** Values beside the lanes are written this often. */
const READ_OUT_MS = 100;
const KEY_STEP_S = 0.25;
const FINE_STEP_S = 0.01;

/**
 * The tape: lanes of signals over time, flowing from right to left. Dragging it to the right goes back in time.
 * Draws each new column once; idle when nothing changes.
 */
export function Tape(props: TapeProps) {
  const words = useStore().texts.plot;
  const theme = useTheme();
  const palette = theme.palette.value;
  const canvas = useRef<HTMLCanvasElement>(null);
  const host = useRef<HTMLDivElement>(null);
  const gutter = useRef<HTMLDivElement>(null);
  const latest = useRef(props);
  latest.current = props;
  const hover_s = useRef<number | null>(null);
  const { lanes, shadeChannel } = props;

  useEffect(() => {
    if (canvas.current === null || host.current === null || gutter.current === null) return;
    return runTape(
      canvas.current,
      host.current,
      gutter.current,
      latest,
      hover_s,
      palette,
      words.live,
      words.pausedAt,
    );
  }, [lanes, shadeChannel, palette]);

  const drag = useRef<{ x: number; end_s: number } | null>(null);
  const perPixel_s = () => props.span_s / Math.max(1, canvas.current?.clientWidth ?? 1);
  const shownEnd_s = () => endOf(latest.current);
  const seek = (time_s: number): void => {
    const newest = newestTime_s(props.ring);
    const oldest = oldestTime_s(props.ring);
    if (newest === null || oldest === null) return;
    props.onSeek(time_s >= newest ? null : Math.max(oldest, time_s));
  };
  const move = (event: PointerEvent): void => {
    const box = canvas.current?.getBoundingClientRect();
    if (box === undefined) return;
    if (drag.current === null) hover_s.current = shownEnd_s() - (box.right - event.clientX) * perPixel_s();
    else seek(drag.current.end_s - (event.clientX - drag.current.x) * perPixel_s());
  };
  const press = (event: KeyboardEvent): void => {
    const step = event.shiftKey ? FINE_STEP_S : KEY_STEP_S;
    if (event.key === 'ArrowLeft') seek(shownEnd_s() - step);
    else if (event.key === 'ArrowRight') seek(shownEnd_s() + step);
    else if (event.key === 'Home') seek(-Infinity);
    else if (event.key === 'End') props.onSeek(null);
    else if (event.key === 'Enter' && props.onResume !== undefined) props.onResume();
    else return;
    event.preventDefault();
    event.stopPropagation();
  };
  const rows = useMemo(() => lanes.map((lane) => ({ lane, key: lane.label })), [lanes]);
  return (
    <div class="tape" ref={host}>
      <div class="tape-gutter" ref={gutter}>
        {rows.map(({ lane, key }) => (
          <div class="tape-lane" key={key}>
            <div class="tape-lane-head">
              <strong>{lane.label}</strong> <span class="unit">{lane.unit}</span>
              <span class="tape-scale small faint" />
            </div>
            <ul class={lane.traces.length > 1 ? 'pairs' : undefined}>
              {lane.traces.map((trace) => (
                <li key={trace.channel}>
                  <LineSample axis={trace.axis} faded={trace.behind} />
                  <span class="tape-trace">{trace.label}</span>
                  <span class="tape-value" />
                </li>
              ))}
            </ul>
          </div>
        ))}
      </div>
      <div
        class="tape-paper"
        role="slider"
        tabIndex={0}
        aria-label={props.label}
        aria-valuemin={0}
        aria-valuemax={0}
        aria-valuenow={0}
        title={words.tapeKeys}
        onKeyDown={press}
        onPointerDown={(event) => {
          if (event.button !== 0) return;
          event.currentTarget.setPointerCapture(event.pointerId);
          drag.current = { x: event.clientX, end_s: shownEnd_s() };
          hover_s.current = null;
        }}
        onPointerMove={move}
        onPointerUp={() => {
          drag.current = null;
        }}
        onPointerCancel={() => {
          drag.current = null;
        }}
        onPointerLeave={() => {
          hover_s.current = null;
        }}
        onWheel={(event) => {
          if (event.deltaX === 0) return;
          event.preventDefault();
          seek(shownEnd_s() + event.deltaX * perPixel_s());
        }}
      >
        <canvas ref={canvas} aria-hidden="true" />
      </div>
    </div>
  );
}

function endOf(props: TapeProps): number {
  if (props.at_s !== null) return props.at_s;
  const newest = newestTime_s(props.ring) ?? 0;
  return props.now_s === undefined ? newest : Math.min(newest, props.now_s());
}

/** Draws while mounted; returns the end of it. */
function runTape(
  canvas: HTMLCanvasElement,
  host: HTMLElement,
  gutter: HTMLElement,
  latest: { readonly current: TapeProps },
  hover_s: { readonly current: number | null },
  palette: ConstructorParameters<typeof TapePainter>[3],
  live: string,
  pausedAt: (time: string) => string,
): () => void {
  const { lanes, shadeChannel = null } = latest.current;
  const painter = new TapePainter(canvas, lanes, shadeChannel, palette);
  const paper = canvas.parentElement ?? host;
  let sized = false;
  let last = '';
  let unread = true;
  let readOutAt_ms = 0;
  let frame = 0;
  const size = () => {
    if (paper.clientWidth === 0 || paper.clientHeight === 0) return;
    painter.configure(lanes, shadeChannel, palette, paper.clientWidth, paper.clientHeight, devicePixelRatio);
    placeGutter(gutter, painter);
    sized = true;
    last = '';
  };
  const observer = new ResizeObserver(size);
  observer.observe(paper);
  size();
  const tick = (now_ms: number) => {
    frame = requestAnimationFrame(tick);
    if (!sized) return;
    const { ring, span_s, at_s } = latest.current;
    const end_s = endOf(latest.current);
    const state = `${end_s} ${span_s} ${ring.written} ${ring.epoch} ${hover_s.current}`;
    if (state !== last) {
      last = state;
      unread = true;
      if (painter.draw(ring, { end_s, span_s }, hover_s.current)) placeGutter(gutter, painter);
    }
    if (!unread || now_ms - readOutAt_ms < READ_OUT_MS) return;
    unread = false;
    readOutAt_ms = now_ms;
    writeValues(gutter, lanes, painter.laneBoxes(), ring, hover_s.current ?? end_s);
    paper.setAttribute('aria-valuemin', (oldestTime_s(ring) ?? 0).toFixed(2));
    paper.setAttribute('aria-valuemax', (newestTime_s(ring) ?? 0).toFixed(2));
    paper.setAttribute('aria-valuenow', end_s.toFixed(2));
    paper.setAttribute('aria-valuetext', at_s === null ? live : pausedAt(`${end_s.toFixed(2)} s`));
  };
  frame = requestAnimationFrame(tick);
  return () => {
    cancelAnimationFrame(frame);
    observer.disconnect();
  };
}

function placeGutter(gutter: HTMLElement, painter: TapePainter): void {
  painter.laneBoxes().forEach(({ top, height, low, high }, i) => {
    const row = gutter.children[i];
    if (!(row instanceof HTMLElement)) return;
    row.style.top = `${top}px`;
    row.style.height = `${height}px`;
    const scale = row.querySelector('.tape-scale');
    if (scale !== null) {
      scale.textContent =
        low === -high ? `±${readable(high, 3)}` : `${readable(low, 4)}–${readable(high, 4)}`;
    }
  });
}

function writeValues(
  gutter: HTMLElement,
  lanes: readonly TapeLane[],
  scales: readonly { readonly low: number; readonly high: number }[],
  ring: SignalRing,
  time_s: number,
): void {
  const row = firstRowAfter(ring, time_s) - 1;
  const cells = gutter.querySelectorAll('.tape-value');
  let n = 0;
  lanes.forEach((lane, i) => {
    const { low, high } = scales[i];
    for (const trace of lane.traces) {
      const value = row < ring.first ? NaN : ring.channels[trace.channel][row % ring.capacity];
      cells[n++].textContent = toScale(value, high - low);
    }
  });
}

/** A value to about a thousandth of its lane, so that its digits do not dance. */
function toScale(value: number, span: number): string {
  if (!Number.isFinite(value)) return '–';
  const text = value.toFixed(Math.max(0, Math.min(6, 2 - Math.floor(Math.log10(span)))));
  return Number(text) === 0 ? text.replace('-', '') : text.replace('-', '−');
}
