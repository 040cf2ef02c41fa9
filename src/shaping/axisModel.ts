/**
 * Linear model of one axis by differentiating the nonlinear equations at a trim: states body rate, rotor speed
 * and inflow along the axis's own pattern over the four rotors. A transfer K e^(−sTd)/(s(τs+1)) is fitted to
 * it, with the error of that fit.
 */
import { Matrix } from 'ml-matrix';
import { compileCraft, type Craft } from '../craft/compile.ts';
import type { Build } from '../craft/build.ts';
import { AXES, type AxisName } from '../craft/gains.ts';
import { withoutPayload } from '../craft/payload.ts';
import { mixerMatrix } from '../control/mixer.ts';
import { DEG_PER_RAD } from '../math/angles.ts';
import { siteAir } from '../physics/atmosphere.ts';
import { FlightDynamics } from '../physics/dynamics.ts';
import { INFLOW, RATES, ROTOR_SPEED, STATE_SIZE } from '../physics/state.ts';
import { findTrim, HOVER, type Trim } from '../physics/trim.ts';
import { argument, complex, magnitude, over, times, unit, type Complex } from './complex.ts';
import { withSensor, type ContinuousSystem, type Plant } from './continuous.ts';

/** Where the craft is linearised. */
export interface TrimChoice {
  readonly forward_mps?: number;
  readonly climb_mps?: number;
  readonly charge?: number;
  readonly elevation_m?: number;
  readonly payloadReleased?: boolean;
}

export interface AxisModel {
  /** Body rate (deg/s) from axis command (µs), motors and inflow in it. */
  readonly craft: ContinuousSystem;
  /** The same behind the gyro's bandwidth and delay: what the controller sees. */
  readonly measured: ContinuousSystem;
  readonly plant: Plant;
  /** Largest error of the fitted plant over its band, dB and degrees. */
  readonly fitError_dB: number;
  readonly fitError_deg: number;
}

/** Band of the fit, Hz: where a rate loop of these craft crosses over. */
const FIT_LOW_HZ = 2;
const FIT_HIGH_HZ = 25;
const FIT_POINTS = 40;

/**
 * Models of the three axes.
 * @throws RangeError when there is no trim at this point.
 */
export function axisModels(build: Build, choice: TrimChoice = {}): Record<AxisName, AxisModel> {
  const flown = choice.payloadReleased === true ? withoutPayload(build) : build;
  const craft = compileCraft(flown);
  const air = siteAir({ elevation_m: choice.elevation_m ?? 0 });
  const trim = findTrim(craft, {
    ...HOVER,
    north_mps: choice.forward_mps ?? 0,
    down_mps: -(choice.climb_mps ?? 0),
    charge: choice.charge ?? craft.startCharge,
    density_kgpm3: air.density_kgpm3,
  });
  const jacobian = differentiate(craft, trim, air.density_kgpm3);
  const models = AXES.map((axis) => [axis, axisModel(craft, jacobian, axis)] as const);
  return Object.fromEntries(models) as Record<AxisName, AxisModel>;
}

interface Jacobian {
  /** ∂(rate of state i)/∂(state j). */
  readonly state: (i: number, j: number) => number;
  readonly duty: (i: number, motor: number) => number;
}

/** Central differences; duties last. */
function differentiate(craft: Craft, trim: Trim, density: number): Jacobian {
  const dynamics = new FlightDynamics(craft, density);
  dynamics.groundDown_m = 1e6;
  const s = trim.state.slice();
  const duty = trim.duty.slice();
  const rate = new Float64Array(STATE_SIZE);
  const run = (): Float64Array => {
    dynamics.duty.set(duty);
    dynamics.prepare(s);
    dynamics.derivative(s, rate);
    // Twice, since a lagged motor's battery sees the loads of the call before.
    dynamics.derivative(s, rate);
    return rate.slice();
  };
  const column = (array: Float64Array, index: number, step: number): Float64Array => {
    const kept = array[index];
    array[index] = kept + step;
    const high = run();
    array[index] = kept - step;
    const low = run();
    array[index] = kept;
    return high.map((value, i) => (value - low[i]) / (2 * step));
  };
  const states = Array.from({ length: STATE_SIZE }, (_, j) =>
    column(s, j, j >= ROTOR_SPEED && j < INFLOW ? 0.05 : 1e-4),
  );
  const duties = [0, 1, 2, 3].map((motor) => column(duty, motor, 1e-5));
  return { state: (i, j) => states[j][i], duty: (i, motor) => duties[motor][i] };
}

