/** A sweep's cells as the map plot takes them: axes whose cell centres are the values flown, outline, front. */
import {
  contourLines,
  createMapGrid,
  filledIn,
  setMapCell,
  type ContourLine,
  type MapGrid,
} from '../../plots/mapGrid.ts';
import type { MapCurve, MapLevel, MapPoint } from '../../plots/MapPlot.tsx';
import type { PlotAxis } from '../../plots/frame.ts';
import { shareOf, valueAt } from '../../plots/scale.ts';
import { axisValue, type Cell, type SweepAxis } from '../../../trials/sweep.ts';
import type { MapLayer, SweepCells, SweepMap } from '../../../trials/sweepResult.ts';
import { nameOfPath, unitOfPath } from './shared.ts';
import { proveTexts as words } from './texts.ts';

export type Place = Pick<Cell, 'column' | 'row'>;

/** The axis with half a cell more at both ends, so that each cell's middle is its value. */
export function plotAxis(axis: SweepAxis): PlotAxis {
  const { count, logarithmic } = axis;
  const low = Math.min(axis.from, axis.to);
  const high = Math.max(axis.from, axis.to);
  const about = { label: nameOfPath(axis.path), unit: unitOfPath(axis.path) };
  if (count === 1) {
    const half = Math.max(1e-9, Math.abs(low) / 2);
    return { ...about, low: low - half, high: low + half };
  }
  if (logarithmic) {
    const half = (high / low) ** (0.5 / (count - 1));
    return { ...about, low: low / half, high: high * half, log: true };
  }
  const half = (0.5 * (high - low)) / (count - 1);
  return { ...about, low: low - half, high: high + half };
}

/** Which cell a point of the map lies in. */
export function cellAt(cells: SweepCells, point: MapPoint): Place {
  const { x, y } = cells.sweep;
  const index = (axis: SweepAxis, value: number): number => {
    const share = Math.floor(shareOf(plotAxis(axis), value) * axis.count);
    const held = Math.min(axis.count - 1, Math.max(0, share));
    return axis.from <= axis.to ? held : axis.count - 1 - held;
  };
  return { column: index(x, point.x), row: y === undefined ? 0 : index(y, point.y) };
}

export function pointOf(cells: SweepCells, { column, row }: Place): MapPoint {
  const { x, y } = cells.sweep;
  return { x: axisValue(x, column), y: y === undefined ? 0 : axisValue(y, row) };
}

/** Cells that this one stands for in the order coarse to fine. */
function blockOf({ column, row }: Place): number {
  for (const block of [8, 4, 2]) if (column % block === 0 && row % block === 0) return block;
  return 1;
}

/** Blocks wider than a cell stand for others only until those are flown. */
function gridOf(cells: SweepCells, valueOf: (place: number) => number, unstable: Uint8Array): MapGrid {
  const { columns, rows, sweep } = cells;
  const grid = createMapGrid(columns, rows);
  const column = (index: number) => (sweep.x.from <= sweep.x.to ? index : columns - 1 - index);
  const row = (index: number) =>
    sweep.y === undefined || sweep.y.from <= sweep.y.to ? index : rows - 1 - index;
  // A falling axis fills from its other end: no blocks there, they would lie on the wrong side.
  const rising = sweep.x.from <= sweep.x.to && (sweep.y === undefined || sweep.y.from <= sweep.y.to);
  for (const cell of cells.cells()) {
    const place = cell.row * columns + cell.column;
    const block = rising ? blockOf(cell) : 1;
    setMapCell(grid, column(cell.column), row(cell.row), valueOf(place), unstable[place] === 1, block);
  }
  return grid;
}

export function layerGrid(cells: SweepCells, map: SweepMap, layer: MapLayer): MapGrid {
  return gridOf(cells, (place) => layer.values[place], map.unstable);
}

/** Contours at quarters of what was found, and the band's own limits. */
export function levelsOf({ values, band }: MapLayer): MapLevel[] {
  const found = values.filter((value) => Number.isFinite(value)).sort();
  const limits = [band.least, band.most].filter((one) => one !== undefined);
  const quarters = [0.25, 0.5, 0.75]
    .map((share) => Number(found[Math.floor(share * (found.length - 1))]?.toPrecision(2)))
    .filter((at) => Number.isFinite(at) && !limits.includes(at));
  return [
    ...[...new Set(quarters)].map((at) => ({ at, label: String(at) })),
    ...limits.map((at) => ({ at, label: `${words.band} ${at}` })),
  ].sort((a, b) => a.at - b.at);
}

/** Outline of the region in which every score keeps its band, and the front. */
export function curvesOf(cells: SweepCells, map: SweepMap): MapCurve[] {
  return [...outlineOf(cells, map), ...frontOf(cells, map)];
}

/** Pieces of a cell's edge for the outline. */
const FINER = 5;

function outlineOf(cells: SweepCells, map: SweepMap): MapCurve[] {
  const { columns, rows, sweep } = cells;
  if (sweep.y === undefined) return [];
  const { values, known } = filledIn(
    gridOf(cells, (place) => map.acceptable[place], new Uint8Array(columns * rows)),
  );
  // A border that does not pass closes the outline at the map's edge; finer cells keep its corners.
  const [width, height] = [FINER * columns + 2, FINER * rows + 2];
  const padded = new Float64Array(width * height);
  for (let r = 0; r < FINER * rows; r++) {
    for (let c = 0; c < FINER * columns; c++) {
      const place = Math.floor(r / FINER) * columns + Math.floor(c / FINER);
      padded[(r + 1) * width + c + 1] = known[place] === 1 ? values[place] : 0;
    }
  }
  const [x, y] = [plotAxis(sweep.x), plotAxis(sweep.y)];
  const held = (share: number) => Math.min(1, Math.max(0, share));
  const lines = [...contourLines(padded, width, height, 0.5)].sort((a, b) => b.length - a.length);
  return lines.map((closed, i) => {
    const line = endingRight(closed);
    return {
      label: i === 0 ? words.outline : '',
      axis: 'accent' as const,
      x: line.map(([column]) => valueAt(x, held((column - 1) / (FINER * columns)))),
      y: line.map(([, row]) => valueAt(y, held((row - 1) / (FINER * rows)))),
    };
  });
}

/** A closed line begun so that it ends at its rightmost, there lowest point: its name is written leftward from there. */
function endingRight(line: ContourLine): ContourLine {
  const further = (a: ContourLine[number], b: ContourLine[number]) => a[0] - b[0] || b[1] - a[1];
  const end = line.reduce((best, point, i) => (further(point, line[best]) > 0 ? i : best), 0);
  const ring = line.slice(0, -1);
  return [...ring.slice(end), ...ring.slice(0, end), line[end]];
}

function frontOf(cells: SweepCells, map: SweepMap): MapCurve[] {
  const { columns, sweep } = cells;
  const { y } = sweep;
  if (y === undefined || map.front.length < 2) return [];
  const x = map.front.map((place) => axisValue(sweep.x, place % columns));
  const front = x[0] > x[x.length - 1] ? [...map.front].reverse() : map.front;
  return [
    {
      label: words.front,
      axis: 'pitch',
      x: front.map((place) => axisValue(sweep.x, place % columns)),
      y: front.map((place) => axisValue(y, Math.floor(place / columns))),
    },
  ];
}
