/**
 * Draws the tape. Each pixel column stands for a fixed bin of time and is drawn once, into a strip that is used
 * as a ring; a frame draws the few new columns and shows the strip in two pieces. A column shows the least and
 * the greatest value of its bin, so that no peak is lost between pixels.
 */
import type { Palette } from '../store/theme.ts';
import { colourOf, dashOf, HATCH_PX, hatchPattern, type TraceAxis } from './lineStyle.ts';
import { firstRowAfter, newestTime_s, type SignalRing } from './ring.ts';

export interface TapeTrace {
  readonly label: string;
  /** Channel of the ring. */
  readonly channel: number;
  readonly axis: TraceAxis;
  /** Drawn behind and faded: what the others are compared with (a setpoint, a raw gyro). */
  readonly behind?: boolean;
}

export interface TapeLane {
  readonly label: string;
  readonly unit: string;
  readonly traces: readonly TapeTrace[];
  /** Fixed ends of the lane; absent: symmetric about zero, by what is in view. */
  readonly range?: readonly [low: number, high: number];
  /** A free scale never shows less than ± this. */
  readonly leastScale?: number;
  /** Hatched while any of these channels is above one half. */
  readonly saturation?: readonly number[];
  /** Height in shares of the others' (1). */
  readonly weight?: number;
}

export interface TapeView {
  readonly end_s: number;
  readonly span_s: number;
}

export interface LaneBox {
  readonly top: number;
  readonly height: number;
}

const MOST_ROWS_A_COLUMN = 4096;
const LANE_PAD = 3;
/** A lane's scale shrinks only when its traces need less than this share of it. */
const SHRINK_BELOW = 0.35;
const FOOT_PX = 18;

export class TapePainter {
  private readonly context: CanvasRenderingContext2D;
  private readonly strip: HTMLCanvasElement;
  private readonly pen: CanvasRenderingContext2D;
  private width = HATCH_PX;
  private height = 1;
  private ratio = 1;
  private hatch: CanvasPattern | string = '#888';
  private boxes: LaneBox[] = [];
  private scales: [low: number, high: number][] = [];
  /** Least and greatest per lane and column, ring-wise; for the scale. */
  private least: Float32Array[] = [];
  private greatest: Float32Array[] = [];
  /** Columns [drawnFrom, drawnTo) stand in the strip. */
  private drawnFrom = 0;
  private drawnTo = 0;
  private perSecond = 0;
  private epoch = -1;
  /** Scratch: first row of each column of the run being drawn. */
  private starts = new Float64Array(1);

  /** @throws Error when the canvas has no 2D context. */
  constructor(
    private readonly canvas: HTMLCanvasElement,
    private lanes: readonly TapeLane[],
    private shadeChannel: number | null,
    private palette: Palette,
  ) {
    this.strip = document.createElement('canvas');
    const context = canvas.getContext('2d', { alpha: false });
    const pen = this.strip.getContext('2d', { alpha: false });
    if (context === null || pen === null) throw new Error('no 2D canvas here');
    this.context = context;
    this.pen = pen;
  }

  /** Sizes in CSS pixels. */
  configure(
    lanes: readonly TapeLane[],
    shadeChannel: number | null,
    palette: Palette,
    width_px: number,
    height_px: number,
    ratio: number,
  ): void {
    this.lanes = lanes;
    this.shadeChannel = shadeChannel;
    this.palette = palette;
    this.ratio = ratio;
    this.width = Math.max(HATCH_PX, Math.floor((width_px * ratio) / HATCH_PX) * HATCH_PX);
    this.height = Math.max(1, Math.round(height_px * ratio));
    for (const canvas of [this.canvas, this.strip]) {
      canvas.width = this.width;
      canvas.height = this.height;
    }
    this.canvas.style.width = `${this.width / ratio}px`;
    this.canvas.style.height = `${this.height / ratio}px`;
    this.hatch = hatchPattern(this.pen, palette.faint);
    this.boxes = layLanes(lanes, this.height - FOOT_PX * ratio);
    this.scales = lanes.map((lane) => (lane.range === undefined ? [-1, 1] : [lane.range[0], lane.range[1]]));
    this.least = lanes.map(() => new Float32Array(this.width));
    this.greatest = lanes.map(() => new Float32Array(this.width));
    this.starts = new Float64Array(this.width + 1);
    this.forget();
  }

