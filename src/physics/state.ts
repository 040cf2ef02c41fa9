/**
 * Layout of the flight state, one Float64Array. Position and velocity are those of the centre of mass, in
 * world axes (north, east, down); the quaternion turns body into world; rates are body rates, rad/s; rotors
 * stand in the order FL, FR, RL, RR.
 */
export const POSITION = 0;
export const VELOCITY = 3;
export const ATTITUDE = 6;
export const RATES = 10;
export const ROTOR_SPEED = 13;
/** Induced velocity through each rotor disc, m/s, positive down through the disc. */
export const INFLOW = 17;
/** State of charge of the battery, 1 full to 0 empty. */
export const CHARGE = 21;
export const STATE_SIZE = 22;

/** Names of the state's entries, for messages and the record. */
export const STATE_NAMES: readonly string[] = [
  'north_m',
  'east_m',
  'down_m',
  'vn_mps',
  've_mps',
  'vd_mps',
  'qw',
  'qx',
  'qy',
  'qz',
  'p_radps',
  'q_radps',
  'r_radps',
  ...['FL', 'FR', 'RL', 'RR'].map((corner) => `rotorSpeed_${corner}_radps`),
  ...['FL', 'FR', 'RL', 'RR'].map((corner) => `inflow_${corner}_mps`),
  'charge',
];
