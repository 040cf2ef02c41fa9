/**
 * One-sided Dryden spectra Φ(Ω), ∫₀^∞ Φ dΩ = variance, as MIL-F-8785C 3.7 and MIL-HDBK-1797 print them (the
 * handbook's with 2L, 12 and 4), and estimates of the spectrum of a record.
 */
import FFT from 'fft.js';
import type { TurbulenceLevels } from '../../src/disturbance/turbulenceLevels.ts';

export const COMPONENTS = ['u', 'v', 'w', 'p', 'q', 'r'] as const;
export type Component = (typeof COMPONENTS)[number];
export type Document = 'MIL-F-8785C' | 'MIL-HDBK-1797';

function transverse(doc: Document, sigma: number, L: number, omega: number): number {
  const x = (L * omega) ** 2;
  return doc === 'MIL-F-8785C'
    ? (((sigma ** 2 * L) / Math.PI) * (1 + 3 * x)) / (1 + x) ** 2
    : (((sigma ** 2 * 2 * L) / Math.PI) * (1 + 12 * x)) / (1 + 4 * x) ** 2;
}

/** Φ at spatial frequency `omega`, rad/m, for span b. */
export function phi(
  doc: Document,
  component: Component,
  levels: TurbulenceLevels,
  b: number,
  omega: number,
): number {
  const { sigmaU_mps, sigmaV_mps, sigmaW_mps, lengthU_m, lengthV_m, lengthW_m } = levels;
  const longSpan = 1 + ((4 * b * omega) / Math.PI) ** 2;
  switch (component) {
    case 'u':
      return (sigmaU_mps ** 2 * ((2 * lengthU_m) / Math.PI)) / (1 + (lengthU_m * omega) ** 2);
    case 'v':
      return transverse(doc, sigmaV_mps, lengthV_m, omega);
    case 'w':
      return transverse(doc, sigmaW_mps, lengthW_m, omega);
    case 'p':
      return doc === 'MIL-F-8785C'
        ? ((sigmaW_mps ** 2 / lengthW_m) * 0.8 * Math.cbrt((Math.PI * lengthW_m) / (4 * b))) / longSpan
        : ((sigmaW_mps ** 2 / (2 * lengthW_m)) * 0.8 * Math.cbrt((2 * Math.PI * lengthW_m) / (4 * b))) /
            longSpan;
    case 'q':
      return (omega ** 2 / longSpan) * transverse(doc, sigmaW_mps, lengthW_m, omega);
    case 'r':
      return (
        (omega ** 2 / (1 + ((3 * b * omega) / Math.PI) ** 2)) * transverse(doc, sigmaV_mps, lengthV_m, omega)
      );
  }
}

/** Scale length that a component's band of frequencies is counted in. */
export function lengthOf(component: Component, levels: TurbulenceLevels): number {
  if (component === 'u') return levels.lengthU_m;
  if (component === 'v' || component === 'r') return levels.lengthV_m * levels.transverseFactor;
  return levels.lengthW_m * levels.transverseFactor;
}

/** ∫₀^∞ f(Ω) dΩ by the substitution Ω = tan-like on a logarithmic grid (Simpson), for smooth positive f. */
export function integral(f: (omega: number) => number): number {
  const [low, high, parts] = [Math.log(1e-7), Math.log(1e7), 200_000];
  const h = (high - low) / parts;
  let sum = 0;
  for (let i = 0; i <= parts; i++) {
    const omega = Math.exp(low + i * h);
    sum += (i === 0 || i === parts ? 1 : i % 2 === 1 ? 4 : 2) * f(omega) * omega;
  }
  return (sum * h) / 3;
}

/** Hann-windowed, one-sided power spectral density of a whole record (a power of two long), unit²/Hz. */
export class Periodogram {
  private readonly fft: FFT;
  private readonly window: Float64Array;
  private readonly input: number[];
  private readonly output: number[];
  private readonly power: number;

  constructor(
    readonly length: number,
    readonly step_s: number,
  ) {
    this.fft = new FFT(length);
    this.window = Float64Array.from({ length }, (_, i) => 0.5 * (1 - Math.cos((2 * Math.PI * i) / length)));
    this.power = this.window.reduce((sum, w) => sum + w * w, 0);
    this.input = new Array<number>(length).fill(0);
    this.output = this.fft.createComplexArray();
  }

  /** Mean over the bins of each band of estimate ÷ theory, added to `sums`. */
  addRatios(
    record: Float64Array,
    edges_Hz: readonly number[],
    theory: (f_Hz: number) => number,
    sums: Float64Array,
  ): void {
    for (let i = 0; i < this.length; i++) this.input[i] = record[i] * this.window[i];
    this.fft.realTransform(this.output, this.input);
    const df = 1 / (this.length * this.step_s);
    for (let band = 0; band + 1 < edges_Hz.length; band++) {
      const first = Math.max(1, Math.ceil(edges_Hz[band] / df));
      const end = Math.ceil(edges_Hz[band + 1] / df);
      let sum = 0;
      for (let k = first; k < end; k++) {
        const re = this.output[2 * k];
        const im = this.output[2 * k + 1];
        sum += (2 * this.step_s * (re * re + im * im)) / this.power / theory(k * df);
      }
      sums[band] += sum / (end - first);
    }
  }
}

/** Edges of `perDecade` bands a decade from 0.1 to 10 times V/L, Hz. */
export function bandEdges(airspeed_mps: number, length_m: number, perDecade: number): number[] {
  return Array.from(
    { length: 2 * perDecade + 1 },
    (_, i) => ((airspeed_mps / length_m) * 10 ** (i / perDecade - 1)) / (2 * Math.PI),
  );
}

export const decibels = (ratio: number): number => 10 * Math.log10(ratio);
