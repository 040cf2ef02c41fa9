/** Schema of the build file, `gustbench.build/1`: what was measured of one craft. */
import { z } from 'zod';
import { choice, formatTag, positive, quantity, title, vector } from './fields.ts';

export const BUILD_FORMAT = 'gustbench.build/1';
export const CORNERS = ['FL', 'FR', 'RL', 'RR'] as const;
export type Corner = (typeof CORNERS)[number];

const product = quantity(-100, 100, 'kg·m²').default(0);

const airframe = z.strictObject(
  {
    /** All-up mass as weighed, payload included. */
    mass_kg: quantity(0.01, 150, 'kg'),
    /** Inertia tensor about the centre of mass, body axes; xy, xz, yz are the tensor's own elements. */
    inertia_kgm2: z.strictObject(
      {
        xx: positive(500, 'kg·m²'),
        yy: positive(500, 'kg·m²'),
        zz: positive(500, 'kg·m²'),
        xy: product,
        xz: product,
        yz: product,
      },
      { error: 'an object with xx, yy, zz and, if not zero, xy, xz, yz' },
    ),
    /** From the body origin, to which the rotor positions refer as well. */
    centreOfMass_m: vector(-5, 5, 'm').default([0, 0, 0]),
    /** Drag coefficient times area along each body axis. */
    dragArea_m2: z
      .tuple([quantity(0, 20, 'm²'), quantity(0, 20, 'm²'), quantity(0, 20, 'm²')], {
        error: 'three numbers from 0 to 20 m²',
      })
      .default([0, 0, 0]),
    /** Legs for standing and for the drawing. */
    legs: z.strictObject({ height_m: positive(3, 'm'), halfTrack_m: positive(5, 'm') }).optional(),
  },
  { error: 'an object with mass_kg, inertia_kgm2' },
);

const rotor = z.strictObject(
  {
    corner: choice(CORNERS),
    position_m: vector(-5, 5, 'm'),
    /** Sense of turning seen from above. */
    spin: choice(['cw', 'ccw']),
  },
  { error: 'an object with corner, position_m, spin' },
);

const staticRow = z.strictObject({
  rpm: positive(200_000, 'rev/min'),
  ct: positive(1, ''),
  cp: positive(1, ''),
});
const advanceRow = z.strictObject({
  j: quantity(0, 5, ''),
  ct: quantity(-1, 1, ''),
  cp: quantity(-1, 1, ''),
});

const propeller = z.strictObject(
  {
    name: title().optional(),
    diameter_m: quantity(0.02, 5, 'm'),
    /** C_T = T/(ρ n² D⁴), n in rev/s, at rest. */
    thrustCoefficient: quantity(0.005, 0.5, ''),
    /** C_P = P/(ρ n³ D⁵), at rest. */
    powerCoefficient: quantity(0.001, 0.5, ''),
    /** Propeller and motor bell about the shaft. */
    inertia_kgm2: positive(10, 'kg·m²'),
    /** In-plane drag per rotor speed and in-plane airspeed, N per (rad/s · m/s). */
    inPlaneDrag: quantity(0, 1, 'N per rad/s per m/s').optional(),
    blades: z.number({ error: 'a whole number from 1 to 8' }).int().min(1).max(8).optional(),
    staticTable: z
      .array(staticRow, { error: 'a list of {rpm, ct, cp}' })
      .min(2, { error: 'at least 2 rows' })
      .max(500, { error: 'at most 500 rows' })
      .optional(),
    advanceTable: z
      .array(advanceRow, { error: 'a list of {j, ct, cp}' })
      .min(2, { error: 'at least 2 rows' })
      .max(500, { error: 'at most 500 rows' })
      .optional(),
  },
  { error: 'an object with diameter_m, thrustCoefficient, powerCoefficient, inertia_kgm2' },
);

const electricMotor = z.strictObject({
  kv_rpm_per_V: positive(50_000, 'rev/min per V'),
  resistance_ohm: positive(50, 'Ω'),
  noLoadCurrent_A: quantity(0, 50, 'A'),
  /** Mass of one motor's copper and stator, for winding heat. */
  heatCapacity_J_per_K: positive(10_000, 'J/K').optional(),
  thermalResistance_K_per_W: positive(100, 'K/W').optional(),
});
const laggedMotor = z.strictObject({
  lag_s: quantity(0.001, 2, 's'),
  lagDown_s: quantity(0.001, 2, 's').optional(),
  maxSpeed_rpm: positive(200_000, 'rev/min'),
});

