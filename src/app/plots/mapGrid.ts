/** Values over two parameters, filling in from coarse to fine, and their contours. */
import { valueAt, type AxisRange } from './scale.ts';

export interface MapGrid {
  readonly columns: number;
  readonly rows: number;
  /** Row by row from the lowest y; NaN where unknown or unstable. */
  readonly values: Float64Array;
  /** 0: nothing known. s: the value stands for the s × s block that has this cell as its lowest corner. */
  readonly block: Uint8Array;
  /** 1 where the flight or loop was unstable. */
  readonly unstable: Uint8Array;
}

export function createMapGrid(columns: number, rows: number): MapGrid {
  const count = columns * rows;
  return {
    columns,
    rows,
    values: new Float64Array(count).fill(NaN),
    block: new Uint8Array(count),
    unstable: new Uint8Array(count),
  };
}

/** Writes one cell; `block` > 1 while the finer cells around it are still to come. */
export function setMapCell(
  grid: MapGrid,
  column: number,
  row: number,
  value: number,
  unstable: boolean,
  block: number,
): void {
  const place = row * grid.columns + column;
  grid.values[place] = unstable ? NaN : value;
  grid.unstable[place] = unstable ? 1 : 0;
  grid.block[place] = block;
}

/** The parameter's value at the middle of cell `index` of `count`. */
export function cellCentre(range: AxisRange, index: number, count: number): number {
  return valueAt(range, (index + 0.5) / count);
}

/** Every cell with the finest value known for it. `known` is 0, 1 (a value) or 2 (unstable). */
export function filledIn(grid: MapGrid): { values: Float64Array; known: Uint8Array } {
  const { columns, rows } = grid;
  const values = new Float64Array(columns * rows).fill(NaN);
  const known = new Uint8Array(columns * rows);
  const sizes = [...new Set(grid.block)].filter((size) => size > 0).sort((a, b) => b - a);
  for (const size of sizes) {
    for (let place = 0; place < grid.block.length; place++) {
      if (grid.block[place] !== size) continue;
      const column = place % columns;
      const row = Math.floor(place / columns);
      for (let r = row; r < Math.min(rows, row + size); r++) {
        for (let c = column; c < Math.min(columns, column + size); c++) {
          values[r * columns + c] = grid.values[place];
          known[r * columns + c] = grid.unstable[place] === 1 ? 2 : 1;
        }
      }
    }
  }
  return { values, known };
}

/** A line of points, in cells from the lower left corner (cell centres at halves). */
export type ContourLine = readonly (readonly [column: number, row: number])[];

/**
 * Lines of equal value by marching squares, linear between cell centres, pieces joined. A saddle is cut by the
 * mean of its corners. Squares with an unknown corner are left out.
 */
export function contourLines(
  values: Float64Array,
  columns: number,
  rows: number,
  level: number,
): ContourLine[] {
  const pieces: [string, string][] = [];
  const points = new Map<string, [number, number]>();
  const crossing = (c0: number, r0: number, c1: number, r1: number): string => {
    const a = values[r0 * columns + c0];
    const b = values[r1 * columns + c1];
    const key = `${c0},${r0},${c1},${r1}`;
    const share = (level - a) / (b - a);
    points.set(key, [c0 + 0.5 + share * (c1 - c0), r0 + 0.5 + share * (r1 - r0)]);
    return key;
  };
  for (let r = 0; r + 1 < rows; r++) {
    for (let c = 0; c + 1 < columns; c++) {
      const corner = [
        values[r * columns + c],
        values[r * columns + c + 1],
        values[(r + 1) * columns + c + 1],
        values[(r + 1) * columns + c],
      ];
      if (corner.some(Number.isNaN)) continue;
      const above = corner.map((value) => value >= level);
      const edges: string[] = [];
      if (above[0] !== above[1]) edges.push(crossing(c, r, c + 1, r));
      if (above[1] !== above[2]) edges.push(crossing(c + 1, r, c + 1, r + 1));
      if (above[3] !== above[2]) edges.push(crossing(c, r + 1, c + 1, r + 1));
      if (above[0] !== above[3]) edges.push(crossing(c, r, c, r + 1));
      if (edges.length === 2) pieces.push([edges[0], edges[1]]);
      else if (edges.length === 4) {
        const middle = (corner[0] + corner[1] + corner[2] + corner[3]) / 4 >= level;
        if (middle === above[0]) pieces.push([edges[0], edges[1]], [edges[2], edges[3]]);
        else pieces.push([edges[0], edges[3]], [edges[1], edges[2]]);
      }
    }
  }
  return chained(pieces).map((keys) =>
    keys.flatMap((key) => {
      const point = points.get(key);
      return point === undefined ? [] : [point];
    }),
  );
}

/** Joins two-ended pieces into chains. */
function chained(pieces: readonly (readonly [string, string])[]): string[][] {
  const at = new Map<string, number[]>();
  pieces.forEach((piece, n) => {
    for (const end of piece) at.set(end, [...(at.get(end) ?? []), n]);
  });
  const used = new Uint8Array(pieces.length);
  const follow = (from: string): string[] => {
    const chain: string[] = [];
    let end = from;
    for (;;) {
      const n = at.get(end)?.find((piece) => used[piece] === 0);
      if (n === undefined) return chain;
      used[n] = 1;
      end = pieces[n][0] === end ? pieces[n][1] : pieces[n][0];
      chain.push(end);
    }
  };
  const chains: string[][] = [];
  pieces.forEach(([first, second], n) => {
    if (used[n] === 1) return;
    used[n] = 1;
    chains.push([...follow(first).reverse(), first, second, ...follow(second)]);
  });
  return chains;
}
