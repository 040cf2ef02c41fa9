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
import { DEG_PER_RAD, RAD_PER_DEG } from '../math/angles.ts';
import { quaternionFromEuler } from '../math/quaternion.ts';
import { siteAir } from '../physics/atmosphere.ts';
import { FlightDynamics } from '../physics/dynamics.ts';
import { ATTITUDE, INFLOW, RATES, ROTOR_SPEED, STATE_SIZE, VELOCITY } from '../physics/state.ts';
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

/** Current of the motors in an axis's pattern, for the heat that noise adds; amplitudes along the pattern. */
export interface PatternCurrent {
  readonly perUs_A: number;
  /** Per rad/s of rotor speed: the back-EMF. */
  readonly perSpeed_A: number;
  readonly resistance_ohm: number;
  /** Mean over the motors of the squared share that one has of the axis command. */
  readonly meanSquareShare: number;
}

export interface AxisModel {
  /**
   * Body rate (deg/s) from axis command (µs), motors and inflow in it. States: rate (rad/s), rotor speed
   * (rad/s) and inflow (m/s) along the axis's pattern.
   */
  readonly craft: ContinuousSystem;
  /** The same behind the gyro's bandwidth and delay: what the controller sees. */
  readonly measured: ContinuousSystem;
  /**
   * `measured` with the tilt and the sideways speed that follow from roll, or pitch and forward speed: true below
   * some 2 Hz as well, where speed bends the short-term model's phase. Yaw has none.
   */
  readonly drifting: ContinuousSystem;
  readonly plant: Plant;
  /** Null where the build gives only a motor lag. */
  readonly current: PatternCurrent | null;
  /** Angular acceleration per m/s of air that moves north, east, down past the craft heading north, deg/s². */
  readonly gust_dps2_per_mps: readonly [number, number, number];
  /** Largest error of the fitted plant over its band, dB and degrees. */
  readonly fitError_dB: number;
  readonly fitError_deg: number;
}

/** Band of the fit, Hz: where a rate loop of these craft crosses over. */
const FIT_LOW_HZ = 2;
const FIT_HIGH_HZ = 25;
const FIT_POINTS = 40;
/** Longest lag the fit looks at, s. */
const LONGEST_LAG_S = 1;

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
  /** ∂(rate of state i)/∂(state j); i from CURRENT on: the motors' currents. */
  readonly state: (i: number, j: number) => number;
  /** Per rad of roll, pitch, yaw. */
  readonly angle: (i: number, axis: number) => number;
  readonly duty: (i: number, motor: number) => number;
  /** Per m/s of air velocity north, east, down. */
  readonly wind: (i: number, direction: number) => number;
}

const CURRENT = STATE_SIZE;

/** Sink and climb about the trim at which the derivatives are taken and averaged, m/s. */
const BESIDE_MPS = 1e-3;

/**
 * The mean of the derivatives a little to either side of level flight: a rotor in climb and one in descent follow
 * different laws of inflow, and a hovering craft's rotors go to and fro between the two.
 */
function differentiate(craft: Craft, trim: Trim, density: number): Jacobian {
  const [up, down] = [-BESIDE_MPS, BESIDE_MPS].map((vd) => differentiateAt(craft, trim, density, vd));
  return {
    state: (i, j) => (up.state(i, j) + down.state(i, j)) / 2,
    angle: (i, j) => (up.angle(i, j) + down.angle(i, j)) / 2,
    duty: (i, motor) => (up.duty(i, motor) + down.duty(i, motor)) / 2,
    wind: (i, j) => (up.wind(i, j) + down.wind(i, j)) / 2,
  };
}

