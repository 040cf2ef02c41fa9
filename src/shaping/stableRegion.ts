/** Map of two chosen gains: stability, Ms and noise over both, coarse to fine, into typed arrays. */
import type { AxisName, Gains } from '../craft/gains.ts';
import { analyse } from './analysis.ts';
import type { ContinuousSystem } from './continuous.ts';
import { gyroNoise } from './noise.ts';
import { rateLoop } from './rateLoop.ts';

/** The two gains of a map, across and up. */
export const REGION_KINDS = ['p-d', 'd-cutoff', 'p-loop'] as const;
export type RegionKind = (typeof REGION_KINDS)[number];

export interface RegionTask {
  readonly kind: RegionKind;
  readonly axis: AxisName;
  readonly system: ContinuousSystem;
  /** Everything that the two gains of the map leave alone. */
  readonly gains: Gains;
  readonly noise_dps_per_rtHz: number;
  readonly gyroBandwidth_Hz: number;
  /** Values across (P, D, P) and up (D, cutoff in Hz, loop rate in Hz). */
  readonly xs: Float64Array;
  readonly ys: Float64Array;
}

/** Cell of column x and row y stands at y · columns + x. A coarse cell fills its whole block until finer ones come. */
export interface Region {
  readonly columns: number;
  readonly rows: number;
  /** NaN-free: unstable cells and cells not yet worked out hold Infinity. */
  readonly maxSensitivity: Float64Array;
  /** 1 stable, 0 unstable, 2 not yet worked out. */
  readonly stable: Uint8Array;
  /** µs rms; Infinity where unstable. */
  readonly noise_us: Float64Array;
  /** Largest block that a cell still stands for; 1 when the map is complete. */
  block: number;
}

const FIRST_BLOCK = 8;
const UNKNOWN = 2;

/** The gains at one place of the map. Notches that a slower loop cannot hold are left out. */
export function regionGains(task: Pick<RegionTask, 'kind' | 'axis' | 'gains'>, x: number, y: number): Gains {
  const { gains, axis, kind } = task;
  const own = gains.axes[axis];
  const withOwn = (change: Partial<typeof own>): Gains => ({
    ...gains,
    axes: { ...gains.axes, [axis]: { ...own, ...change } },
  });
  if (kind === 'p-d') return withOwn({ p_us_per_dps: x, d_us_per_dps2: y });
  if (kind === 'd-cutoff') return { ...withOwn({ d_us_per_dps2: x }), derivativeLowPass_Hz: y };
  return {
    ...withOwn({ p_us_per_dps: x }),
    loop_Hz: y,
    notches: gains.notches.filter((notch) => notch.centre_Hz < y / 2),
  };
}

/**
 * Fills the map block by block: first every eighth cell, then every fourth, … Yields the share done after each
 * row of cells, so that a caller can show it, or stop.
 */
export function* stableRegion(task: RegionTask): Generator<{ region: Region; done: number }, Region> {
  const columns = task.xs.length;
  const rows = task.ys.length;
  const region: Region = {
    columns,
    rows,
    maxSensitivity: new Float64Array(columns * rows).fill(Infinity),
    stable: new Uint8Array(columns * rows).fill(UNKNOWN),
    noise_us: new Float64Array(columns * rows).fill(Infinity),
    block: FIRST_BLOCK,
  };
  let count = 0;
  for (let block = FIRST_BLOCK; block >= 1; block /= 2) {
    region.block = block;
    for (let y = 0; y < rows; y += block) {
      for (let x = 0; x < columns; x += block) {
        const known = block < FIRST_BLOCK && x % (2 * block) === 0 && y % (2 * block) === 0;
        if (known) continue;
        fillBlock(region, task, x, y, block);
        count++;
      }
      yield { region, done: count / (columns * rows) };
    }
  }
  return region;
}

function fillBlock(region: Region, task: RegionTask, x: number, y: number, block: number): void {
  const gains = regionGains(task, task.xs[x], task.ys[y]);
  const noise = gyroNoise(task.noise_dps_per_rtHz, task.gyroBandwidth_Hz, gains.loop_Hz);
  const found = analyse(rateLoop(task.system, gains, task.axis), noise.sigma_dps, noise.correlation, true);
  for (let v = y; v < Math.min(y + block, region.rows); v++) {
    for (let u = x; u < Math.min(x + block, region.columns); u++) {
      const at = v * region.columns + u;
      region.stable[at] = found.stable ? 1 : 0;
      region.maxSensitivity[at] = found.stable ? found.margins.maxSensitivity : Infinity;
      region.noise_us[at] = found.noiseAtMotor_us_rms ?? Infinity;
    }
  }
}
