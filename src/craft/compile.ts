/**
 * Compiles a build into the constants that the flight uses: SI, radians, rotors in the order FL, FR, RL, RR,
 * positions from the centre of mass. Immutable: a changed build is compiled anew.
 */
import { inverse, Matrix } from 'ml-matrix';
import { RAD_PER_DEG } from '../math/angles.ts';
import { CORNERS, isElectric, type Build } from './build.ts';
import { staticCoefficients } from './propellerTable.ts';
import { topSpeed_radps } from './plausible.ts';

/** Points of the tables over rotor speed and advance ratio, equally spaced. */
export const TABLE_POINTS = 257;

/**
 * Blade lift slope times solidity, σa, where no advance table was measured: 0.53, found from the slope of
 * C_T against J of the UIUC 10 × 4.7 propeller (kt0835, rd0841) with momentum theory for the inflow.
 */
const TYPICAL_LIFT_SLOPE_SOLIDITY = 0.53;
/** In-plane drag over ρ D³ where it was not measured; common practice, no source. */
const TYPICAL_INPLANE_DRAG = 0.007;
const SEA_LEVEL_DENSITY = 1.225;
/** Apparent mass of the flow through a disc over ρ A R, Pitt & Peters (1981). */
const APPARENT_MASS = 8 / (3 * Math.PI);

export interface RotorConstants {
  readonly radius_m: number;
  readonly discArea_m2: number;
  /** Thrust over ρ Ω², m⁴, on a uniform grid of speeds from 0 to tableTop_radps. */
  readonly thrustFactor: Float64Array;
  /** Shaft torque over ρ Ω², m⁵, at rest, on the same grid. */
  readonly torqueFactor: Float64Array;
  /** Hover inflow ratio λ_h = √(C_T/2) in helicopter notation, times R: v_h = this · Ω. */
  readonly hoverInflowFactor_m: Float64Array;
  readonly tableTop_radps: number;
  /** Table places per rad/s. */
  readonly tablePerSpeed_s: number;
  /** 1/(2A), 1/m². */
  readonly perTwiceArea_m2: number;
  /** 2/(apparent mass over ρ A), 1/m: rate of the inflow per difference of squared velocities. */
  readonly inflowRelaxation_per_m: number;
  /** (σa/4) π R³, m³: loss of thrust per ρ Ω and per inflow velocity beyond hover's. */
  readonly inflowSlope_m3: number;
  /** Measured C_T(J)/C_T(0) and C_P(J)/C_P(0) on a uniform grid 0 … advanceTop; empty when not measured. */
  readonly advanceThrust: Float64Array;
  readonly advancePower: Float64Array;
  readonly advanceTop: number;
  /** N per (rad/s · m/s) at sea-level density. */
  readonly inPlaneDrag: number;
  readonly inertia_kgm2: number;
  readonly blades: number;
}

export interface MotorConstants {
  readonly electric: boolean;
  /** K_t = K_e, N·m/A = V·s/rad. */
  readonly torqueConstant: number;
  readonly resistance_ohm: number;
  readonly noLoadCurrent_A: number;
  readonly heatCapacity_J_per_K: number;
  readonly thermalResistance_K_per_W: number;
  readonly lagUp_s: number;
  readonly lagDown_s: number;
  /** Steady speed at full command and full pack, lagged motor only. */
  readonly maxSpeed_radps: number;
}

export interface Craft {
  readonly name: string;
  readonly build: Build;
  readonly mass_kg: number;
  /** 3×3 row by row, about the centre of mass, and its inverse. */
  readonly inertia: Float64Array;
  readonly inertiaInverse: Float64Array;
  readonly dragArea_m2: Float64Array;
  readonly centreOfMass_m: Float64Array;
  /** 4 × xyz from the centre of mass. */
  readonly rotorPosition_m: Float64Array;
  /** +1 for clockwise seen from above (positive about body z), −1 for counter-clockwise. */
  readonly spin: Float64Array;
  readonly rotor: RotorConstants;
  readonly motor: MotorConstants;
  readonly cells: number;
  readonly capacity_C: number;
  readonly batteryResistance_ohm: number;
  readonly startCharge: number;
  readonly cutoff_V: number;
  readonly escMin_us: number;
  readonly escMax_us: number;
  readonly escIdle_us: number;
  readonly escResolution_us: number;
  readonly escUpdate_Hz: number;
  readonly braking: boolean;
  /** Rotor-tip to rotor-tip width, m. */
  readonly span_m: number;
  readonly topSpeed_radps: number;
  readonly legHeight_m: number;
  readonly legHalfTrack_m: number;
  /** Body axes to sensor axes, 3×3, small-angle mounting error of the gyro. */
  readonly gyroMounting: Float64Array;
}