/** Central differences. */
function differentiateAt(craft: Craft, trim: Trim, density: number, sink_mps: number): Jacobian {
  const dynamics = new FlightDynamics(craft, density);
  dynamics.groundDown_m = 1e6;
  const s = trim.state.slice();
  s[VELOCITY + 2] += sink_mps;
  const duty = trim.duty.slice();
  const wind = new Float64Array(3);
  const angle = new Float64Array(3);
  const rate = new Float64Array(STATE_SIZE);
  const run = (): Float64Array => {
    dynamics.duty.set(duty);
    [dynamics.windNorth_mps, dynamics.windEast_mps, dynamics.windDown_mps] = wind;
    s.set(quaternionFromEuler(trim.roll_rad + angle[0], trim.pitch_rad + angle[1], angle[2]), ATTITUDE);
    dynamics.prepare(s);
    dynamics.derivative(s, rate);
    // Twice, since a lagged motor's battery sees the loads of the call before.
    dynamics.derivative(s, rate);
    return Float64Array.from([...rate, ...dynamics.motorCurrent_A]);
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
  // Steps of velocity and rate stay well inside the sink, so that no difference straddles the two laws.
  const states = Array.from({ length: STATE_SIZE }, (_, j) =>
    column(s, j, j >= ROTOR_SPEED && j < INFLOW ? 0.05 : 1e-5),
  );
  const angles = [0, 1, 2].map((axis) => column(angle, axis, 1e-5));
  const duties = [0, 1, 2, 3].map((motor) => column(duty, motor, 1e-5));
  const winds = [0, 1, 2].map((direction) => column(wind, direction, 1e-5));
  return {
    state: (i, j) => states[j][i],
    angle: (i, axis) => angles[axis][i],
    duty: (i, motor) => duties[motor][i],
    wind: (i, direction) => winds[direction][i],
  };
}

function axisModel(craft: Craft, jacobian: Jacobian, axis: AxisName): AxisModel {
  const k = AXES.indexOf(axis);
  const matrix = mixerMatrix(craft);
  // Pattern of the axis over the rotors: what one µs of axis command does to each command.
  const pattern = [0, 1, 2, 3].map((i) => matrix[4 * i + 1 + k]);
  const square = pattern.reduce((sum, value) => sum + value * value, 0);
  // Deviations along the pattern in, their share along the pattern out.
  const sumOver = (row: number, column: (row: number, rotor: number) => number) =>
    pattern.reduce((sum, p, rotor) => sum + p * column(row, rotor), 0);
  const along = (from: number, column: (row: number, rotor: number) => number) =>
    pattern.reduce((sum, p, rotor) => sum + p * sumOver(from + rotor, column), 0) / square;
  const meanOf = (from: number, column: number) =>
    pattern.reduce((sum, p, rotor) => sum + p * jacobian.state(from + rotor, column), 0) / square;
  const speed = (row: number, rotor: number) => jacobian.state(row, ROTOR_SPEED + rotor);
  const inflow = (row: number, rotor: number) => jacobian.state(row, INFLOW + rotor);
  const perUs = 1 / (craft.escMax_us - craft.escMin_us);
  const command = (row: number, rotor: number) => jacobian.duty(row, rotor) * perUs;
  const rate = RATES + k;
  const system: ContinuousSystem = {
    A: new Matrix([
      [jacobian.state(rate, rate), sumOver(rate, speed), sumOver(rate, inflow)],
      [meanOf(ROTOR_SPEED, rate), along(ROTOR_SPEED, speed), along(ROTOR_SPEED, inflow)],
      [meanOf(INFLOW, rate), along(INFLOW, speed), along(INFLOW, inflow)],
    ]),
    B: new Matrix([[sumOver(rate, command)], [along(ROTOR_SPEED, command)], [0]]),
    C: new Matrix([[DEG_PER_RAD, 0, 0]]),
    delay_s: 0,
    disturbance: new Matrix([[RAD_PER_DEG], [0], [0]]),
    commandUpdate_Hz: craft.escUpdate_Hz,
  };
  const { gyro } = craft.build;
  const behindGyro = (one: ContinuousSystem) => withSensor(one, gyro.bandwidth_Hz, gyro.delay_s);
  /** Speed along the world axis that tilt about this axis leads to, and the tilt itself, as two more states. */
  const withDrift = (short: ContinuousSystem): ContinuousSystem => {
    const speedState = VELOCITY + (axis === 'roll' ? 1 : 0);
    const A = Matrix.zeros(5, 5);
    A.setSubMatrix(short.A, 0, 0);
    A.set(0, 3, jacobian.state(rate, speedState));
    A.set(1, 3, meanOf(ROTOR_SPEED, speedState));
    A.set(2, 3, meanOf(INFLOW, speedState));
    A.setRow(3, [
      jacobian.state(speedState, rate),
      sumOver(speedState, speed),
      sumOver(speedState, inflow),
      jacobian.state(speedState, speedState),
      jacobian.angle(speedState, k),
    ]);
    A.set(0, 4, jacobian.angle(rate, k));
    A.set(4, 0, 1);
    const B = Matrix.zeros(5, 1);
    B.setSubMatrix(short.B, 0, 0);
    B.set(3, 0, sumOver(speedState, command));
    return { ...short, A, B, C: new Matrix([[DEG_PER_RAD, 0, 0, 0, 0]]), disturbance: undefined };
  };
  const gust = (direction: number) => DEG_PER_RAD * jacobian.wind(rate, direction);
  return {
    craft: system,
    measured: behindGyro(system),
    drifting: behindGyro(axis === 'yaw' ? system : withDrift(system)),
    current: !craft.motor.electric
      ? null
      : {
          perUs_A: along(CURRENT, command),
          perSpeed_A: along(CURRENT, speed),
          resistance_ohm: craft.motor.resistance_ohm,
          meanSquareShare: square / 4,
        },
    gust_dps2_per_mps: [gust(0), gust(1), gust(2)],
    ...fitPlant(system),
  };
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

/**
 * Least squares in log magnitude and phase over the band: K and Td in closed form for each τ, τ by a search over
 * its logarithm. A craft's damping and inflow make no delay of their own, so Td may come out 0.
 */
function fitPlant(system: ContinuousSystem): Pick<AxisModel, 'plant' | 'fitError_dB' | 'fitError_deg'> {
  const omegas = Array.from(
    { length: FIT_POINTS },
    (_, i) => 2 * Math.PI * FIT_LOW_HZ * (FIT_HIGH_HZ / FIT_LOW_HZ) ** (i / (FIT_POINTS - 1)),
  );
  const wanted = omegas.map((omega) => responseAt(system, omega));
  const sign = wanted[0].im < 0 ? 1 : -1;
  const square = omegas.reduce((sum, omega) => sum + omega * omega, 0);
  const trial = (lag_s: number) => {
    // What is left when the integrator and the lag are taken out: K e^(−jωTd).
    const rest = omegas.map((omega, i) =>
      times(wanted[i], times(complex(0, sign * omega), complex(1, omega * lag_s))),
    );
    const logs = rest.map((one) => Math.log(magnitude(one)));
    const phases = rest.map(argument);
    const logGain = logs.reduce((sum, one) => sum + one, 0) / FIT_POINTS;
    const delay_s = Math.max(0, -phases.reduce((sum, one, i) => sum + one * omegas[i], 0) / square);
    let cost = 0;
    let fitError_dB = 0;
    let fitError_deg = 0;
    for (let i = 0; i < FIT_POINTS; i++) {
      const dB = (20 / Math.LN10) * (logs[i] - logGain);
      const deg = DEG_PER_RAD * (phases[i] + omegas[i] * delay_s);
      // The customary weight: 1 dB counts as much as 7.57° (Tischler & Remple, ch. 11).
      cost += dB * dB + (deg / 7.57) ** 2;
      fitError_dB = Math.max(fitError_dB, Math.abs(dB));
      fitError_deg = Math.max(fitError_deg, Math.abs(deg));
    }
    const plant = { gain_dps2_per_us: sign * Math.exp(logGain), lag_s, delay_s };
    return { cost, plant, fitError_dB, fitError_deg };
  };
  let best = trial(0);
  let low = 1e-4;
  let high = LONGEST_LAG_S;
  for (let round = 0; round < 12; round++) {
    const ratio = (high / low) ** (1 / 24);
    for (let k = 0; k <= 24; k++) {
      const one = trial(low * ratio ** k);
      if (one.cost < best.cost) best = one;
    }
    if (best.plant.lag_s === 0) break;
    low = best.plant.lag_s / ratio;
    high = best.plant.lag_s * ratio;
  }
  const { plant, fitError_dB, fitError_deg } = best;
  return { plant, fitError_dB, fitError_deg };
}
