/**
 * What the fit of one axis works on: pieces of a log in which command and rate follow each other without a
 * long gap. Rows that were lost stand in the piece at their estimated time, without a rate and with a command
 * that was put in between its neighbours.
 */

/**
 * Plant of one axis, rate/u = K e^(−sTd)/(s(τs+1)), with two terms that are 0 unless the log asks for them:
 * K e^(−sTd) (1 + lead·s)/((s + damping)(τs+1)). The lead is the rotors' own reaction about yaw, the damping
 * that of the rotors' inflow in roll and pitch.
 */
export interface PlantParameters {
  /** K, deg/s² per µs of axis command. */
  readonly gain_dps2_per_us: number;
  /** τ, s. */
  readonly lag_s: number;
  /** Td, s. */
  readonly delay_s: number;
  readonly lead_s?: number;
  readonly damping_per_s?: number;
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

/** How rows are read as a course in time; which reading is right shows in how well it explains the rates. */
export interface Reading {
  /** Time stamps as they stand, or a regular tick fitted through them (the clock jittered, not the tick). */
  readonly stamps: 'as logged' | 'regular';
  /** The command was held from row to row, or went on in ticks between the rows (a thinned-out log). */
  readonly command: 'held' | 'between';
}
