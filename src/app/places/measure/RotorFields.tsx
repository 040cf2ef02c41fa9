/** Where the rotors sit and how they turn, corner by corner; mirrored, one edit moves all four. */
import { useState } from 'preact/hooks';
import { CORNERS, type Build } from '../../../craft/build.ts';
import { useStore } from '../../store/context.ts';
import { NumberField } from '../../widgets/NumberField.tsx';
import { Select } from '../../widgets/Select.tsx';
import { Toggle } from '../../widgets/Toggle.tsx';
import { measureTexts } from './texts.ts';

const words = measureTexts.rotors;
type Rotor = Build['rotors'][number];
type Corner = Rotor['corner'];

const AXES = [0, 1, 2] as const;
const FARTHEST_M = 5;
/** Sense of each corner's forward and right coordinate. */
const SENSE: Readonly<Record<Corner, readonly [number, number]>> = {
  FL: [1, -1],
  FR: [1, 1],
  RL: [-1, -1],
  RR: [-1, 1],
};

export function RotorFields() {
  const store = useStore();
  const { rotors } = store.build.value;
  const saved = store.craft.value.savedBuild.rotors;
  const [mirrored, setMirrored] = useState(() => isMirrored(rotors));
  const set = (change: (rotor: Rotor) => Rotor, label: string): string | null => {
    const changed = (now: Build): Build => {
      const [a, b, c, d] = now.rotors;
      return { ...now, rotors: [change(a), change(b), change(c), change(d)] };
    };
    const problem = store.setBuild(changed, label, { quiet: true })[0];
    return problem === undefined ? null : `${problem.path}: ${problem.allowed}`;
  };
  const move = (corner: Corner, axis: 0 | 1 | 2, value: number, label: string): string | null =>
    set((rotor) => {
      if (rotor.corner !== corner && !mirrored) return rotor;
      const sense = axis === 2 ? 1 : SENSE[rotor.corner][axis] * SENSE[corner][axis];
      const position_m: Rotor['position_m'] = [...rotor.position_m];
      position_m[axis] = sense * value;
      return { ...rotor, position_m };
    }, label);
  const turn = (corner: Corner, spin: Rotor['spin'], label: string): string | null => {
    const before = rotors.find((rotor) => rotor.corner === corner)?.spin;
    if (before === spin) return null;
    const other = { cw: 'ccw', ccw: 'cw' } as const;
    return set(
      (rotor) => (rotor.corner === corner || mirrored ? { ...rotor, spin: other[rotor.spin] } : rotor),
      label,
    );
  };
  return (
    <fieldset class="panel measure-rotors">
      <legend>{words.label}</legend>
      <Toggle label={words.mirrored} on={mirrored} onChange={setMirrored} />
      <div class="measure-corners">
        {CORNERS.map((corner) => {
          const rotor = rotors.find((one) => one.corner === corner);
          const kept = saved.find((one) => one.corner === corner);
          if (rotor === undefined) return null;
          return (
            <div key={corner}>
              {AXES.map((axis) => {
                const label = `${corner} ${words.axes[axis]}`;
                return (
                  <NumberField
                    key={axis}
                    label={label}
                    value={rotor.position_m[axis]}
                    {...(kept === undefined ? {} : { saved: kept.position_m[axis] })}
                    unit="m"
                    min={-FARTHEST_M}
                    max={FARTHEST_M}
                    noSlider
                    onChange={(value) => move(corner, axis, value, label)}
                  />
                );
              })}
              <Select
                label={`${corner} ${words.turns}`}
                value={rotor.spin}
                options={[
                  { value: 'cw', label: words.spins.cw },
                  { value: 'ccw', label: words.spins.ccw },
                ]}
                onChange={(spin) => {
                  const refused = turn(corner, spin, `${corner} ${words.turns}`);
                  if (refused !== null) store.notices.tell('error', refused, { topic: 'measure:spin' });
                }}
              />
            </div>
          );
        })}
      </div>
    </fieldset>
  );
}

function isMirrored(rotors: readonly Rotor[]): boolean {
  const [first] = rotors;
  const size = (rotor: Rotor, axis: number) =>
    axis === 2 ? rotor.position_m[2] : SENSE[rotor.corner][axis] * rotor.position_m[axis];
  return rotors.every((rotor) =>
    AXES.every((axis) => Math.abs(size(rotor, axis) - size(first, axis)) < 1e-9),
  );
}
