/** Axis command of a log: its own column, or what the four motor commands say. */
import { CORNERS, type Build, type Corner } from '../craft/build.ts';
import type { AxisName } from '../craft/gains.ts';
import type { Column, FlightLog } from './log.ts';

/** Signs of FL, FR, RL, RR in u = Σ sign · command / 4: right side down, nose up, nose right. */
export function axisSigns(build: Build, axis: AxisName): readonly number[] {
  if (axis === 'roll') return [1, -1, 1, -1];
  if (axis === 'pitch') return [1, 1, -1, -1];
  // The rotors that turn counter-clockwise push the nose to the right.
  return CORNERS.map((corner) => (spinOf(build, corner) === 'ccw' ? 1 : -1));
}

function spinOf(build: Build, corner: Corner): 'cw' | 'ccw' {
  return build.rotors.find((rotor) => rotor.corner === corner)?.spin ?? 'cw';
}

/** µs, one value a row; null when the log has neither. */
export function axisCommand_us(log: FlightLog, build: Build, axis: AxisName): Column | null {
  const own = log.axisCommand_us[axis];
  if (own !== undefined) return own;
  const motors = motorCommands_us(log);
  if (motors === null) return null;
  const [a, b, c, d] = motors;
  const [sa, sb, sc, sd] = axisSigns(build, axis);
  const out = new Float32Array(a.length);
  for (let k = 0; k < out.length; k++) out[k] = (sa * a[k] + sb * b[k] + sc * c[k] + sd * d[k]) / 4;
  return out;
}

/** FL, FR, RL, RR; null unless all four are there. */
export function motorCommands_us(log: FlightLog): Column[] | null {
  const found = CORNERS.flatMap((corner) => {
    const column = log.motorCommand_us[corner];
    return column === undefined ? [] : [column];
  });
  return found.length === 4 ? found : null;
}
