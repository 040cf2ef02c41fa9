/**
 * Open-circuit voltage of one lithium-polymer cell against state of charge.
 * Typical rest voltages of the trade (common practice, no source); between the points the curve is linear.
 */
const STATE_OF_CHARGE = [0, 0.05, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1];
const VOLTAGE_V = [3.27, 3.61, 3.69, 3.73, 3.77, 3.79, 3.82, 3.87, 3.95, 4.02, 4.11, 4.2];

export function fullCellVoltage_V(): number {
  return VOLTAGE_V[VOLTAGE_V.length - 1];
}

/** Open-circuit voltage, V, of one cell at `charge` (0 empty … 1 full; held at the ends). */
export function openCircuitVoltage_V(charge: number): number {
  if (charge <= 0) return VOLTAGE_V[0];
  if (charge >= 1) return VOLTAGE_V[VOLTAGE_V.length - 1];
  let i = 1;
  while (STATE_OF_CHARGE[i] < charge) i++;
  const share = (charge - STATE_OF_CHARGE[i - 1]) / (STATE_OF_CHARGE[i] - STATE_OF_CHARGE[i - 1]);
  return VOLTAGE_V[i - 1] + share * (VOLTAGE_V[i] - VOLTAGE_V[i - 1]);
}