/** Efficiency of motor and ESC where only a lag was measured, for the current drawn; common practice. */
export const LAGGED_MOTOR_EFFICIENCY = 0.75;

export function compileCraft(build: Build): Craft {
  const { airframe, battery, esc } = build;
  const { xx, yy, zz, xy, xz, yz } = airframe.inertia_kgm2;
  const inertia = new Matrix([
    [xx, xy, xz],
    [xy, yy, yz],
    [xz, yz, zz],
  ]);
  const ordered = CORNERS.map((corner) => {
    const rotor = build.rotors.find((one) => one.corner === corner);
    if (rotor === undefined) throw new Error(`build has no rotor at ${corner}; parseBuild checks this`);
    return rotor;
  });
  const com = airframe.centreOfMass_m;
  const rotorPosition_m = Float64Array.from(
    ordered.flatMap((rotor) => rotor.position_m.map((value, axis) => value - com[axis])),
  );
  const span_m =
    2 *
    (Math.max(...ordered.map((rotor) => Math.abs(rotor.position_m[1] - com[1]))) +
      build.propeller.diameter_m / 2);
  return {
    name: build.name,
    build,
    mass_kg: airframe.mass_kg,
    inertia: Float64Array.from(inertia.to1DArray()),
    inertiaInverse: Float64Array.from(inverse(inertia).to1DArray()),
    dragArea_m2: Float64Array.from(airframe.dragArea_m2),
    centreOfMass_m: Float64Array.from(com),
    rotorPosition_m,
    spin: Float64Array.from(ordered.map((rotor) => (rotor.spin === 'cw' ? 1 : -1))),
    rotor: compileRotor(build),
    motor: compileMotor(build),
    cells: battery.cells,
    capacity_C: battery.capacity_Ah * 3600,
    batteryResistance_ohm: battery.resistance_ohm,
    startCharge: battery.charge,
    cutoff_V: battery.cells * (battery.cutoff_V_per_cell ?? 3.3),
    escMin_us: esc.min_us,
    escMax_us: esc.max_us,
    escIdle_us: esc.idle_us,
    escResolution_us: esc.resolution_us,
    escUpdate_Hz: esc.update_Hz,
    braking: esc.braking,
    span_m,
    topSpeed_radps: topSpeed_radps(build),
    legHeight_m: airframe.legs?.height_m ?? 0.35 * build.propeller.diameter_m,
    legHalfTrack_m: airframe.legs?.halfTrack_m ?? 0.3 * span_m,
    gyroMounting: mountingMatrix(build.gyro.misalignment_deg ?? [0, 0, 0]),
  };
}

