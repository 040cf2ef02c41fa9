/** Shown units: what a person reads and types, beside the SI value that is kept. */
import type { UnitSystem } from './document.ts';

interface ShownUnit {
  readonly unit: string;
  /** shown = kept × factor */
  readonly factor: number;
}

/** International yard and pound agreement (1959): foot 0.3048 m, pound 0.45359237 kg; mile 5280 ft. */
const IMPERIAL: Readonly<Record<string, ShownUnit>> = {
  m: { unit: 'ft', factor: 1 / 0.3048 },
  mm: { unit: 'in', factor: 1 / 25.4 },
  'm/s': { unit: 'mph', factor: 3600 / 1609.344 },
  'm/s²': { unit: 'ft/s²', factor: 1 / 0.3048 },
  kg: { unit: 'lb', factor: 1 / 0.45359237 },
  g: { unit: 'oz', factor: 16 / 453.59237 },
  N: { unit: 'lbf', factor: 1 / (0.45359237 * 9.80665) },
};

/** How `unit` is shown under `system`; units without an imperial sister stay as they are. */
export function shownUnit(unit: string, system: UnitSystem): ShownUnit {
  return (system === 'imperial' ? IMPERIAL[unit] : undefined) ?? { unit, factor: 1 };
}

/** A number for reading: `digits` significant, no exponent in the range of daily use, a true minus sign. */
export function readable(value: number, digits = 4): string {
  if (!Number.isFinite(value)) return '–';
  if (value === 0) return '0';
  const size = Math.abs(value);
  const text =
    size >= 1e-4 && size < 1e7
      ? String(Number(value.toPrecision(Math.max(digits, Math.ceil(Math.log10(size))))))
      : value.toExponential(Math.max(0, digits - 2));
  return text.replace('-', '−');
}

/** "7 m/s" or "15.7 mph": a kept value with its shown unit, a no-break space between. */
export function withUnit(value: number, unit: string, system: UnitSystem, digits = 3): string {
  const shown = shownUnit(unit, system);
  return `${readable(value * shown.factor, digits)}\u00a0${shown.unit}`;
}