const battery = z.strictObject(
  {
    cells: z
      .number({ error: 'a whole number from 1 to 24' })
      .int({ error: 'a whole number from 1 to 24' })
      .min(1, { error: 'a whole number from 1 to 24' })
      .max(24, { error: 'a whole number from 1 to 24' }),
    capacity_Ah: positive(200, 'A·h'),
    /** Whole pack with its leads. */
    resistance_ohm: quantity(0, 10, 'Ω'),
    /** State of charge at take-off. */
    charge: quantity(0, 1, '').default(1),
    /** A cell below this under load ends the flight's safe part. */
    cutoff_V_per_cell: quantity(2, 4, 'V').optional(),
  },
  { error: 'an object with cells, capacity_Ah, resistance_ohm, charge' },
);

const esc = z.strictObject(
  {
    min_us: quantity(0, 5000, 'µs'),
    max_us: quantity(1, 5000, 'µs'),
    /** Command that keeps an armed motor turning. */
    idle_us: quantity(0, 5000, 'µs'),
    resolution_us: quantity(0, 100, 'µs').default(1),
    update_Hz: quantity(25, 64_000, 'Hz'),
    braking: z.boolean({ error: 'true or false' }).default(true),
  },
  { error: 'an object with min_us, max_us, idle_us, resolution_us, update_Hz, braking' },
);

const gyro = z.strictObject(
  {
    noise_dps_per_rtHz: quantity(0, 10, 'deg/s per √Hz'),
    /** First-order bandwidth of the sensor itself; 0 = none. */
    bandwidth_Hz: quantity(0, 20_000, 'Hz (0 = none)'),
    fullScale_dps: positive(10_000, 'deg/s'),
    resolution_dps: quantity(0, 10, 'deg/s').default(0),
    delay_s: quantity(0, 0.05, 's').default(0),
    bias_dps: vector(-100, 100, 'deg/s').default([0, 0, 0]),
    /** Amplitude of one rotor's once-per-turn line at hover speed, per body axis. */
    vibration_dps: z
      .tuple([quantity(0, 1000, 'deg/s'), quantity(0, 1000, 'deg/s'), quantity(0, 1000, 'deg/s')], {
        error: 'three numbers from 0 to 1000 deg/s',
      })
      .optional(),
    /** Rate random walk. */
    drift_dps_per_rts: quantity(0, 10, 'deg/s per √s').optional(),
    /** Mounting error as small rotations about x, y, z. */
    misalignment_deg: vector(-20, 20, 'deg').optional(),
  },
  {
    error:
      'an object with noise_dps_per_rtHz, bandwidth_Hz, fullScale_dps, resolution_dps, delay_s, bias_dps',
  },
);

const accelerometer = z.strictObject({
  noise_mps2_per_rtHz: quantity(0, 10, 'm/s² per √Hz').default(0.002),
  bandwidth_Hz: quantity(0, 20_000, 'Hz (0 = none)').default(100),
  fullScale_mps2: positive(10_000, 'm/s²').default(156.9),
  resolution_mps2: quantity(0, 10, 'm/s²').default(0.005),
  bias_mps2: vector(-10, 10, 'm/s²').default([0, 0, 0]),
});

const payload = z.strictObject({
  name: title().optional(),
  mass_kg: positive(100, 'kg'),
  /** Its centre from the body origin. */
  position_m: vector(-5, 5, 'm'),
  size_m: z.tuple([positive(3, 'm'), positive(3, 'm'), positive(3, 'm')], {
    error: 'three numbers above 0, up to 3 m',
  }),
});

export const buildSchema = z.strictObject(
  {
    format: formatTag(BUILD_FORMAT),
    name: title(),
    note: z.string({ error: 'a text' }).max(4000, { error: 'at most 4000 characters' }).optional(),
    airframe,
    rotors: z.tuple([rotor, rotor, rotor, rotor], { error: 'a list of exactly four rotors' }),
    propeller,
    motor: z.union([electricMotor, laggedMotor], {
      error:
        '{kv_rpm_per_V, resistance_ohm, noLoadCurrent_A} or {lag_s, lagDown_s, maxSpeed_rpm}, each above 0',
    }),
    battery,
    esc,
    gyro,
    accelerometer: accelerometer.prefault({}),
    /** A part of the mass above that can be let go in flight. */
    payload: payload.optional(),
  },
  { error: 'a build object' },
);

export type Build = z.output<typeof buildSchema>;
export type ElectricMotor = z.output<typeof electricMotor>;

export function isElectric(motor: Build['motor']): motor is ElectricMotor {
  return 'kv_rpm_per_V' in motor;
}
