/** Small line plots as SVG text for paper: black ink, lines told apart by dash and label, axes with units. */

export interface PlotLine {
  readonly label: string;
  readonly x: ArrayLike<number>;
  readonly y: ArrayLike<number>;
  /** SVG dash pattern; empty = solid. */
  readonly dash: string;
}

export interface PlotFrame {
  readonly title: string;
  readonly xLabel: string;
  readonly yLabel: string;
  readonly logX?: boolean;
  /** Level lines with a label, drawn thin. */
  readonly levels?: readonly { readonly y: number; readonly label: string }[];
}

/** Roll solid, pitch dashed, yaw dotted: readable without colour. */
export const AXIS_DASH = { roll: '', pitch: '6 3', yaw: '1.5 2.5' } as const;

const WIDTH = 340;
const HEIGHT = 160;
const LEFT = 46;
const RIGHT = 10;
const TOP = 22;
const BOTTOM = 34;
const MOST_POINTS = 400;

/** The plot, or a sentence in its place when a line holds nothing finite. */
export function linePlot(frame: PlotFrame, lines: readonly PlotLine[]): string {
  const usable = lines.filter((line) => finitePoints(line, frame.logX === true).length > 1);
  if (usable.length === 0) return `<p class="empty">${escapeHtml(frame.title)}: nothing to draw.</p>`;
  const points = usable.map((line) => finitePoints(line, frame.logX === true));
  const xs = points.flatMap((line) => line.map(([x]) => x));
  const ys = points
    .flatMap((line) => line.map(([, y]) => y))
    .concat((frame.levels ?? []).map((level) => level.y));
  const [x0, x1] = spread(Math.min(...xs), Math.max(...xs), 0);
  const [y0, y1] = spread(Math.min(...ys), Math.max(...ys), 0.06);
  const toX = (x: number) => LEFT + ((x - x0) / (x1 - x0)) * (WIDTH - LEFT - RIGHT);
  const toY = (y: number) => HEIGHT - BOTTOM - ((y - y0) / (y1 - y0)) * (HEIGHT - TOP - BOTTOM);
  const parts = [
    `<svg viewBox="0 0 ${WIDTH} ${HEIGHT}" role="img" aria-label="${escapeHtml(frame.title)}">`,
    `<text x="${LEFT}" y="13" class="t">${escapeHtml(frame.title)}</text>`,
    `<rect x="${LEFT}" y="${TOP}" width="${WIDTH - LEFT - RIGHT}" height="${HEIGHT - TOP - BOTTOM}" class="f"/>`,
  ];
  for (const tick of ticks(y0, y1)) {
    parts.push(
      `<line x1="${LEFT}" x2="${WIDTH - RIGHT}" y1="${f(toY(tick))}" y2="${f(toY(tick))}" class="g"/>`,
    );
    parts.push(
      `<text x="${LEFT - 4}" y="${f(toY(tick) + 3)}" class="n" text-anchor="end">${short(tick)}</text>`,
    );
  }
  for (const tick of frame.logX === true ? decades(x0, x1) : ticks(x0, x1)) {
    const label = frame.logX === true ? short(10 ** tick) : short(tick);
    parts.push(
      `<line y1="${TOP}" y2="${HEIGHT - BOTTOM}" x1="${f(toX(tick))}" x2="${f(toX(tick))}" class="g"/>`,
    );
    parts.push(
      `<text x="${f(toX(tick))}" y="${HEIGHT - BOTTOM + 11}" class="n" text-anchor="middle">${label}</text>`,
    );
  }
  for (const level of frame.levels ?? []) {
    parts.push(
      `<line x1="${LEFT}" x2="${WIDTH - RIGHT}" y1="${f(toY(level.y))}" y2="${f(toY(level.y))}" class="l"/>`,
    );
    parts.push(
      `<text x="${LEFT + 4}" y="${f(levelLabelY(toY(level.y)))}" class="n">${escapeHtml(level.label)}</text>`,
    );
  }
  points.forEach((line, index) => {
    const path = line.map(([x, y], i) => `${i === 0 ? 'M' : 'L'}${f(toX(x))} ${f(toY(y))}`).join('');
    parts.push(`<path d="${path}" class="s" stroke-dasharray="${usable[index].dash}"/>`);
    const lx = LEFT + 8 + index * 88;
    parts.push(
      `<line x1="${lx}" x2="${lx + 24}" y1="${HEIGHT - 6}" y2="${HEIGHT - 6}" class="s" stroke-dasharray="${usable[index].dash}"/>`,
    );
    parts.push(`<text x="${lx + 28}" y="${HEIGHT - 3}" class="n">${escapeHtml(usable[index].label)}</text>`);
  });
  parts.push(
    `<text x="${WIDTH - RIGHT}" y="${HEIGHT - 3}" class="n" text-anchor="end">${escapeHtml(frame.xLabel)}</text>`,
  );
  parts.push(
    `<text x="${WIDTH - RIGHT}" y="13" class="n" text-anchor="end">${escapeHtml(frame.yLabel)}</text>`,
  );
  parts.push('</svg>');
  return parts.join('');
}

/** Over its line, or under it where the frame's edge is too near. */
function levelLabelY(lineY: number): number {
  return lineY - TOP < 11 ? lineY + 9 : lineY - 2;
}

export function escapeHtml(text: string): string {
  return text.replace(/&/g, '&amp;').replace(/</g, '&lt;').replace(/>/g, '&gt;').replace(/"/g, '&quot;');
}

function finitePoints(line: PlotLine, logX: boolean): [number, number][] {
  const stride = Math.max(1, Math.ceil(line.x.length / MOST_POINTS));
  const points: [number, number][] = [];
  for (let i = 0; i < line.x.length; i += stride) {
    const x = logX ? Math.log10(line.x[i]) : line.x[i];
    if (Number.isFinite(x) && Number.isFinite(line.y[i])) points.push([x, line.y[i]]);
  }
  return points;
}

function spread(low: number, high: number, margin: number): [number, number] {
  const width = high - low || Math.max(1, Math.abs(high)) * 0.1;
  return [low - margin * width, low + width * (1 + margin)];
}

function ticks(low: number, high: number): number[] {
  const raw = (high - low) / 5;
  const power = 10 ** Math.floor(Math.log10(raw));
  const step = power * ([1, 2, 5, 10].find((one) => one * power >= raw) ?? 10);
  const out: number[] = [];
  for (let k = Math.ceil(low / step - 1e-9); k * step <= high + 1e-9 * step; k++) out.push(k * step);
  return out;
}

function decades(low: number, high: number): number[] {
  const out: number[] = [];
  for (let k = Math.ceil(low - 1e-9); k <= high + 1e-9; k++) out.push(k);
  return out.length >= 2 ? out : [low, high];
}

function f(value: number): string {
  return value.toFixed(1);
}

function short(value: number): string {
  return String(Number(value.toPrecision(3)));
}
