/** Vibration lines in a gyro's spectrum and the rotor orders they belong to, folding about half the rate included. */
import { median } from 'simple-statistics';
import type { Spectrum } from './spectrum.ts';

export interface VibrationPeak {
  readonly frequency_Hz: number;
  /** Amplitude of the line (peak, not rms), unit of the signal. */
  readonly amplitude: number;
  /** Turns of the rotor per cycle of the line: 1 once-per-turn, the number of blades for blade pass; null: none fits. */
  readonly order: number | null;
  /** True when the true frequency lies above half the sampling rate and is seen folded down. */
  readonly folded: boolean;
  /** The line's own frequency when it is an order, Hz. */
  readonly source_Hz: number | null;
}

export interface RotorSpeed {
  readonly speed_Hz: number;
  /** Spread of the speed over the record, and between the rotors. */
  readonly spread_Hz: number;
  readonly estimated: boolean;
}

const MOST_PEAKS = 24;
/** Bins on either side that give the level of the noise beneath a line. */
const BASE_BINS = 24;
const LEAST_ROTOR_HZ = 8;
const MOST_ROTOR_HZ = 700;

/** Lines that stand clear of the noise around them, the largest first. */
export function findPeaks(
  spectrum: Spectrum,
  from_Hz: number,
): { frequency_Hz: number; amplitude: number }[] {
  const { frequency_Hz: f, density, step_Hz, averages } = spectrum;
  const limit = Math.max(4, 1 + 8 / Math.sqrt(averages));
  const base = baseline(density);
  const peaks: { frequency_Hz: number; amplitude: number }[] = [];
  let k = Math.max(2, Math.ceil(from_Hz / step_Hz));
  while (k < f.length - 1) {
    if (!(density[k] > limit * base[k])) {
      k++;
      continue;
    }
    let end = k;
    while (
      end + 1 < f.length &&
      (density[end + 1] > limit * base[end + 1] ||
        (end + 2 < f.length && density[end + 2] > limit * base[end + 2]))
    )
      end++;
    peaks.push(peakOver(spectrum, base, Math.max(1, k - 2), Math.min(f.length - 1, end + 2)));
    k = end + 3;
  }
  return peaks.sort((a, b) => b.amplitude - a.amplitude).slice(0, MOST_PEAKS);
}

function baseline(density: Float64Array): Float64Array {
  const base = new Float64Array(density.length);
  for (let k = 0; k < density.length; k++) {
    const low = Math.max(1, k - BASE_BINS);
    const high = Math.min(density.length - 1, k + BASE_BINS);
    base[k] = Math.max(median(Array.from(density.slice(low, high + 1))), 1e-300);
  }
  return base;
}

function peakOver(spectrum: Spectrum, base: Float64Array, from: number, to: number) {
  let power = 0;
  let moment = 0;
  for (let k = from; k <= to; k++) {
    const excess = Math.max(0, spectrum.density[k] - base[k]);
    power += excess * spectrum.step_Hz;
    moment += excess * spectrum.step_Hz * spectrum.frequency_Hz[k];
  }
  return { frequency_Hz: moment / power, amplitude: Math.sqrt(2 * power) };
}

/** Where a frequency appears after sampling. */
export function folded(frequency_Hz: number, rate_Hz: number): number {
  const rest = frequency_Hz % rate_Hz;
  return rest > rate_Hz / 2 ? rate_Hz - rest : rest;
}

const ordersFor = (blades: number): number[] =>
  [...new Set([1, 2, 3, 4, blades, 2 * blades])].sort((a, b) => a - b);

/** Gives each peak the lowest rotor order that falls on it. */
export function matchOrders(
  peaks: readonly { frequency_Hz: number; amplitude: number }[],
  rotor: RotorSpeed | null,
  blades: number,
  rate_Hz: number,
  step_Hz: number,
): VibrationPeak[] {
  return peaks.map((peak) => {
    if (rotor === null) return { ...peak, order: null, folded: false, source_Hz: null };
    for (const order of ordersFor(blades)) {
      const source_Hz = order * rotor.speed_Hz;
      const tolerance = order * Math.max(rotor.spread_Hz, 0.015 * rotor.speed_Hz) + 1.5 * step_Hz;
      if (Math.abs(folded(source_Hz, rate_Hz) - peak.frequency_Hz) <= tolerance) {
        return { ...peak, order, folded: source_Hz > rate_Hz / 2, source_Hz };
      }
    }
    return { ...peak, order: null, folded: false, source_Hz: null };
  });
}

/**
 * The rotor speed that explains the most of the lines by once-per-turn and blade pass; null when no line has a
 * second at the blades' multiple of it.
 */
export function estimateSpeed(
  peaks: readonly { frequency_Hz: number; amplitude: number }[],
  blades: number,
  rate_Hz: number,
  step_Hz: number,
): RotorSpeed | null {
  let best: RotorSpeed | null = null;
  let bestScore = 0;
  const candidates = peaks.flatMap((peak) => [peak.frequency_Hz, peak.frequency_Hz / blades]);
  for (const speed_Hz of candidates) {
    if (speed_Hz < LEAST_ROTOR_HZ || speed_Hz > MOST_ROTOR_HZ) continue;
    const rotor = { speed_Hz, spread_Hz: 0, estimated: true };
    const matched = matchOrders(peaks, rotor, blades, rate_Hz, step_Hz).filter((peak) => peak.order !== null);
    const orders = new Set(matched.map((peak) => peak.order));
    if (!orders.has(1) || !orders.has(blades)) continue;
    // Power explained; of two equal ones the higher speed, which needs no invented orders.
    const score = matched.reduce((sum, peak) => sum + peak.amplitude ** 2, 0) * (1 + 1e-6 * speed_Hz);
    if (score > bestScore) {
      bestScore = score;
      best = rotor;
    }
  }
  return best;
}
