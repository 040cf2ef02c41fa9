/** What Shape keeps with a craft: limits for starting gains and the person's own gain convention. */
import type { Convention } from '../../../shaping/conventions.ts';
import { parseConvention } from '../../../shaping/conventions.ts';
import { InputError } from '../../../craft/problem.ts';
import { STARTING_LIMITS, type StartingLimits } from '../../../shaping/startingGains.ts';

export interface KeptShape {
  readonly limits: StartingLimits;
  readonly own: Convention | null;
  /** Name of the convention that is shown. */
  readonly shown: string | null;
}

/** Reads a sheet of any age: what is not there or not usable is as it was at first. */
export function keptShape(raw: unknown): KeptShape {
  const sheet = objectOf(raw);
  return {
    limits: limitsOf(objectOf(sheet.limits)),
    own: ownOf(sheet.own),
    shown: typeof sheet.shown === 'string' ? sheet.shown : null,
  };
}

function objectOf(raw: unknown): Readonly<Record<string, unknown>> {
  return typeof raw === 'object' && raw !== null ? (raw as Record<string, unknown>) : {};
}

function limitsOf(raw: Readonly<Record<string, unknown>>): StartingLimits {
  const number = (value: unknown, otherwise: number) =>
    typeof value === 'number' && Number.isFinite(value) && value >= 0 ? value : otherwise;
  const known = STARTING_LIMITS;
  const uncertainty = objectOf(raw.uncertainty);
  return {
    maxSensitivity: Math.max(1.01, number(raw.maxSensitivity, known.maxSensitivity)),
    phaseMargin_deg: number(raw.phaseMargin_deg, known.phaseMargin_deg),
    delayMargin_ms: number(raw.delayMargin_ms, known.delayMargin_ms),
    noiseAtMotor_us_rms: number(raw.noiseAtMotor_us_rms, known.noiseAtMotor_us_rms),
    leastIntegralTime_crossovers: number(
      raw.leastIntegralTime_crossovers,
      known.leastIntegralTime_crossovers,
    ),
    overshoot_pct: number(raw.overshoot_pct, known.overshoot_pct),
    uncertainty: {
      mass: number(uncertainty.mass, known.uncertainty.mass),
      voltage: number(uncertainty.voltage, known.uncertainty.voltage),
      thrust: number(uncertainty.thrust, known.uncertainty.thrust),
    },
  };
}

function ownOf(raw: unknown): Convention | null {
  if (raw === undefined || raw === null) return null;
  try {
    return parseConvention(raw);
  } catch (error) {
    if (error instanceof InputError) return null;
    throw error;
  }
}
