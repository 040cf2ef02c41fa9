/**
 * A move of a gain in Shape: everything that the plots show of one axis (margins, Bode, Nyquist, sensitivity,
 * step, poles, noise), computed anew. Wanted: 16 ms, a frame. And starting gains for a whole craft: 5 s.
 */
import { readFileSync } from 'node:fs';
import { parseBuild } from '../../src/craft/build.ts';
import { parseGains, type Gains } from '../../src/craft/gains.ts';
import { axisModels } from '../../src/shaping/axisModel.ts';
import { loopView } from '../../src/shaping/loopView.ts';
import { gyroNoise } from '../../src/shaping/noise.ts';
import { startingGains } from '../../src/shaping/startingGains.ts';

const MOVES = 60;
const WARM = 40;
const raw = (name: string): unknown => JSON.parse(readFileSync(`scenes/${name}.json`, 'utf8'));

function withP(gains: Gains, share: number): Gains {
  const roll = { ...gains.axes.roll, p_us_per_dps: share * gains.axes.roll.p_us_per_dps };
  return { ...gains, axes: { ...gains.axes, roll } };
}

for (const craft of ['sandpiper', 'wren']) {
  const build = parseBuild(raw(`${craft}.build`));
  const kept = parseGains(raw(`${craft}.gains`));
  const models = axisModels(build, {});
  for (const loop_Hz of [250, kept.loop_Hz, 2000, 8000]) {
    const gains = {
      ...kept,
      loop_Hz,
      notches: kept.notches.filter((notch) => notch.centre_Hz < loop_Hz / 2),
    };
    const took: number[] = [];
    for (let k = 0; k < MOVES + WARM; k++) {
      const begun = performance.now();
      loopView(models.roll, build, withP(gains, 0.5 + k / MOVES), 'roll');
      if (k >= WARM) took.push(performance.now() - begun);
    }
    took.sort((a, b) => a - b);
    const at = (share: number) => took[Math.floor(share * (took.length - 1))].toFixed(1);
    console.log(
      `${craft} at ${String(loop_Hz)} Hz: a gain moved, all plots computed in ${at(0.5)} ms (95 of 100 within ${at(0.95)} ms; wanted 16)`,
    );
  }
  const begun = performance.now();
  const { gyro } = build;
  const systems = { roll: models.roll.measured, pitch: models.pitch.measured, yaw: models.yaw.measured };
  startingGains(systems, kept, gyroNoise(gyro.noise_dps_per_rtHz, gyro.bandwidth_Hz, kept.loop_Hz));
  console.log(`${craft}: starting gains in ${((performance.now() - begun) / 1000).toFixed(2)} s (wanted 5)`);
}
