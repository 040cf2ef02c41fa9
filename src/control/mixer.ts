/**
 * Mixer: four commands from collective and three axis commands, for any four rotor positions and spins.
 * Columns of the inverse of the geometry, each scaled to mean absolute entry 1, so that on a symmetric X an
 * axis command of u µs adds u to one pair and takes u from the other.
 *
 * Desaturation keeps every command between idle and full and reports what it gave up. "attitude-first":
 * roll and pitch over yaw over collective. "keep-collective": collective stays, then roll and pitch, then yaw.
 */
import { inverse, Matrix } from 'ml-matrix';
import type { Craft } from '../craft/compile.ts';

export type Desaturation = 'attitude-first' | 'keep-collective';

export class Mixer {
  /** Commands of the last mix, µs, FL, FR, RL, RR, within the limits, not yet quantised. */
  readonly command_us = new Float64Array(4);
  /** Share of roll and pitch, and of yaw, that was kept: 1 = all. */
  attitudeKept = 1;
  yawKept = 1;
  /** Collective that was given (+) or taken (−) to make room, µs. */
  collectiveShift_us = 0;
  /** Per rotor: −1 at idle, 1 at full, 0 between. */
  readonly saturated = new Int8Array(4);

  /** 4 × [collective, roll, pitch, yaw]. */
  readonly matrix: Float64Array;
  private readonly attitude = new Float64Array(4);
  private readonly yaw = new Float64Array(4);

  constructor(
    private readonly craft: Craft,
    public desaturation: Desaturation,
  ) {
    this.matrix = mixerMatrix(craft);
  }

  mix(collective_us: number, roll_us: number, pitch_us: number, yaw_us: number): void {
    const { attitude, yaw, matrix: m, craft } = this;
    const low = craft.escIdle_us;
    const high = craft.escMax_us;
    for (let i = 0; i < 4; i++) {
      attitude[i] = m[4 * i + 1] * roll_us + m[4 * i + 2] * pitch_us;
      yaw[i] = m[4 * i + 3] * yaw_us;
    }
    if (this.desaturation === 'keep-collective') this.keepCollective(collective_us, low, high);
    else this.attitudeFirst(collective_us, low, high);
    for (let i = 0; i < 4; i++) {
      const command = this.command_us[i];
      // Rounding alone may carry a command a hair past its limit.
      this.command_us[i] = Math.max(low, Math.min(high, command));
      this.saturated[i] = command >= high - 1e-6 ? 1 : command <= low + 1e-6 ? -1 : 0;
    }
  }

  private attitudeFirst(collective_us: number, low: number, high: number): void {
    const { attitude, yaw, matrix: m } = this;
    const room = high - low;
    let top = -Infinity;
    let bottom = Infinity;
    for (let i = 0; i < 4; i++) {
      top = Math.max(top, attitude[i]);
      bottom = Math.min(bottom, attitude[i]);
    }
    this.attitudeKept = top - bottom > room ? room / (top - bottom) : 1;
    let kept = 1;
    for (let i = 0; i < 4; i++) {
      for (let j = 0; j < 4; j++) {
        const used = this.attitudeKept * (attitude[i] - attitude[j]);
        const more = yaw[i] - yaw[j];
        if (more > 0 && used + more > room) kept = Math.min(kept, Math.max(0, (room - used) / more));
      }
    }
    this.yawKept = kept;
    let least = -Infinity;
    let most = Infinity;
    for (let i = 0; i < 4; i++) {
      const own = this.attitudeKept * attitude[i] + kept * yaw[i];
      const share = m[4 * i];
      this.command_us[i] = own + share * (collective_us - low);
      least = Math.max(least, -own);
      most = Math.min(most, room - own);
    }
    // The collective that fits lies between `least` and `most` (as a command above idle, for equal shares).
    const wanted = collective_us - low;
    const fitted = Math.min(Math.max(wanted, least), Math.max(most, least));
    this.collectiveShift_us = fitted - wanted;
    for (let i = 0; i < 4; i++) this.command_us[i] += low + (fitted - wanted);
  }

  private keepCollective(collective_us: number, low: number, high: number): void {
    const { attitude, yaw, matrix: m } = this;
    let keptAttitude = 1;
    for (let i = 0; i < 4; i++) {
      const base = low + m[4 * i] * (collective_us - low);
      keptAttitude = Math.min(keptAttitude, shareThatFits(base, attitude[i], low, high));
    }
    let keptYaw = 1;
    for (let i = 0; i < 4; i++) {
      const base = low + m[4 * i] * (collective_us - low) + keptAttitude * attitude[i];
      keptYaw = Math.min(keptYaw, shareThatFits(base, yaw[i], low, high));
    }
    this.attitudeKept = keptAttitude;
    this.yawKept = keptYaw;
    this.collectiveShift_us = 0;
    for (let i = 0; i < 4; i++) {
      this.command_us[i] =
        low + m[4 * i] * (collective_us - low) + keptAttitude * attitude[i] + keptYaw * yaw[i];
    }
  }
}

/** Largest share of `change` that keeps base + share·change within [low, high]; 0 when base is outside. */
function shareThatFits(base: number, change: number, low: number, high: number): number {
  if (change > 0) return Math.max(0, Math.min(1, (high - base) / change));
  if (change < 0) return Math.max(0, Math.min(1, (low - base) / change));
  return 1;
}

/** 4 × [collective, roll, pitch, yaw], rows FL, FR, RL, RR. */
export function mixerMatrix(craft: Craft): Float64Array {
  const rows = [0, 1, 2, 3];
  const geometry = new Matrix([
    rows.map(() => 1),
    // Thrust acts along −z: roll moment −y T, pitch moment x T; yaw by the reaction of the spin.
    rows.map((i) => -craft.rotorPosition_m[3 * i + 1]),
    rows.map((i) => craft.rotorPosition_m[3 * i]),
    rows.map((i) => -craft.spin[i]),
  ]);
  const inverted = inverse(geometry);
  const matrix = new Float64Array(16);
  for (let column = 0; column < 4; column++) {
    let mean = 0;
    for (let i = 0; i < 4; i++) mean += Math.abs(inverted.get(i, column)) / 4;
    for (let i = 0; i < 4; i++) matrix[4 * i + column] = inverted.get(i, column) / mean;
  }
  return matrix;
}
