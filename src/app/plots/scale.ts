/** One axis of a canvas plot: from values to pixels and back, and its ticks. */
import { readable } from '../store/units.ts';

export interface AxisRange {
  readonly low: number;
  readonly high: number;
  /** By logarithm; low must be above 0. */
  readonly log?: boolean;
}

/** Place of `value` on the axis, 0 … 1 between its ends. */
export function shareOf(range: AxisRange, value: number): number {
  return range.log === true
    ? Math.log(value / range.low) / Math.log(range.high / range.low)
    : (value - range.low) / (range.high - range.low);
}

export function valueAt(range: AxisRange, share: number): number {
  return range.log === true
    ? range.low * (range.high / range.low) ** share
    : range.low + share * (range.high - range.low);
}

/** Round values inside the range, about `wanted` of them. */
export function ticksOf(range: AxisRange, wanted: number): number[] {
  if (range.log === true && range.high / range.low > 8) return logTicks(range);
  const step = niceStep((range.high - range.low) / wanted);
  const first = Math.ceil(range.low / step - 1e-9);
  const ticks: number[] = [];
  for (let n = first; n * step <= range.high + step * 1e-9; n++)
    ticks.push(Number((n * step).toPrecision(12)));
  return ticks;
}

function logTicks(range: AxisRange): number[] {
  const decades = Math.log10(range.high / range.low);
  const mantissas = decades > 3 ? [1] : [1, 2, 5];
  const ticks: number[] = [];
  for (let power = Math.floor(Math.log10(range.low)); power <= Math.ceil(Math.log10(range.high)); power++) {
    for (const mantissa of mantissas) {
      const tick = Number((mantissa * 10 ** power).toPrecision(6));
      if (tick >= range.low * (1 - 1e-9) && tick <= range.high * (1 + 1e-9)) ticks.push(tick);
    }
  }
  return ticks;
}

function niceStep(size: number): number {
  const power = 10 ** Math.floor(Math.log10(size));
  const mantissa = size / power;
  return (mantissa <= 1 ? 1 : mantissa <= 2 ? 2 : mantissa <= 5 ? 5 : 10) * power;
}

export function tickText(value: number): string {
  return readable(value, 4);
}
