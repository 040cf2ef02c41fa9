/**
 * Power spectral density by Welch's method (1967), Hann windows with half overlap, one-sided, and the white
 * noise under it by Whittle's likelihood, flat or behind a first-order bandwidth.
 */
import FFT from 'fft.js';

export interface Spectrum {
  readonly frequency_Hz: Float64Array;
  /** Unit squared per Hz, one-sided. */
  readonly density: Float64Array;
  readonly step_Hz: number;
  /** Independent averages the overlapping segments are worth. */
  readonly averages: number;
}

const LARGEST_SEGMENT = 32_768;
const SMALLEST_SEGMENT = 64;

/** Largest power of two up to `value`. */
const powerOfTwo = (value: number): number => 2 ** Math.floor(Math.log2(value));

/** Segment length for lines half a hertz apart, at least eight segments. */
export function segmentFor(samples: number, rate_Hz: number): number {
  const wanted = powerOfTwo(2 * rate_Hz * 1.4);
  return Math.max(SMALLEST_SEGMENT, Math.min(wanted, LARGEST_SEGMENT, powerOfTwo(Math.max(2, samples / 8))));
}

/** @param values at least `segment` samples, evenly spaced */
export function powerSpectrum(values: Float64Array, rate_Hz: number, segment: number): Spectrum {
  const window = Float64Array.from(
    { length: segment },
    (_, n) => 0.5 - 0.5 * Math.cos((2 * Math.PI * n) / segment),
  );
  const power = window.reduce((sum, w) => sum + w * w, 0);
  const fft = new FFT(segment);
  const input = new Array<number>(segment);
  const out = fft.createComplexArray() as number[];
  const bins = segment / 2 + 1;
  const density = new Float64Array(bins);
  let count = 0;
  for (let start = 0; start + segment <= values.length; start += segment / 2) {
    let mean = 0;
    for (let n = 0; n < segment; n++) mean += values[start + n];
    mean /= segment;
    for (let n = 0; n < segment; n++) input[n] = window[n] * (values[start + n] - mean);
    fft.realTransform(out, input);
    for (let k = 0; k < bins; k++) density[k] += out[2 * k] ** 2 + out[2 * k + 1] ** 2;
    count++;
  }
  for (let k = 0; k < bins; k++) {
    const sides = k === 0 || k === bins - 1 ? 1 : 2;
    density[k] *= sides / (count * power * rate_Hz);
  }
  const step_Hz = rate_Hz / segment;
  return {
    frequency_Hz: Float64Array.from({ length: bins }, (_, k) => k * step_Hz),
    density,
    step_Hz,
    // Variance of half-overlapped Hann segments: 1/count · (1 + 2·(1/6)²), Welch (1967).
    averages: count / (1 + (1 / 18) * (1 - 1 / count)),
  };
}

export interface NoiseFit {
  /** One-sided density at low frequency, unit per √Hz, and its standard uncertainty. */
  readonly density: number;
  readonly sigma: number;
  /** First-order bandwidth; 0: flat up to half the sampling rate. */
  readonly bandwidth_Hz: number;
  /** One where a bin was used, zero where a line stands out of the noise. */
  readonly used: Uint8Array;
}

/** Neighbouring bins of a Hann window agree in part: this many carry one independent value. */
const BINS_PER_VALUE = 1 + 2 * (4 / 9) + 2 * (1 / 36);
const BANDWIDTHS = 48;
/** Twice the gain in log likelihood that a bandwidth must bring to be believed (99.9 %, one parameter). */
const LEAST_GAIN = 10.8;
const PASSES = 4;

/**
 * @param from_Hz where the plateau begins, above slow drift
 * @param step resolution of the values: its rounding noise, step²/12 spread evenly, is taken out
 */