  /** Lane places in CSS pixels, and what their ends stand for now. */
  laneBoxes(): readonly (LaneBox & { readonly low: number; readonly high: number })[] {
    return this.boxes.map(({ top, height }, i) => ({
      top: top / this.ratio,
      height: height / this.ratio,
      low: this.scales[i][0],
      high: this.scales[i][1],
    }));
  }

  /** Draws the view. `marker_s` puts a line at that time. Returns whether a lane's scale changed. */
  draw(ring: SignalRing, view: TapeView, marker_s: number | null): boolean {
    const perSecond = this.width / view.span_s;
    if (perSecond !== this.perSecond || ring.epoch !== this.epoch) {
      this.perSecond = perSecond;
      this.epoch = ring.epoch;
      this.forget();
    }
    const to = Math.floor(view.end_s * perSecond) + 1;
    this.drawMissing(ring, to - this.width, to);
    const rescaled = this.rescale(to - this.width, to);
    if (rescaled) {
      this.forget();
      this.drawMissing(ring, to - this.width, to);
    }
    this.show(view, to, marker_s);
    return rescaled;
  }

  private forget(): void {
    this.drawnFrom = 0;
    this.drawnTo = 0;
  }

  /** Draws those columns of [from, to) that the strip does not hold. */
  private drawMissing(ring: SignalRing, from: number, to: number): void {
    const overlap = this.drawnTo > this.drawnFrom && from < this.drawnTo && to > this.drawnFrom;
    if (!overlap) this.drawRun(ring, from, to);
    else {
      if (from < this.drawnFrom) this.drawRun(ring, from, this.drawnFrom);
      if (to > this.drawnTo) this.drawRun(ring, this.drawnTo, to);
    }
    // A column whose bin is not over yet is drawn again next time.
    const newest = newestTime_s(ring);
    const complete = newest === null ? from : Math.floor(newest * this.perSecond);
    this.drawnFrom = from;
    this.drawnTo = Math.max(from, Math.min(to, complete));
  }

  /** Columns [from, to), at most one strip long, in pieces that do not cross the strip's seam. */
  private drawRun(ring: SignalRing, from: number, to: number): void {
    let start = from;
    while (start < to) {
      const x = modulo(start, this.width);
      const count = Math.min(to - start, this.width - x);
      this.drawPiece(ring, start, count, x);
      start += count;
    }
  }

  private drawPiece(ring: SignalRing, start: number, count: number, x: number): void {
    const { pen, palette } = this;
    pen.fillStyle = palette.ground;
    pen.fillRect(x, 0, count, this.height);
    this.findStarts(ring, start, count);
    if (this.shadeChannel !== null)
      this.fillSpans(ring, [this.shadeChannel], count, x, 0, this.boxesEnd(), palette.gust);
    this.drawGrid(start, count, x);
    this.lanes.forEach((lane, i) => {
      const box = this.boxes[i];
      if (lane.saturation !== undefined) {
        this.fillSpans(ring, lane.saturation, count, x, box.top, box.height, this.hatch);
      }
      this.least[i].fill(Infinity, x, x + count);
      this.greatest[i].fill(-Infinity, x, x + count);
      for (const trace of lane.traces)
        if (trace.behind === true) this.drawTrace(ring, trace, i, start, count, x);
      for (const trace of lane.traces)
        if (trace.behind !== true) this.drawTrace(ring, trace, i, start, count, x);
    });
  }

  /** For each column of a piece, the first row whose time is at or after the column's start. */
  private findStarts(ring: SignalRing, start: number, count: number): void {
    const tiny = 1e-9;
    let row = firstRowAfter(ring, start / this.perSecond - tiny);
    this.starts[0] = row;
    for (let k = 1; k <= count; k++) {
      const until = (start + k) / this.perSecond - tiny;
      let seen = 0;
      while (row < ring.written && ring.time_s[row % ring.capacity] <= until) {
        row++;
        // Long gaps in pixels (a wide span): jump instead of walking.
        if (++seen > MOST_ROWS_A_COLUMN) {
          row = firstRowAfter(ring, until);
          break;
        }
      }
      this.starts[k] = row;
    }
  }

