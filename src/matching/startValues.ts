/** Where the search for an axis' plant begins: the measured frequency response, or else the build's own plant. */
import type { PlantParameters } from './axisData.ts';
import { responseOf } from './reducedPlant.ts';
import type { MeasuredResponse } from './spectra.ts';

const LOW_HZ = 0.4;
const HIGH_HZ = 20;
const LEAST_POINTS = 5;

/** Bins of the response that can be trusted, within the band that carries the plant. */
export function trustedBins(response: MeasuredResponse): number[] {
  return Array.from(response.f_Hz.keys()).filter(
    (k) => response.trusted[k] !== 0 && response.f_Hz[k] >= LOW_HZ && response.f_Hz[k] <= HIGH_HZ,
  );
}

/** Least squares of the plant to the trusted bins, on a grid of lag and delay; null with too few of them. */
export function plantFromResponse(response: MeasuredResponse): PlantParameters | null {
  const bins = trustedBins(response);
  if (bins.length < LEAST_POINTS) return null;
  let best: PlantParameters | null = null;
  let least = Infinity;
  for (let a = 0; a <= 16; a++) {
    for (let b = 0; b <= 16; b++) {
      const lag_s = 0.004 * 40 ** (a / 16);
      const delay_s = 0.0015 * b;
      const at = responseOf({ gain_dps2_per_us: 1, lag_s, delay_s });
      let top = 0;
      let below = 0;
      let all = 0;
      for (const k of bins) {
        const omega = 2 * Math.PI * response.f_Hz[k];
        const model = at(omega);
        const gamma = Math.min(0.999, response.coherence[k]);
        const size = response.re[k] ** 2 + response.im[k] ** 2;
        // Errors are proportional to the response, worse where the coherence is low.
        const weight = gamma / (1 - gamma) / Math.max(size, 1e-30);
        top += weight * (response.re[k] * model.re + response.im[k] * model.im);
        below += weight * (model.re ** 2 + model.im ** 2);
        all += weight * size;
      }
      const gain = top / below;
      const cost = all - gain * top;
      if (cost < least) {
        least = cost;
        best = { gain_dps2_per_us: gain, lag_s, delay_s };
      }
    }
  }
  return best;
}
