/**
 * How the closed loop feels and what it takes away: bandwidth and phase delay by ADS-33E-PRF (3.3.2.1), and
 * disturbance-rejection bandwidth and peak (−3 dB and maximum of the sensitivity; ADS-33 flight-test practice).
 * Values from memory of the standard.
 */
import { argument, complex, magnitude, over, plus, type Complex } from './complex.ts';

export interface HandlingBandwidth {
  /** Lower of the phase bandwidth (−135°) and, for a rate response, the gain bandwidth (6 dB above −180°), Hz. */
  readonly bandwidth_Hz: number | null;
  readonly phaseBandwidth_Hz: number | null;
  readonly gainBandwidth_Hz: number | null;
  /** Phase that runs off between ω₁₈₀ and 2ω₁₈₀, over 2ω₁₈₀; s. */
  readonly phaseDelay_s: number | null;
  /** Why something is null. */
  readonly reason: string | null;
}

export interface DisturbanceRejection {
  /** Below it a disturbance is cut by 3 dB or more, Hz. */
  readonly bandwidth_Hz: number | null;
  readonly peak_dB: number;
  readonly peak_Hz: number;
}

const POINTS = 500;
const BISECTIONS = 50;

interface Curve {
  readonly omegas: Float64Array;
  readonly gains: Float64Array;
  /** Unwrapped, deg. */
  readonly phases: Float64Array;
}

/**
 * @param at attitude over command: of a rate loop, rate over setpoint divided by jω
 * @param low where the phase is still between −180° and 0, rad/s
 */
export function handlingBandwidth(
  at: (omega: number) => Complex,
  low: number,
  high: number,
  response: 'rate' | 'attitude',
): HandlingBandwidth {
  const curve = curveOf(at, low, high);
  const omega180 = fallsThrough(at, curve, -180);
  const omega135 = fallsThrough(at, curve, -135);
  const hertz = (omega: number | null) => (omega === null ? null : omega / (2 * Math.PI));
  if (omega180 === null) {
    return {
      bandwidth_Hz: response === 'attitude' ? hertz(omega135) : null,
      phaseBandwidth_Hz: hertz(omega135),
      gainBandwidth_Hz: null,
      phaseDelay_s: null,
      reason: 'the phase does not reach −180° below half the loop rate',
    };
  }
  const omega6dB = gainBandwidth(at, curve, omega180);
  const twice = 2 * omega180;
  const runOff = twice > high ? null : -180 - phaseAt(at, curve, twice);
  const all = response === 'rate' ? [omega135, omega6dB] : [omega135];
  const lowest = all.includes(null) ? null : Math.min(...all.filter((one) => one !== null));
  return {
    bandwidth_Hz: hertz(lowest),
    phaseBandwidth_Hz: hertz(omega135),
    gainBandwidth_Hz: hertz(omega6dB),
    phaseDelay_s: runOff === null ? null : (runOff * Math.PI) / 180 / twice,
    reason:
      runOff === null
        ? 'twice the −180° frequency lies above half the loop rate'
        : lowest === null
          ? 'the gain is nowhere 6 dB above that at −180°, or the phase starts below −135°'
          : null,
  };
}

function curveOf(at: (omega: number) => Complex, low: number, high: number): Curve {
  const omegas = Float64Array.from({ length: POINTS }, (_, i) => low * (high / low) ** (i / (POINTS - 1)));
  const gains = new Float64Array(POINTS);
  const phases = new Float64Array(POINTS);
  for (let i = 0; i < POINTS; i++) {
    const value = at(omegas[i]);
    gains[i] = magnitude(value);
    phases[i] = i === 0 ? startPhase(value) : near(degrees(value), phases[i - 1]);
  }
  return { omegas, gains, phases };
}

const degrees = (value: Complex) => (argument(value) * 180) / Math.PI;
const near = (phase: number, last: number) => phase - 360 * Math.round((phase - last) / 360);

/** At the low end an attitude lies between −180° and a little above 0. */
function startPhase(value: Complex): number {
  const phase = degrees(value);
  return phase > 90 ? phase - 360 : phase;
}

/** Phase at a frequency, unwrapped by the curve's own. */
function phaseAt(at: (omega: number) => Complex, curve: Curve, omega: number): number {
  const next = curve.omegas.findIndex((one) => one >= omega);
  const beside = next === -1 ? POINTS - 1 : next;
  return near(degrees(at(omega)), curve.phases[beside]);
}

function fallsThrough(at: (omega: number) => Complex, curve: Curve, level: number): number | null {
  for (let i = 1; i < POINTS; i++) {
    if (curve.phases[i] > level || curve.phases[i - 1] <= level) continue;
    return bisect(
      (omega) => near(degrees(at(omega)), curve.phases[i]) - level,
      curve.omegas[i - 1],
      curve.omegas[i],
    );
  }
  return null;
}

/** Nearest frequency below ω₁₈₀ at which the gain is twice that at ω₁₈₀. */
function gainBandwidth(at: (omega: number) => Complex, curve: Curve, omega180: number): number | null {
  const level = 10 ** (6 / 20) * magnitude(at(omega180));
  for (let i = POINTS - 1; i > 0; i--) {
    if (curve.omegas[i - 1] >= omega180 || curve.gains[i - 1] < level) continue;
    const high = Math.min(curve.omegas[i], omega180);
    return bisect((omega) => magnitude(at(omega)) - level, curve.omegas[i - 1], high);
  }
  return null;
}

function bisect(f: (omega: number) => number, low: number, high: number): number {
  let a = low;
  let b = high;
  const fa = f(a);
  for (let k = 0; k < BISECTIONS; k++) {
    const middle = (a + b) / 2;
    if (f(middle) * fa > 0) a = middle;
    else b = middle;
  }
  return (a + b) / 2;
}

/** @param at loop transfer L */
export function disturbanceRejection(
  at: (omega: number) => Complex,
  low: number,
  high: number,
  peak: { readonly value: number; readonly hertz: number },
): DisturbanceRejection {
  const size = (omega: number) => magnitude(over(complex(1), plus(at(omega), complex(1)))) - Math.SQRT1_2;
  let bandwidth_Hz: number | null = null;
  let last = low;
  let below = size(low) < 0;
  for (let i = 1; i < POINTS && below; i++) {
    const omega = low * (high / low) ** (i / (POINTS - 1));
    if (size(omega) >= 0) {
      bandwidth_Hz = bisect(size, last, omega) / (2 * Math.PI);
      below = false;
    }
    last = omega;
  }
  return { bandwidth_Hz, peak_dB: 20 * Math.log10(peak.value), peak_Hz: peak.hertz };
}
