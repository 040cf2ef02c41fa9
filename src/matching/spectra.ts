/**
 * Spectra by Welch's method (1967): Hann window, half overlap, mean taken out of each segment, one-sided
 * densities. Cross spectra, coherence, and the frequency response with the setpoint as instrument, which the
 * feedback of noise does not bias (joint input–output; Ljung, 2nd ed., 13.5).
 */
import FFT from 'fft.js';

export interface CrossSpectra {
  readonly f_Hz: Float64Array;
  /** Densities of each signal, unit²/Hz. */
  readonly auto: readonly Float64Array[];
  /** Conj(signal i) · signal j for i < j, at pairIndex(i, j, count). */
  readonly crossRe: readonly Float64Array[];
  readonly crossIm: readonly Float64Array[];
  /** Segments that were averaged. */
  readonly segments: number;
  readonly count: number;
}

export function pairIndex(i: number, j: number, count: number): number {
  return i * count - (i * (i + 1)) / 2 + (j - i - 1);
}

/**
 * Spectra of signals that are sampled together.
 * @param runs each a set of equally long signals without a gap
 * @param segment length of a segment, a power of two; runs shorter than it are left out
 */
export function crossSpectra(
  runs: readonly (readonly ArrayLike<number>[])[],
  rate_Hz: number,
  segment: number,
): CrossSpectra {
  const count = runs[0]?.length ?? 0;
  const bins = segment / 2 + 1;
  const window = Float64Array.from(
    { length: segment },
    (_, n) => 0.5 - 0.5 * Math.cos((2 * Math.PI * n) / segment),
  );
  const power = window.reduce((sum, w) => sum + w * w, 0);
  const auto = Array.from({ length: count }, () => new Float64Array(bins));
  const pairs = (count * (count - 1)) / 2;
  const crossRe = Array.from({ length: pairs }, () => new Float64Array(bins));
  const crossIm = Array.from({ length: pairs }, () => new Float64Array(bins));
  const fft = new FFT(segment);
  const input = new Array<number>(segment);
  const transforms = Array.from({ length: count }, () => fft.createComplexArray() as number[]);
  let segments = 0;
  for (const run of runs) {
    for (let start = 0; start + segment <= run[0].length; start += segment / 2) {
      run.forEach((signal, s) => {
        let mean = 0;
        for (let n = 0; n < segment; n++) mean += signal[start + n] / segment;
        for (let n = 0; n < segment; n++) input[n] = window[n] * (signal[start + n] - mean);
        fft.realTransform(transforms[s], input);
      });
      segments++;
      accumulate(transforms, auto, crossRe, crossIm, bins);
    }
  }
  const scale = segments === 0 ? 0 : 1 / (rate_Hz * power * segments);
  for (const column of [...auto, ...crossRe, ...crossIm]) {
    // One-sided: all but zero and the Nyquist frequency stand for their mirror as well.
    for (let k = 0; k < bins; k++) column[k] *= k === 0 || k === bins - 1 ? scale : 2 * scale;
  }
  const f_Hz = Float64Array.from({ length: bins }, (_, k) => (k * rate_Hz) / segment);
  return { f_Hz, auto, crossRe, crossIm, segments, count };
}

function accumulate(
  transforms: readonly number[][],
  auto: readonly Float64Array[],
  crossRe: readonly Float64Array[],
  crossIm: readonly Float64Array[],
  bins: number,
): void {
  const count = transforms.length;
  for (let i = 0; i < count; i++) {
    const x = transforms[i];
    for (let k = 0; k < bins; k++) auto[i][k] += x[2 * k] * x[2 * k] + x[2 * k + 1] * x[2 * k + 1];
    for (let j = i + 1; j < count; j++) {
      const y = transforms[j];
      const re = crossRe[pairIndex(i, j, count)];
      const im = crossIm[pairIndex(i, j, count)];
      for (let k = 0; k < bins; k++) {
        re[k] += x[2 * k] * y[2 * k] + x[2 * k + 1] * y[2 * k + 1];
        im[k] += x[2 * k] * y[2 * k + 1] - x[2 * k + 1] * y[2 * k];
      }
    }
  }
}

/** Magnitude-squared coherence of signals i < j, 0 … 1. */
export function coherence(s: CrossSpectra, i: number, j: number): Float64Array {
  const pair = pairIndex(i, j, s.count);
  return s.f_Hz.map((_, k) => {
    const below = s.auto[i][k] * s.auto[j][k];
    return below > 0 ? (s.crossRe[pair][k] ** 2 + s.crossIm[pair][k] ** 2) / below : 0;
  });
}

/** Frequency response as it was measured: rate (deg/s) per µs of axis command. */
export interface MeasuredResponse {
  readonly f_Hz: Float64Array;
  readonly re: Float64Array;
  readonly im: Float64Array;
  /** Coherence of instrument and rate, or of command and rate without an instrument. */
  readonly coherence: Float64Array;
  /** Standard error of the magnitude as a share of it (Bendat & Piersol): √((1−γ²)/(2 n γ²)). */
  readonly error: Float64Array;
  /** Coherence above 0.6 (Tischler & Remple): the response can be trusted. */
  readonly trusted: Uint8Array;
}

export const TRUSTED_COHERENCE = 0.6;

/**
 * Response y/u: S_ry/S_ru with an instrument r (setpoint), else S_uy/S_uu.
 * @param s spectra of [r, u, y] or of [u, y]
 */
export function measuredResponse(s: CrossSpectra): MeasuredResponse {
  const bins = s.f_Hz.length;
  const re = new Float64Array(bins);
  const im = new Float64Array(bins);
  const withInstrument = s.count === 3;
  const y = s.count - 1;
  const u = y - 1;
  const output = pairIndex(0, y, s.count);
  const gamma = coherence(s, 0, y);
  if (withInstrument) {
    // The worse of what the instrument explains of the command and of the rate.
    coherence(s, 0, u).forEach((value, k) => {
      gamma[k] = Math.min(gamma[k], value);
    });
  }
  for (let k = 0; k < bins; k++) {
    const [yr, yi] = [s.crossRe[output][k], s.crossIm[output][k]];
    const ur = withInstrument ? s.crossRe[pairIndex(0, u, 3)][k] : s.auto[u][k];
    const ui = withInstrument ? s.crossIm[pairIndex(0, u, 3)][k] : 0;
    const below = ur * ur + ui * ui;
    re[k] = below > 0 ? (yr * ur + yi * ui) / below : 0;
    im[k] = below > 0 ? (yi * ur - yr * ui) / below : 0;
  }
  // Half-overlapped Hann segments are worth about 0.9 independent ones each... counted plainly as 0.75.
  const averages = Math.max(1, 0.75 * s.segments);
  return {
    f_Hz: s.f_Hz,
    re,
    im,
    coherence: gamma,
    error: gamma.map((value) => (value > 0 ? Math.sqrt((1 - value) / (2 * averages * value)) : Infinity)),
    trusted: Uint8Array.from(gamma, (value, k) => (k > 0 && value > TRUSTED_COHERENCE ? 1 : 0)),
  };
}
