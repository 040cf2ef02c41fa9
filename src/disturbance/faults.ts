/**
 * Faults of a craft: what can go wrong before or in flight, as data, and what each does to the flight. A new
 * fault is one entry here and one line in FAULT_KINDS.
 */
import { z } from 'zod';
import { CORNERS, type Corner } from '../craft/build.ts';
import { choice, parseWith, quantity, vector } from '../craft/fields.ts';
import { refuse } from '../craft/problem.ts';
import type { Vector3 } from '../math/quaternion.ts';

/** What all faults together do to a flight; arrays in the order FL, FR, RL, RR. */
export interface FaultEffects {
  /** Thrust left, share of the healthy rotor's at the same speed. */
  readonly thrustShare: Float64Array;
  /** Motor torque constant left, share of the healthy one. */
  readonly torqueShare: Float64Array;
  /** Vibration of the rotor over that of the sound one; 1 is healthy. */
  readonly imbalance: Float64Array;
  /** Shift of the centre of mass, body axes, m. */
  readonly comShift_m: Vector3;
  /** Vibration at the gyro over that of a sound mount; 1 is healthy. */
  vibrationScale: number;
  /** Resonance of the gyro's mount; 0: as stiff as the airframe. */
  mountResonance_Hz: number;
  /** Damping ratio of that resonance. */
  mountDamping: number;
  /** Added to the delay of every command, s. */
  extraDelay_s: number;
  /** Each command is late by a further time, uniform from 0 to this, s. */
  jitter_s: number;
  /** Share of control ticks that do not run. */
  missedTickShare: number;
  /** Cells of the pack that give no voltage. */
  deadCells: number;
}

/** A healthy craft. */
export function noEffects(): FaultEffects {
  return {
    thrustShare: new Float64Array([1, 1, 1, 1]),
    torqueShare: new Float64Array([1, 1, 1, 1]),
    imbalance: new Float64Array([1, 1, 1, 1]),
    comShift_m: [0, 0, 0],
    vibrationScale: 1,
    mountResonance_Hz: 0,
    mountDamping: 1,
    extraDelay_s: 0,
    jitter_s: 0,
    missedTickShare: 0,
    deadCells: 0,
  };
}

interface FaultKind<K extends string, S extends z.ZodType<{ kind: K }>> {
  readonly kind: K;
  /** What a person reads. */
  readonly title: string;
  readonly schema: S;
  /** Adds the fault to what the others do. */
  apply(fault: z.output<S>, effects: FaultEffects): void;
}

function define<const K extends string, S extends z.ZodType<{ kind: K }>>(
  kind: FaultKind<K, S>,
): FaultKind<K, S> {
  return kind;
}

const corner = choice(CORNERS);
const placeOf = (one: Corner): number => CORNERS.indexOf(one);

const weakMotor = define({
  kind: 'weak-motor',
  title: 'Weak motor',
  schema: z.strictObject({
    kind: z.literal('weak-motor'),
    corner,
    /** Thrust left at any command. */
    share: quantity(0, 1, ''),
  }),
  apply(fault, effects) {
    effects.thrustShare[placeOf(fault.corner)] *= fault.share;
  },
});

const demagnetisedMotor = define({
  kind: 'demagnetised-motor',
  title: 'Overheated magnets',
  schema: z.strictObject({
    kind: z.literal('demagnetised-motor'),
    corner,
    /** Torque constant left: the motor turns faster for its voltage and takes more current for its torque. */
    share: quantity(0.3, 1, ''),
  }),
  apply(fault, effects) {
    effects.torqueShare[placeOf(fault.corner)] *= fault.share;
  },
});

const chippedPropeller = define({
  kind: 'chipped-propeller',
  title: 'Chipped propeller',
  schema: z.strictObject({
    kind: z.literal('chipped-propeller'),
    corner,
    /** Thrust left at the same speed. */
    share: quantity(0.2, 1, ''),
    /** Vibration over that of the sound propeller. */
    imbalance: quantity(1, 100, ''),
  }),
  apply(fault, effects) {
    const place = placeOf(fault.corner);
    effects.thrustShare[place] *= fault.share;
    effects.imbalance[place] *= fault.imbalance;
  },
});

