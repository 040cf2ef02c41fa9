/**
 * A sweep in the report: over two numbers the first two layers as SVG maps with the region that passes outlined
 * and the trade-off front marked; over one number a table.
 */
import { mapOf, type MapLayer, type SweepCells, type SweepMap } from './sweepResult.ts';

const CELL_PX = 14;
const LEFT_PX = 74;
const TOP_PX = 24;
const BOTTOM_PX = 44;
/** Light to dark blue, readable in grey. */
const RAMP = ['#eef4f8', '#cfe2ee', '#a6cae0', '#74abcf', '#3f88b8', '#0f6299', '#053f6b'];

/** HTML of the sweep; texts come from files that were checked, and are escaped by the caller's rule. */
export function sweepHtml(kept: SweepCells, escape: (text: string) => string): string {
  const map = mapOf(kept);
  const { sweep } = kept;
  const missing = kept.count - kept.done;
  const about = `<p>Trial ${escape(sweep.trial)}, ${kept.done} of ${kept.count} cells${missing === 0 ? '' : ' (not finished)'}.`;
  if (kept.rows === 1) return `${about}</p>${lineTable(kept, map, escape)}`;
  const panels = map.layers.slice(0, 2).map((layer) => panel(kept, map, layer, escape));
  return `${about} Outlined: every score within its band. Dots: the trade-off front, where neither layer gets better without the other getting worse. Crosses: the flight stopped or the values were refused.</p><div>${panels.join('')}</div>`;
}

function lineTable(kept: SweepCells, map: SweepMap, escape: (text: string) => string): string {
  const heads = map.layers.map((layer) => `<th class="n">${escape(`${layer.name}, ${layer.unit}`)}</th>`);
  const rows = Array.from(map.x, (x, i) => {
    const cell = kept.at(i, 0);
    const values = map.layers.map((layer) => `<td class="n">${short(layer.values[i])}</td>`);
    const verdict =
      cell === null
        ? 'not flown'
        : cell.pass
          ? 'within'
          : `<span class="out">OUTSIDE</span> ${escape(cell.reason ?? '')}`;
    return `<tr><td class="n">${short(x)}</td>${values.join('')}<td>${verdict}</td></tr>`;
  });
  return `<table><thead><tr><th class="n">${escape(kept.sweep.x.path)}</th>${heads.join('')}<th></th></tr></thead><tbody>${rows.join('')}</tbody></table>`;
}

function panel(kept: SweepCells, map: SweepMap, layer: MapLayer, escape: (text: string) => string): string {
  const { columns, rows, sweep } = kept;
  const known = layer.values.filter((value) => Number.isFinite(value));
  const low = known.length === 0 ? 0 : known.reduce((a, b) => Math.min(a, b));
  const high = known.length === 0 ? 1 : known.reduce((a, b) => Math.max(a, b));
  const size = Math.max(3, Math.min(CELL_PX, Math.floor(400 / Math.max(columns, rows))));
  const width = LEFT_PX + columns * size + 16;
  const bottom = TOP_PX + rows * size;
  const x = (column: number) => LEFT_PX + column * size;
  // Rows rise upward, as the numbers do.
  const y = (row: number) => bottom - row * size;
  const cells: string[] = [];
  let crosses = '';
  for (let place = 0; place < columns * rows; place++) {
    const [column, row] = [place % columns, Math.floor(place / columns)];
    const value = layer.values[place];
    if (Number.isFinite(value)) {
      const shade =
        high > low ? Math.min(RAMP.length - 1, Math.floor((RAMP.length * (value - low)) / (high - low))) : 0;
      cells.push(
        `<rect x="${x(column)}" y="${y(row + 1)}" width="${size}" height="${size}" fill="${RAMP[shade]}"/>`,
      );
    } else if (map.unstable[place] === 1) {
      crosses += `M${x(column) + 2} ${y(row) - 2}L${x(column + 1) - 2} ${y(row + 1) + 2}M${x(column) + 2} ${y(row + 1) + 2}L${x(column + 1) - 2} ${y(row) - 2}`;
    }
  }
  const front = map.front.map(
    (place) =>
      `<circle cx="${x(place % columns) + size / 2}" cy="${y(Math.floor(place / columns)) - size / 2}" r="${size / 4}" fill="#e69f00" stroke="#1b2427" stroke-width="0.7"/>`,
  );
  const texts = [
    `<text x="${LEFT_PX}" y="14">${escape(`${layer.name}: ${short(low)} (light) to ${short(high)} ${layer.unit} (dark)`)}</text>`,
    `<text x="${LEFT_PX}" y="${bottom + 14}">${short(map.x[0])}</text>`,
    `<text x="${x(columns)}" y="${bottom + 14}" text-anchor="end">${short(map.x[columns - 1])}</text>`,
    `<text x="${LEFT_PX}" y="${bottom + 30}">${escape(sweep.x.path)}</text>`,
    `<text x="${LEFT_PX - 4}" y="${bottom}" text-anchor="end">${short(map.y[0])}</text>`,
    `<text x="${LEFT_PX - 4}" y="${TOP_PX + 10}" text-anchor="end">${short(map.y[rows - 1])}</text>`,
    `<text transform="translate(14 ${bottom}) rotate(-90)">${escape(sweep.y?.path ?? '')}</text>`,
  ];
  return `<svg width="${width}" height="${bottom + BOTTOM_PX}" role="img" aria-label="${escape(layer.name)}">${cells.join('')}<path d="${crosses}" stroke="#8b8778"/><path d="${outline(map.acceptable, columns, rows, x, y)}" fill="none" stroke="#1b2427" stroke-width="2"/>${front.join('')}${texts.join('')}</svg>`;
}

/** Edges between cells that pass and the others. */
function outline(
  acceptable: Uint8Array,
  columns: number,
  rows: number,
  x: (column: number) => number,
  y: (row: number) => number,
): string {
  const passes = (column: number, row: number) =>
    column >= 0 && row >= 0 && column < columns && row < rows && acceptable[row * columns + column] === 1;
  let path = '';
  for (let row = 0; row <= rows; row++) {
    for (let column = 0; column <= columns; column++) {
      if (passes(column, row) !== passes(column, row - 1)) path += `M${x(column)} ${y(row)}H${x(column + 1)}`;
      if (passes(column, row) !== passes(column - 1, row)) path += `M${x(column)} ${y(row)}V${y(row + 1)}`;
    }
  }
  return path;
}

function short(value: number): string {
  return Number.isFinite(value) ? String(Number(value.toPrecision(3))) : '—';
}