  /** Fills the columns in which any of `channels` is above one half. */
  private fillSpans(
    ring: SignalRing,
    channels: readonly number[],
    count: number,
    x: number,
    top: number,
    height: number,
    style: CanvasPattern | string,
  ): void {
    const { pen } = this;
    pen.fillStyle = style;
    let begun = -1;
    for (let k = 0; k <= count; k++) {
      const on = k < count && this.columnIsOn(ring, channels, k);
      if (on && begun < 0) begun = k;
      if (!on && begun >= 0) {
        pen.fillRect(x + begun, top, k - begun, height);
        begun = -1;
      }
    }
  }

  private columnIsOn(ring: SignalRing, channels: readonly number[], k: number): boolean {
    const first = this.starts[k];
    // A bin without a row of its own shows the row before it.
    const from = this.starts[k + 1] > first ? first : Math.max(ring.first, first - 1);
    const to = Math.min(ring.written, Math.max(this.starts[k + 1], from + 1));
    if (first >= ring.written && this.starts[k + 1] >= ring.written && to <= from) return false;
    for (let row = from; row < to; row++) {
      const place = row % ring.capacity;
      for (const channel of channels) if (ring.channels[channel][place] > 0.5) return true;
    }
    return false;
  }

  private drawGrid(start: number, count: number, x: number): void {
    const { pen, palette } = this;
    const every_s = gridStep_s(this.width / this.perSecond);
    pen.fillStyle = palette.line;
    const first = Math.ceil(start / this.perSecond / every_s);
    for (let n = first; ; n++) {
      const column = Math.floor(n * every_s * this.perSecond + 1e-6);
      if (column >= start + count) break;
      if (column >= start) pen.fillRect(x + column - start, 0, 1, this.boxesEnd());
    }
    this.boxes.forEach(({ top, height }, i) => {
      pen.fillRect(x, top + height - 1, count, 1);
      const [low, high] = this.scales[i];
      if (low < 0 && high > 0) pen.fillRect(x, Math.round(this.yOf(i, 0)), count, 1);
    });
  }

  private drawTrace(
    ring: SignalRing,
    trace: TapeTrace,
    lane: number,
    start: number,
    count: number,
    x: number,
  ): void {
    const { pen, ratio } = this;
    const values = ring.channels[trace.channel];
    const thick = Math.max(1, (trace.behind === true ? 1 : 1.6) * ratio);
    const box = this.boxes[lane];
    const [low, high] = this.scales[lane];
    const perUnit = (box.height - 2 * LANE_PAD * ratio) / (high - low);
    const bottom = box.top + box.height - LANE_PAD * ratio;
    const dash = dashOf(trace.axis);
    const period = dash.length === 0 ? 0 : (dash[0] + dash[1]) * ratio;
    const on = dash.length === 0 ? 0 : dash[0] * ratio;
    const least = this.least[lane];
    const greatest = this.greatest[lane];
    pen.globalAlpha = trace.behind === true ? 0.5 : 1;
    pen.fillStyle = colourOf(trace.axis, this.palette);
    pen.beginPath();
    for (let k = 0; k < count; k++) {
      const from = this.starts[k];
      const to = this.starts[k + 1];
      const column = start + k;
      const a = this.valueAt(ring, values, from, column / this.perSecond);
      const b = this.valueAt(ring, values, to, (column + 1) / this.perSecond);
      let min = a < b || Number.isNaN(b) ? a : b;
      let max = a > b || Number.isNaN(b) ? a : b;
      if (Number.isNaN(min)) {
        min = b;
        max = b;
      }
      for (let row = from; row < to; row++) {
        const value = values[row % ring.capacity];
        if (value < min || Number.isNaN(min)) min = value;
        if (value > max || Number.isNaN(max)) max = value;
      }
      if (Number.isNaN(min)) continue;
      if (min < least[x + k]) least[x + k] = min;
      if (max > greatest[x + k]) greatest[x + k] = max;
      if (period !== 0 && modulo(column, period) >= on) continue;
      const yTop = Math.max(box.top, bottom - (max - low) * perUnit - thick / 2);
      const yEnd = Math.min(box.top + box.height, bottom - (min - low) * perUnit + thick / 2);
      if (yEnd > yTop) pen.rect(x + k, yTop, 1, yEnd - yTop);
    }
    pen.fill();
    pen.globalAlpha = 1;
  }

