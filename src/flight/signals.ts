/**
 * What one tick shows: names and places of the signals. A tick's row is taken at its start, after the
 * controller computed: the gyro sample, the setpoints and the commands of tick k stand in row k with the true
 * state at t_k.
 */
import { AXES } from '../craft/gains.ts';
import { CORNERS } from '../craft/build.ts';

const perAxis = (prefix: string, unit: string) => AXES.map((axis) => `${prefix}_${axis}_${unit}`);
const perCorner = (prefix: string, unit: string) =>
  CORNERS.map((corner) => (unit === '' ? `${prefix}_${corner}` : `${prefix}_${corner}_${unit}`));

export const SIGNAL_NAMES: readonly string[] = [
  't_s',
  ...perAxis('sp', 'dps'),
  'throttle',
  ...perAxis('rate', 'dps'),
  ...perAxis('gyro', 'dps'),
  ...perCorner('cmd', 'us'),
  ...perCorner('speed', 'rpm'),
  ...['north_m', 'east_m', 'down_m', 'vn_mps', 've_mps', 'vd_mps', 'qw', 'qx', 'qy', 'qz'],
  ...['wind_n_mps', 'wind_e_mps', 'wind_d_mps', 'battery_V', 'current_A'],
  // From here on: shown and scored, not part of the record file.
  ...perAxis('p', 'us'),
  ...perAxis('i', 'us'),
  ...perAxis('d', 'us'),
  ...perAxis('ff', 'us'),
  ...perAxis('u', 'us'),
  ...perCorner('thrust', 'N'),
  ...perCorner('heat', 'W'),
  ...perCorner('winding', 'K'),
  ...perCorner('saturated', ''),
  ...perCorner('struck', ''),
  ...['attitudeKept', 'yawKept', 'collectiveShift_us', 'charge', 'touching', 'armed'],
];

/** Signals of the record file: the first ones, in the file's order. */
export const RECORD_SIGNALS: readonly string[] = SIGNAL_NAMES.slice(0, SIGNAL_NAMES.indexOf('p_roll_us'));

const PLACES = new Map(SIGNAL_NAMES.map((name, index) => [name, index]));

/** Place of a signal in a tick's row. @throws RangeError for a name that is none. */
export function signalIndex(name: string): number {
  const index = PLACES.get(name);
  if (index === undefined) throw new RangeError(`no signal is named "${name}"`);
  return index;
}