const shiftedPayload = define({
  kind: 'shifted-payload',
  title: 'Shifted payload',
  schema: z.strictObject({
    kind: z.literal('shifted-payload'),
    /** Shift of the whole craft's centre of mass. */
    shift_m: vector(-0.5, 0.5, 'm'),
  }),
  apply(fault, effects) {
    for (let axis = 0; axis < 3; axis++) effects.comShift_m[axis] += fault.shift_m[axis];
  },
});

const looseGyroMount = define({
  kind: 'loose-gyro-mount',
  title: 'Loose gyro mount',
  schema: z.strictObject({
    kind: z.literal('loose-gyro-mount'),
    /** All vibration at the gyro over that of a sound mount. */
    vibration: quantity(1, 100, ''),
    /** Resonance of the mount; absent: none. */
    resonance_Hz: quantity(5, 2000, 'Hz').optional(),
    damping: quantity(0.01, 1, '').default(0.1),
  }),
  apply(fault, effects) {
    effects.vibrationScale *= fault.vibration;
    if (fault.resonance_Hz === undefined) return;
    effects.mountResonance_Hz = fault.resonance_Hz;
    effects.mountDamping = fault.damping;
  },
});

const lateLoop = define({
  kind: 'late-loop',
  title: 'Late or jittering loop',
  schema: z.strictObject({
    kind: z.literal('late-loop'),
    delay_s: quantity(0, 0.1, 's').default(0),
    jitter_s: quantity(0, 0.1, 's').default(0),
    /** Share of ticks that do not run. */
    missedTickShare: quantity(0, 0.9, '').default(0),
  }),
  apply(fault, effects) {
    effects.extraDelay_s += fault.delay_s;
    effects.jitter_s += fault.jitter_s;
    effects.missedTickShare = 1 - (1 - effects.missedTickShare) * (1 - fault.missedTickShare);
  },
});

const deadCell = define({
  kind: 'dead-cell',
  title: 'Dead cell',
  schema: z.strictObject({ kind: z.literal('dead-cell') }),
  apply(_fault, effects) {
    effects.deadCells += 1;
  },
});

export const FAULT_KINDS = [
  weakMotor,
  demagnetisedMotor,
  chippedPropeller,
  shiftedPayload,
  looseGyroMount,
  lateLoop,
  deadCell,
] as const;

type FaultSchema = (typeof FAULT_KINDS)[number]['schema'];

/** One fault, `{kind, …}`; the kinds are those of FAULT_KINDS. */
export const faultSchema = z.discriminatedUnion(
  'kind',
  FAULT_KINDS.map((kind) => kind.schema) as unknown as [FaultSchema, ...FaultSchema[]],
  { error: `an object with kind, one of ${FAULT_KINDS.map((kind) => `"${kind.kind}"`).join(', ')}` },
);
export type Fault = z.output<typeof faultSchema>;

/** More than the craft has parts to break. */
const MOST_FAULTS = 20;
const faultListSchema = z
  .array(faultSchema, { error: 'a list of faults' })
  .max(MOST_FAULTS, { error: `at most ${MOST_FAULTS} faults` });

/**
 * Validates a list of faults for a pack of `cells` cells.
 * @throws InputError naming path, value and what is allowed.
 */
export function parseFaults(raw: unknown, cells: number, file = 'faults'): Fault[] {
  const faults = parseWith(faultListSchema, raw, file);
  const dead = faults.filter((fault) => fault.kind === 'dead-cell').length;
  if (dead >= cells) throw refuse(file, '', `${dead} dead cells`, `fewer than the pack's ${cells} cells`);
  return faults;
}

/** What `faults` do together: shares multiply, shifts and delays add. */
export function applyFaults(faults: readonly Fault[]): FaultEffects {
  const effects = noEffects();
  for (const fault of faults) {
    // A kind and its own `apply` belong together by the discriminator; the type of the list cannot say so.
    const kind = FAULT_KINDS.find((one) => one.kind === fault.kind) as
      FaultKind<string, FaultSchema> | undefined;
    kind?.apply(fault, effects);
  }
  return effects;
}
