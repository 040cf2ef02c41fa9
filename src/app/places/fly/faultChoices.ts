/** Faults as the panel sets them: one of each kind, with the numbers that matter in flight. */
import type { Corner } from '../../../craft/build.ts';
import type { Fault } from '../../../disturbance/faults.ts';

export interface FaultChoices {
  readonly weakCorner: Corner | 'none';
  /** Share of thrust that is left. */
  readonly weakShare: number;
  readonly chippedCorner: Corner | 'none';
  /** Vibration over the sound propeller's. */
  readonly imbalance: number;
  readonly shiftForward_mm: number;
  readonly shiftRight_mm: number;
  /** Vibration at the gyro over that of a sound mount; 1: sound. */
  readonly looseMount: number;
  readonly late_ms: number;
  readonly jitter_ms: number;
  readonly deadCell: boolean;
}

export const NO_FAULTS: FaultChoices = {
  weakCorner: 'none',
  weakShare: 0.85,
  chippedCorner: 'none',
  imbalance: 8,
  shiftForward_mm: 0,
  shiftRight_mm: 0,
  looseMount: 1,
  late_ms: 0,
  jitter_ms: 0,
  deadCell: false,
};

/** A chip this size costs little thrust; what it does is shake (invented value). */
const CHIPPED_SHARE = 0.95;

/** What is set, as the flight takes it. */
export function faultsOf(choices: FaultChoices): readonly Fault[] {
  const faults: Fault[] = [];
  if (choices.weakCorner !== 'none') {
    faults.push({ kind: 'weak-motor', corner: choices.weakCorner, share: choices.weakShare });
  }
  if (choices.chippedCorner !== 'none') {
    const { chippedCorner: corner, imbalance } = choices;
    faults.push({ kind: 'chipped-propeller', corner, share: CHIPPED_SHARE, imbalance });
  }
  if (choices.shiftForward_mm !== 0 || choices.shiftRight_mm !== 0) {
    const shift_m = [choices.shiftForward_mm / 1000, choices.shiftRight_mm / 1000, 0] as const;
    faults.push({ kind: 'shifted-payload', shift_m: [...shift_m] });
  }
  if (choices.looseMount > 1) {
    faults.push({ kind: 'loose-gyro-mount', vibration: choices.looseMount, damping: 0.1 });
  }
  if (choices.late_ms > 0 || choices.jitter_ms > 0) {
    faults.push({
      kind: 'late-loop',
      delay_s: choices.late_ms / 1000,
      jitter_s: choices.jitter_ms / 1000,
      missedTickShare: 0,
    });
  }
  if (choices.deadCell) faults.push({ kind: 'dead-cell' });
  return faults;
}