export function fitNoise(spectrum: Spectrum, rate_Hz: number, from_Hz: number, step: number): NoiseFit {
  const { frequency_Hz: f, density, step_Hz, averages } = spectrum;
  const rounding = step ** 2 / (6 * rate_Hz);
  const used = Uint8Array.from(f, (value, k) =>
    value >= Math.max(from_Hz, 1.5 * step_Hz) && k < f.length - 1 ? 1 : 0,
  );
  const first = used.slice();
  let fit = fitShapes(f, density, used, rate_Hz);
  for (let pass = 0; pass < PASSES; pass++) {
    // Bins far above the noise belong to lines; their neighbours in the window go with them.
    const limit = 1 + 5 / Math.sqrt(averages) + 2 / averages;
    used.set(first);
    for (let k = 0; k < f.length; k++) {
      if (density[k] <= limit * fit.level * shape(f[k], fit.bandwidth_Hz, rate_Hz)) continue;
      for (let n = Math.max(0, k - 2); n <= Math.min(f.length - 1, k + 2); n++) used[n] = 0;
    }
    if (!used.some((one) => one === 1)) used.set(first);
    fit = fitShapes(f, density, used, rate_Hz);
  }
  const values = (used.reduce((sum, one) => sum + one, 0) * averages) / BINS_PER_VALUE;
  const gain = (fit.gain * averages) / BINS_PER_VALUE;
  const flat = gain < LEAST_GAIN || fit.bandwidth_Hz === 0;
  const level = Math.max(0, (flat ? fit.flatLevel : fit.level) - rounding);
  const sharing = flat ? 1 : levelVariance(f, used, fit.bandwidth_Hz, rate_Hz);
  return {
    density: Math.sqrt(level),
    sigma:
      (Math.sqrt(Math.max(level, 1e-300)) / 2) *
      Math.sqrt(sharing / values) *
      ((level + rounding) / Math.max(level, 1e-300)),
    bandwidth_Hz: flat ? 0 : fit.bandwidth_Hz,
    used,
  };
}

/**
 * Spectrum, over the squared density, of white noise behind a first-order bandwidth sampled at `rate`: an
 * autoregressive sequence of order one with variance (π/2)·bandwidth, folding included. 1 without a bandwidth.
 */
function shape(frequency: number, bandwidth: number, rate: number): number {
  if (bandwidth === 0) return 1;
  const a = Math.exp((-2 * Math.PI * bandwidth) / rate);
  const variance = (Math.PI / 2) * bandwidth;
  return (
    ((2 / rate) * variance * (1 - a * a)) / (1 - 2 * a * Math.cos((2 * Math.PI * frequency) / rate) + a * a)
  );
}

interface ShapeFit {
  readonly level: number;
  readonly flatLevel: number;
  readonly bandwidth_Hz: number;
  /** Twice the log-likelihood gained over a flat spectrum, for one average a bin. */
  readonly gain: number;
}

/** Whittle: the least Σ ln S + P/S; for a given shape the level is the mean of P/shape. */
function fitShapes(f: Float64Array, density: Float64Array, used: Uint8Array, rate: number): ShapeFit {
  const cost = (bandwidth: number): { level: number; cost: number } => {
    let sum = 0;
    let logs = 0;
    let count = 0;
    for (let k = 0; k < f.length; k++) {
      if (used[k] === 0) continue;
      const one = shape(f[k], bandwidth, rate);
      sum += density[k] / one;
      logs += Math.log(one);
      count++;
    }
    const level = count === 0 ? 0 : sum / count;
    return { level, cost: level > 0 ? count * Math.log(level) + logs + count : 0 };
  };
  const flat = cost(0);
  let best = { bandwidth: 0, ...flat };
  const low = rate / 400;
  const ratio = (0.7 * rate) / low;
  const at = (i: number) => low * ratio ** (i / BANDWIDTHS);
  for (let i = 0; i <= BANDWIDTHS; i++) {
    const found = cost(at(i));
    if (found.cost < best.cost) best = { bandwidth: at(i), ...found };
  }
  if (best.bandwidth > 0)
    best = goldenSection(
      cost,
      best.bandwidth / ratio ** (1 / BANDWIDTHS),
      best.bandwidth * ratio ** (1 / BANDWIDTHS),
    );
  return {
    level: best.level,
    flatLevel: flat.level,
    bandwidth_Hz: best.bandwidth,
    gain: 2 * (flat.cost - best.cost),
  };
}

function goldenSection(cost: (x: number) => { level: number; cost: number }, low: number, high: number) {
  const golden = (Math.sqrt(5) - 1) / 2;
  let [a, b] = [Math.log(low), Math.log(high)];
  for (let i = 0; i < 24; i++) {
    const c = b - golden * (b - a);
    const d = a + golden * (b - a);
    if (cost(Math.exp(c)).cost < cost(Math.exp(d)).cost) b = d;
    else a = c;
  }
  const bandwidth = Math.exp((a + b) / 2);
  return { bandwidth, ...cost(bandwidth) };
}

/** Variance of ln level, in units of one over the number of values, with the bandwidth fitted beside it. */
function levelVariance(f: Float64Array, used: Uint8Array, bandwidth: number, rate: number): number {
  let count = 0;
  let first = 0;
  let second = 0;
  for (let k = 0; k < f.length; k++) {
    if (used[k] === 0) continue;
    const slope =
      Math.log(shape(f[k], bandwidth * 1.01, rate) / shape(f[k], bandwidth / 1.01, rate)) /
      (2 * Math.log(1.01));
    count++;
    first += slope;
    second += slope * slope;
  }
  const spread = second / count - (first / count) ** 2;
  return spread > 0 ? second / count / spread : 1;
}