function compileRotor(build: Build): RotorConstants {
  const { propeller } = build;
  const D = propeller.diameter_m;
  const R = D / 2;
  const tableTop_radps = topSpeed_radps(build) * 1.5;
  const thrustFactor = new Float64Array(TABLE_POINTS);
  const torqueFactor = new Float64Array(TABLE_POINTS);
  const hoverInflowFactor_m = new Float64Array(TABLE_POINTS);
  const discArea_m2 = Math.PI * R * R;
  for (let i = 0; i < TABLE_POINTS; i++) {
    const speed = (tableTop_radps * i) / (TABLE_POINTS - 1);
    const { ct, cp } = staticCoefficients(propeller, speed);
    thrustFactor[i] = (ct * D ** 4) / (4 * Math.PI ** 2);
    torqueFactor[i] = (cp * D ** 5) / (8 * Math.PI ** 3);
    hoverInflowFactor_m[i] = Math.sqrt(thrustFactor[i] / (2 * discArea_m2));
  }
  return {
    radius_m: R,
    discArea_m2,
    thrustFactor,
    torqueFactor,
    hoverInflowFactor_m,
    tableTop_radps,
    tablePerSpeed_s: (TABLE_POINTS - 1) / tableTop_radps,
    perTwiceArea_m2: 1 / (2 * discArea_m2),
    inflowRelaxation_per_m: 2 / (APPARENT_MASS * R),
    inflowSlope_m3: (TYPICAL_LIFT_SLOPE_SOLIDITY / 4) * Math.PI * R ** 3,
    ...compileAdvance(propeller.advanceTable),
    inPlaneDrag: propeller.inPlaneDrag ?? TYPICAL_INPLANE_DRAG * SEA_LEVEL_DENSITY * D ** 3,
    inertia_kgm2: propeller.inertia_kgm2,
    blades: propeller.blades ?? 2,
  };
}

/**
 * Ratios to the value at rest. A table that does not start at J = 0 is extended there by the line through its
 * first two rows, and beyond its last row by the line through its last two, up to twice the last J.
 */
function compileAdvance(table: Build['propeller']['advanceTable']) {
  if (table === undefined) {
    return { advanceThrust: new Float64Array(0), advancePower: new Float64Array(0), advanceTop: 0 };
  }
  const advanceTop = 2 * table[table.length - 1].j;
  const lineAt = (j: number, key: 'ct' | 'cp') => {
    let upper = table.findIndex((row) => row.j >= j);
    if (upper === -1) upper = table.length - 1;
    upper = Math.max(1, upper);
    const [a, b] = [table[upper - 1], table[upper]];
    return a[key] + ((j - a.j) / (b.j - a.j)) * (b[key] - a[key]);
  };
  const sample = (key: 'ct' | 'cp') =>
    Float64Array.from(
      { length: TABLE_POINTS },
      (_, i) => lineAt((advanceTop * i) / (TABLE_POINTS - 1), key) / lineAt(0, key),
    );
  return { advanceThrust: sample('ct'), advancePower: sample('cp'), advanceTop };
}

function compileMotor(build: Build): MotorConstants {
  const { motor } = build;
  const base = {
    torqueConstant: 0,
    resistance_ohm: 1,
    noLoadCurrent_A: 0,
    heatCapacity_J_per_K: 15,
    thermalResistance_K_per_W: 2.5,
    lagUp_s: 0.05,
    lagDown_s: 0.05,
    maxSpeed_radps: topSpeed_radps(build),
  };
  if (isElectric(motor)) {
    return {
      ...base,
      electric: true,
      torqueConstant: 60 / (2 * Math.PI * motor.kv_rpm_per_V),
      resistance_ohm: motor.resistance_ohm,
      noLoadCurrent_A: motor.noLoadCurrent_A,
      heatCapacity_J_per_K: motor.heatCapacity_J_per_K ?? base.heatCapacity_J_per_K,
      thermalResistance_K_per_W: motor.thermalResistance_K_per_W ?? base.thermalResistance_K_per_W,
    };
  }
  return { ...base, electric: false, lagUp_s: motor.lag_s, lagDown_s: motor.lagDown_s ?? motor.lag_s };
}

/** Rotation by three small mounting angles, taken as yaw-pitch-roll so that large ones stay a rotation. */
function mountingMatrix(angles_deg: readonly [number, number, number]): Float64Array {
  const [a, b, c] = angles_deg.map((angle) => angle * RAD_PER_DEG);
  const [ca, sa, cb, sb, cc, sc] = [a, b, c].flatMap((angle) => [Math.cos(angle), Math.sin(angle)]);
  return Float64Array.from([
    cb * cc,
    cb * sc,
    -sb,
    sa * sb * cc - ca * sc,
    sa * sb * sc + ca * cc,
    sa * cb,
    ca * sb * cc + sa * sc,
    ca * sb * sc - sa * cc,
    ca * cb,
  ]);
}
