/** A log as typed arrays in the units used inside; rows in rising time, bad rows left out and counted. */
import type { Corner } from '../craft/build.ts';
import type { AxisName } from '../craft/gains.ts';

export type Column = Float32Array | Float64Array;

export interface FlightLog {
  readonly name: string;
  /** Rising, s, from 0. */
  readonly t_s: Float64Array;
  readonly gyro_dps: Readonly<Partial<Record<AxisName, Column>>>;
  readonly setpoint_dps: Readonly<Partial<Record<AxisName, Column>>>;
  /** Axis commands where the log has them, µs. */
  readonly axisCommand_us: Readonly<Partial<Record<AxisName, Column>>>;
  readonly motorCommand_us: Readonly<Partial<Record<Corner, Column>>>;
  readonly rotorSpeed_rpm: Readonly<Partial<Record<Corner, Column>>>;
  readonly angle_deg: Readonly<Partial<Record<AxisName, Column>>>;
  /** Share of the command range, 0…1. */
  readonly throttle?: Column;
  /** Speed of descent, m/s, positive down. */
  readonly descent_mps?: Column;
  /** The bench's own record holds the gains it was flown with, as JSON text. */
  readonly gainsJson?: string;
  /** What was done to the rows on reading, in sentences. */
  readonly remarks: readonly string[];
}