  /** Value at `time_s`, between row − 1 and `row`; NaN outside what is kept. */
  private valueAt(ring: SignalRing, values: Float32Array, row: number, time_s: number): number {
    if (row >= ring.written || row <= ring.first) return NaN;
    const before = (row - 1) % ring.capacity;
    const after = row % ring.capacity;
    const t0 = ring.time_s[before];
    const t1 = ring.time_s[after];
    if (t1 <= t0) return values[after];
    return values[before] + ((values[after] - values[before]) * (time_s - t0)) / (t1 - t0);
  }

  /** Adapts free scales to what is in view. */
  private rescale(from: number, to: number): boolean {
    let changed = false;
    this.lanes.forEach((lane, i) => {
      if (lane.range !== undefined) return;
      let peak = lane.leastScale ?? 0;
      for (let column = from; column < to; column++) {
        const place = modulo(column, this.width);
        if (this.greatest[i][place] > peak) peak = this.greatest[i][place];
        if (-this.least[i][place] > peak) peak = -this.least[i][place];
      }
      if (!Number.isFinite(peak) || peak === 0) return;
      const now = this.scales[i][1];
      if (peak > now || peak < now * SHRINK_BELOW) {
        const next = niceCeiling(peak * 1.05);
        if (next !== now) {
          this.scales[i] = [-next, next];
          changed = true;
        }
      }
    });
    return changed;
  }

  private yOf(lane: number, value: number): number {
    const box = this.boxes[lane];
    const [low, high] = this.scales[lane];
    const pad = LANE_PAD * this.ratio;
    return box.top + box.height - pad - ((value - low) / (high - low)) * (box.height - 2 * pad);
  }

  private boxesEnd(): number {
    return this.height - FOOT_PX * this.ratio;
  }

  private show(view: TapeView, to: number, marker_s: number | null): void {
    const { context, palette, ratio } = this;
    const seam = modulo(to, this.width);
    const rest = this.width - seam;
    context.drawImage(this.strip, seam, 0, rest, this.height, 0, 0, rest, this.height);
    if (seam > 0) context.drawImage(this.strip, 0, 0, seam, this.height, rest, 0, seam, this.height);
    context.fillStyle = palette.faint;
    context.font = `${12 * ratio}px system-ui, sans-serif`;
    context.textBaseline = 'bottom';
    const every_s = gridStep_s(view.span_s);
    const first = Math.ceil((to - this.width) / this.perSecond / every_s);
    for (let n = first; n * every_s < to / this.perSecond; n++) {
      if (n < 0) continue;
      const x = Math.floor(n * every_s * this.perSecond + 1e-6) - (to - this.width);
      const text = every_s < 1 ? (n * every_s).toFixed(1) : String(n * every_s);
      context.fillText(`${text} s`, x + 3 * ratio, this.height - 2 * ratio);
    }
    if (marker_s !== null) {
      const x = Math.round(marker_s * this.perSecond) - (to - this.width);
      context.fillStyle = palette.accent;
      context.fillRect(x, 0, Math.max(1, ratio), this.boxesEnd());
    }
  }
}

function layLanes(lanes: readonly TapeLane[], height: number): LaneBox[] {
  const total = lanes.reduce((sum, lane) => sum + (lane.weight ?? 1), 0);
  let top = 0;
  return lanes.map((lane) => {
    const share = Math.round((height * (lane.weight ?? 1)) / total);
    const box = { top, height: share };
    top += share;
    return box;
  });
}

function modulo(a: number, n: number): number {
  const rest = a % n;
  return rest < 0 ? rest + n : rest;
}

/** Seconds between grid lines, so that six to twelve are in view. */
function gridStep_s(span_s: number): number {
  return [0.1, 0.2, 0.5, 1, 2, 5, 10, 20, 60, 120].find((step) => span_s / step <= 12) ?? 300;
}

function niceCeiling(value: number): number {
  const power = 10 ** Math.floor(Math.log10(value));
  return ([1, 1.5, 2, 3, 4, 5, 7.5, 10].find((m) => m * power >= value) ?? 10) * power;
}
