/** Curves of one loop for plots, as typed arrays: Bode, Nyquist, sensitivity, step, poles, noise spectrum. */
import { argument, complex, magnitude, plus } from './complex.ts';
import { stepResponse, type AxisAnalysis, type StepResponse } from './analysis.ts';
import { closedLoopPoles, type Pole } from './poles.ts';
import { feedbackAt, openLoopAt, type RateLoop } from './rateLoop.ts';

export interface LoopCurves {
  readonly f_Hz: Float64Array;
  readonly gain_dB: Float64Array;
  /** Unwrapped, deg. */
  readonly phase_deg: Float64Array;
  readonly nyquistRe: Float64Array;
  readonly nyquistIm: Float64Array;
  /** |1/(1+L)|, dB. */
  readonly sensitivity_dB: Float64Array;
  /** Axis command's noise density, µs/√Hz, for gyro noise of `density` deg/s per √Hz. */
  readonly noise_us_per_rtHz: Float64Array;
  readonly poles: readonly Pole[];
  readonly step: StepResponse | null;
}

const POINTS = 260;

/**
 * @param density gyro noise density
 * @param low_Hz lowest frequency drawn
 * @param analysis of the same loop, where there is one already: its poles and step are taken, not made again
 */
export function loopCurves(
  loop: RateLoop,
  density: number,
  low_Hz = 0.2,
  analysis?: Pick<AxisAnalysis, 'poles' | 'stepResponse'>,
): LoopCurves {
  const nyquist_Hz = 0.5 / loop.tick_s;
  const f_Hz = Float64Array.from(
    { length: POINTS },
    (_, i) => low_Hz * (nyquist_Hz / low_Hz) ** (i / (POINTS - 1)),
  );
  const gain_dB = new Float64Array(POINTS);
  const phase_deg = new Float64Array(POINTS);
  const nyquistRe = new Float64Array(POINTS);
  const nyquistIm = new Float64Array(POINTS);
  const sensitivity_dB = new Float64Array(POINTS);
  const noise_us_per_rtHz = new Float64Array(POINTS);
  let last = 0;
  for (let i = 0; i < POINTS; i++) {
    const omega = 2 * Math.PI * f_Hz[i];
    const L = openLoopAt(loop, omega);
    const one = plus(L, complex(1));
    gain_dB[i] = 20 * Math.log10(magnitude(L));
    let phase = (argument(L) * 180) / Math.PI;
    // Continuous from the low end, where a rate loop stands between −180° and 0.
    if (i === 0) phase = phase > 90 ? phase - 360 : phase;
    else phase -= 360 * Math.round((phase - last) / 360);
    last = phase;
    phase_deg[i] = phase;
    nyquistRe[i] = L.re;
    nyquistIm[i] = L.im;
    sensitivity_dB[i] = -20 * Math.log10(magnitude(one));
    noise_us_per_rtHz[i] = (density * magnitude(feedbackAt(loop, omega))) / magnitude(one);
  }
  const { poles, step } =
    analysis === undefined ? polesAndStep(loop) : { ...analysis, step: analysis.stepResponse };
  return {
    f_Hz,
    gain_dB,
    phase_deg,
    nyquistRe,
    nyquistIm,
    sensitivity_dB,
    noise_us_per_rtHz,
    poles,
    step,
  };
}

function polesAndStep(loop: RateLoop): Pick<LoopCurves, 'poles' | 'step'> {
  const { poles, maxRadius, stable } = closedLoopPoles(loop);
  return { poles, step: stable ? stepResponse(loop, maxRadius) : null };
}
