/**
 * What the fit of one axis works on: pieces of a log in which command and rate follow each other without a
 * long gap. Rows that were lost stand in the piece at their estimated time, without a rate and with a command
 * that was put in between its neighbours.
 */

/** Plant of one axis: rate/u = K e^(−sTd)/(s(τs+1)). */
export interface PlantParameters {
  /** K, deg/s² per µs of axis command. */
  readonly gain_dps2_per_us: number;
  /** τ, s. */
  readonly lag_s: number;
  /** Td, s. */
  readonly delay_s: number;
}

export interface AxisPiece {
  /** Instants of the rows, s, rising. */
  readonly t_s: Float64Array;
  /** Axis command computed in the row, µs; held until the next row's. */
  readonly u_us: Float64Array;
  /** Gyro rate, deg/s; NaN in a lost row. */
  readonly y_dps: Float64Array;
  /** Standard error of u_us, µs: 0 where it was logged, above 0 where it was put in. */
  readonly uError_us: Float64Array;
}
