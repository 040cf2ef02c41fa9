/** Taking the corrected build: what was known of a number that the log changed is now what the log says. */
import type { Build } from '../../../craft/build.ts';
import type { AxisName } from '../../../craft/gains.ts';
import type { Store } from '../../store/store.ts';
import { keepKnown, knownNow, knownTo, type Known } from '../known.ts';
import type { ShownAxis } from './messages.ts';
import { matchTexts as words } from './texts.ts';

interface Corrected {
  readonly quantity: string;
  /** The axis whose fitted gain set it; null: all of them together. */
  readonly axis: AxisName | null;
  readonly read: (build: Build) => number;
}

const CORRECTED: readonly Corrected[] = [
  { quantity: 'inertia roll', axis: 'roll', read: (build) => build.airframe.inertia_kgm2.xx },
  { quantity: 'inertia pitch', axis: 'pitch', read: (build) => build.airframe.inertia_kgm2.yy },
  { quantity: 'inertia yaw', axis: 'yaw', read: (build) => build.airframe.inertia_kgm2.zz },
  { quantity: 'thrust coefficient', axis: null, read: (build) => build.propeller.thrustCoefficient },
  { quantity: 'power coefficient', axis: null, read: (build) => build.propeller.powerCoefficient },
];

/** Build and what is known of it are one step of Undo. */
export function acceptCorrection(
  store: Store,
  corrected: Build,
  axes: Readonly<Record<AxisName, ShownAxis>>,
  label: string,
): void {
  store.sealEdit();
  store.attempt({}, () => {
    const before = store.build.value;
    if (store.setBuild(corrected, label).length > 0) return;
    keepKnown(store, { ...knownNow(store), ...knownOf(before, corrected, axes) }, label);
  });
  store.sealEdit();
}

function knownOf(before: Build, after: Build, axes: Readonly<Record<AxisName, ShownAxis>>): Known {
  const changed = CORRECTED.filter(({ read }) => read(before) !== read(after));
  return Object.fromEntries(changed.map(({ quantity, axis }) => [quantity, told(axis, axes)]));
}

function told(axis: AxisName | null, axes: Readonly<Record<AxisName, ShownAxis>>): string {
  const gain = axis === null ? null : (axes[axis].estimates?.gain_dps2_per_us ?? null);
  return gain === null ? words.fromLog : knownTo(gain, words.fromLog);
}
