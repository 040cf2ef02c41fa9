/**
 * Long work of Shape beside the page: starting gains, the map of two gains from coarse to fine, the further
 * measures, the walk's flights and the check by simulation.
 */
import type { Build } from '../../../craft/build.ts';
import type { AxisName, Gains } from '../../../craft/gains.ts';
import { InputError } from '../../../craft/problem.ts';
import { analyse } from '../../../shaping/analysis.ts';
import { axisModels, type TrimChoice } from '../../../shaping/axisModel.ts';
import { rateLoop } from '../../../shaping/rateLoop.ts';
import { gyroNoise, reportForBuild, type ShapeReport } from '../../../shaping/report.ts';
import { startingGains, type StartingLimits, type StartingSet } from '../../../shaping/startingGains.ts';
import { sweepMeasure, type SweepCheck, type SweepOptions } from '../../../shaping/sweepCheck.ts';
import {
  walkAdvice,
  walkCandidates,
  walkResponse,
  type WalkCandidate,
  type WalkResponse,
  type WalkStage,
} from '../../../shaping/walk.ts';
import { cellsInOrder } from '../../../trials/sweep.ts';

export type MapKind = 'p-d' | 'd-cutoff' | 'p-loop';

export interface MapTask {
  readonly kind: MapKind;
  readonly axis: AxisName;
  readonly columns: number;
  readonly rows: number;
  readonly xs: Float64Array;
  readonly ys: Float64Array;
}

export type ToShapeWorker =
  | {
      readonly kind: 'start';
      readonly id: number;
      readonly build: Build;
      readonly gains: Gains;
      readonly trim: TrimChoice;
      readonly limits: StartingLimits;
    }
  | {
      readonly kind: 'report';
      readonly id: number;
      readonly build: Build;
      readonly gains: Gains;
      readonly other: Gains | null;
      readonly trim: TrimChoice;
    }
  | {
      readonly kind: 'walk';
      readonly id: number;
      readonly build: Build;
      readonly gains: Gains;
      readonly axis: AxisName;
      readonly stage: WalkStage;
    }
  | {
      readonly kind: 'sweep';
      readonly id: number;
      readonly build: Build;
      readonly gains: Gains;
      readonly axis: AxisName;
      readonly options: SweepOptions;
    }
  | {
      readonly kind: 'map';
      readonly id: number;
      readonly build: Build;
      readonly gains: Gains;
      readonly trim: TrimChoice;
      readonly task: MapTask;
    };

export interface MapCell {
  readonly column: number;
  readonly row: number;
  readonly block: number;
  readonly ms: number;
  readonly stable: boolean;
  readonly noise_us: number;
}

/** One of the walk's flights: what was tried, how it flew, what it asks for. */
export interface WalkTrial extends WalkCandidate {
  readonly response: WalkResponse;
  readonly advice: string;
}

export type FromShapeWorker =
  | {
      readonly kind: 'reported';
      readonly id: number;
      readonly a: ShapeReport;
      readonly b: ShapeReport | null;
    }
  | { readonly kind: 'walked'; readonly id: number; readonly trials: readonly WalkTrial[] }
  | { readonly kind: 'swept'; readonly id: number; readonly check: SweepCheck }
  | { readonly kind: 'started'; readonly id: number; readonly found: StartingSet }
  | { readonly kind: 'failed'; readonly id: number; readonly reason: string }
  | {
      readonly kind: 'cells';
      readonly id: number;
      readonly cells: readonly MapCell[];
      readonly done: boolean;
    };

const CELLS_A_MESSAGE = 24;
let newest = 0;

const say = (message: FromShapeWorker): void => self.postMessage(message);

self.onmessage = ({ data }: MessageEvent<ToShapeWorker>) => {
  newest = data.id;
  try {
    if (data.kind === 'map') void fillMap(data);
    else say(answerTo(data));
  } catch (error) {
    say({ kind: 'failed', id: data.id, reason: reasonOf(error) });
  }
};

function reasonOf(error: unknown): string {
  if (error instanceof InputError || error instanceof RangeError) return error.message;
  return error instanceof Error ? error.message : String(error);
}

function answerTo(data: Exclude<ToShapeWorker, { kind: 'map' }>): FromShapeWorker {
  const { id, build, gains } = data;
  switch (data.kind) {
    case 'start':
      return { kind: 'started', id, found: startFor(data) };
    case 'report':
      return {
        kind: 'reported',
        id,
        a: reportForBuild(build, gains, data.trim),
        b: data.other === null ? null : reportForBuild(build, data.other, data.trim),
      };
    case 'walk':
      return { kind: 'walked', id, trials: walk(data) };
    case 'sweep':
      return { kind: 'swept', id, check: sweepMeasure(build, gains, data.axis, data.options) };
  }
}

function startFor(data: Extract<ToShapeWorker, { kind: 'start' }>): StartingSet {
  const models = axisModels(data.build, data.trim);
  const { gyro } = data.build;
  return startingGains(
    { roll: models.roll.measured, pitch: models.pitch.measured, yaw: models.yaw.measured },
    data.gains,
    gyroNoise(gyro.noise_dps_per_rtHz, gyro.bandwidth_Hz, data.gains.loop_Hz),
    data.limits,
  );
}

function walk(data: Extract<ToShapeWorker, { kind: 'walk' }>): WalkTrial[] {
  return walkCandidates(data.stage, data.gains, data.axis).map((candidate) => {
    const response = walkResponse(data.build, candidate.gains, data.axis);
    return { ...candidate, response, advice: walkAdvice(data.stage, response) };
  });
}

function gainsAt(gains: Gains, task: MapTask, x: number, y: number): Gains {
  const axis = gains.axes[task.axis];
  const withAxis = (change: Partial<typeof axis>): Gains => ({
    ...gains,
    axes: { ...gains.axes, [task.axis]: { ...axis, ...change } },
  });
  if (task.kind === 'p-d') return withAxis({ p_us_per_dps: x, d_us_per_dps2: y });
  if (task.kind === 'd-cutoff') return { ...withAxis({ d_us_per_dps2: x }), derivativeLowPass_Hz: y };
  return {
    ...withAxis({ p_us_per_dps: x }),
    loop_Hz: y,
    notches: gains.notches.filter((notch) => notch.centre_Hz < y / 2),
  };
}

/** In slices, so that a newer wish ends an older map. */
async function fillMap(data: Extract<ToShapeWorker, { kind: 'map' }>): Promise<void> {
  const { task, id, gains, build } = data;
  const system = axisModels(build, data.trim)[task.axis].measured;
  const order = cellsInOrder(task.columns, task.rows);
  let cells: MapCell[] = [];
  for (const [k, cell] of order.entries()) {
    const at = gainsAt(gains, task, task.xs[cell.column], task.ys[cell.row]);
    const noise = gyroNoise(build.gyro.noise_dps_per_rtHz, build.gyro.bandwidth_Hz, at.loop_Hz);
    const result = analyse(rateLoop(system, at, task.axis), noise.sigma_dps, noise.correlation, true);
    cells.push({
      ...cell,
      ms: result.margins.maxSensitivity,
      stable: result.stable,
      noise_us: result.noiseAtMotor_us_rms ?? NaN,
    });
    if (cells.length === CELLS_A_MESSAGE || k === order.length - 1) {
      say({ kind: 'cells', id, cells, done: k === order.length - 1 });
      cells = [];
      await new Promise((resolve) => setTimeout(resolve, 0));
      if (newest !== id) return;
    }
  }
}