function axisModel(craft: Craft, jacobian: Jacobian, axis: AxisName): AxisModel {
  const k = AXES.indexOf(axis);
  const matrix = mixerMatrix(craft);
  // Pattern of the axis over the rotors: what one µs of axis command does to each command.
  const pattern = [0, 1, 2, 3].map((i) => matrix[4 * i + 1 + k]);
  const square = pattern.reduce((sum, value) => sum + value * value, 0);
  // Deviations along the pattern in, their share along the pattern out.
  const along = (from: number, to: number) =>
    pattern.reduce(
      (sum, pi, a) =>
        sum + pattern.reduce((part, pj, b) => part + pi * pj * jacobian.state(from + a, to + b), 0),
      0,
    ) / square;
  const rate = RATES + k;
  const sumOver = (row: number, from: number) =>
    pattern.reduce((sum, p, a) => sum + p * jacobian.state(row, from + a), 0);
  const meanOf = (from: number, column: number) =>
    pattern.reduce((sum, p, a) => sum + p * jacobian.state(from + a, column), 0) / square;
  const A = new Matrix([
    [jacobian.state(rate, rate), sumOver(rate, ROTOR_SPEED), sumOver(rate, INFLOW)],
    [meanOf(ROTOR_SPEED, rate), along(ROTOR_SPEED, ROTOR_SPEED), along(ROTOR_SPEED, INFLOW)],
    [meanOf(INFLOW, rate), along(INFLOW, ROTOR_SPEED), along(INFLOW, INFLOW)],
  ]);
  const perUs = 1 / (craft.escMax_us - craft.escMin_us);
  const dutyIn = (row: number) => pattern.reduce((sum, p, a) => sum + p * jacobian.duty(row, a), 0) * perUs;
  const rotorIn =
    pattern.reduce(
      (sum, p, a) =>
        sum + p * pattern.reduce((part, q, b) => part + q * jacobian.duty(ROTOR_SPEED + a, b), 0),
      0,
    ) / square;
  const B = new Matrix([[dutyIn(rate)], [rotorIn * perUs], [0]]);
  const system: ContinuousSystem = { A, B, C: new Matrix([[DEG_PER_RAD, 0, 0]]), delay_s: 0 };
  const { gyro } = craft.build;
  const fit = fitPlant(system);
  return { craft: system, measured: withSensor(system, gyro.bandwidth_Hz, gyro.delay_s), ...fit };
}

/** C (jωI − A)⁻¹ B e^(−jωTd) by elimination on a few states. */
export function responseAt(system: ContinuousSystem, omega: number): Complex {
  const n = system.A.rows;
  const rows: Complex[][] = Array.from({ length: n }, (_, i) =>
    Array.from({ length: n + 1 }, (_unused, j) =>
      j === n ? complex(system.B.get(i, 0)) : complex(-system.A.get(i, j), i === j ? omega : 0),
    ),
  );
  for (let k = 0; k < n; k++) {
    for (let r = k + 1; r < n; r++) {
      const factor = over(rows[r][k], rows[k][k]);
      for (let c = k; c <= n; c++) {
        const take = times(factor, rows[k][c]);
        rows[r][c] = complex(rows[r][c].re - take.re, rows[r][c].im - take.im);
      }
    }
  }
  const x = new Array<Complex>(n).fill(complex(0));
  for (let k = n - 1; k >= 0; k--) {
    let { re, im } = rows[k][n];
    for (let c = k + 1; c < n; c++) {
      const take = times(rows[k][c], x[c]);
      re -= take.re;
      im -= take.im;
    }
    x[k] = over(complex(re, im), rows[k][k]);
  }
  let y = complex(0);
  for (let k = 0; k < n; k++)
    y = complex(y.re + x[k].re * system.C.get(0, k), y.im + x[k].im * system.C.get(0, k));
  return times(y, unit(-omega * system.delay_s));
}

export function plantResponseAt(plant: Plant, omega: number): Complex {
  const denominator = times(complex(0, omega), complex(1, omega * plant.lag_s));
  return times(over(complex(plant.gain_dps2_per_us), denominator), unit(-omega * plant.delay_s));
}

/**
 * Least squares in log magnitude and phase over the band: τ and Td by a coarse-to-fine search, K in closed
 * form for each. A craft's damping and inflow make no delay of their own, so Td may come out 0.
 */
function fitPlant(system: ContinuousSystem): Pick<AxisModel, 'plant' | 'fitError_dB' | 'fitError_deg'> {
  const omegas = Array.from(
    { length: FIT_POINTS },
    (_, i) => 2 * Math.PI * FIT_LOW_HZ * (FIT_HIGH_HZ / FIT_LOW_HZ) ** (i / (FIT_POINTS - 1)),
  );
  const wanted = omegas.map((omega) => responseAt(system, omega));
  const sign = wanted[0].im < 0 ? 1 : -1;
  const trial = (lag_s: number, delay_s: number) => {
    const unitPlant = { gain_dps2_per_us: sign, lag_s, delay_s };
    const ratios = omegas.map((omega, i) => over(wanted[i], plantResponseAt(unitPlant, omega)));
    const logGain = ratios.reduce((sum, ratio) => sum + Math.log(magnitude(ratio)), 0) / ratios.length;
    let cost = 0;
    let worst_dB = 0;
    let worst_deg = 0;
    for (const ratio of ratios) {
      const dB = (20 / Math.LN10) * (Math.log(magnitude(ratio)) - logGain);
      const deg = (argument(ratio) * 180) / Math.PI;
      // The customary weight: 1 dB counts as much as 7.57° (Tischler & Remple, ch. 11).
      cost += dB * dB + (deg / 7.57) ** 2;
      worst_dB = Math.max(worst_dB, Math.abs(dB));
      worst_deg = Math.max(worst_deg, Math.abs(deg));
    }
    return { cost, worst_dB, worst_deg, gain: sign * Math.exp(logGain) };
  };
  let best = { lag_s: 0.03, delay_s: 0, ...trial(0.03, 0) };
  let lagSpan = 2.5;
  let delaySpan = 0.004;
  for (let round = 0; round < 26; round++) {
    const centre = best;
    for (let a = -4; a <= 4; a++) {
      for (let b = -4; b <= 4; b++) {
        const lag_s = centre.lag_s * Math.exp((lagSpan * a) / 4);
        const delay_s = Math.max(0, centre.delay_s + (delaySpan * b) / 4);
        const result = trial(lag_s, delay_s);
        if (result.cost < best.cost) best = { lag_s, delay_s, ...result };
      }
    }
    lagSpan *= 0.6;
    delaySpan *= 0.6;
  }
  return {
    plant: { gain_dps2_per_us: best.gain, lag_s: best.lag_s, delay_s: best.delay_s },
    fitError_dB: best.worst_dB,
    fitError_deg: best.worst_deg,
  };
}
