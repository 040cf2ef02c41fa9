/** All that the plots show of one axis's loop: what a move of a gain has to compute anew between two frames. */
import type { Build } from '../craft/build.ts';
import type { AxisName, Gains } from '../craft/gains.ts';
import { analyse, type AxisAnalysis } from './analysis.ts';
import type { AxisModel } from './axisModel.ts';
import { loopCurves, type LoopCurves } from './curves.ts';
import { gyroNoise } from './noise.ts';
import { rateLoop } from './rateLoop.ts';

export interface LoopView {
  readonly analysis: AxisAnalysis;
  readonly curves: LoopCurves;
}

/** @param model of the axis at its trim, which a move of a gain leaves as it is */
export function loopView(model: AxisModel, build: Build, gains: Gains, axis: AxisName): LoopView {
  const loop = rateLoop(model.measured, gains, axis);
  const { gyro } = build;
  const noise = gyroNoise(gyro.noise_dps_per_rtHz, gyro.bandwidth_Hz, gains.loop_Hz);
  const analysis = analyse(loop, noise.sigma_dps, noise.correlation);
  return { analysis, curves: loopCurves(loop, gyro.noise_dps_per_rtHz, undefined, analysis) };
}
