/** The gains in a firmware's own way of counting, live, and as source text to copy. */
import { useState } from 'preact/hooks';
import { AXES } from '../../../craft/gains.ts';
import {
  CONVENTIONS,
  exportConstants,
  EXPORTS,
  toConvention,
  whatChangesWithRate,
} from '../../../shaping/conventions.ts';
import { useStore } from '../../store/context.ts';
import { readable } from '../../store/units.ts';
import { Button } from '../../widgets/Button.tsx';
import { Select } from '../../widgets/Select.tsx';
import { shapeTexts as words } from './texts.ts';

export function FirmwareUnits() {
  const store = useStore();
  const [name, setName] = useState(CONVENTIONS[0].name);
  const [said, setSaid] = useState('');
  const convention = CONVENTIONS.find((one) => one.name === name) ?? CONVENTIONS[0];
  const gains = store.gains.value;
  let rows: [string, string][] = [];
  try {
    const constants = toConvention(gains, convention);
    rows = AXES.map((axis) => [
      axis,
      (['p', 'i', 'd', 'ff'] as const)
        .map((key) => `${key.toUpperCase()} ${readable(constants[axis][key])}`)
        .join('  '),
    ]);
  } catch (error) {
    if (!(error instanceof RangeError)) throw error;
    rows = [['', error.message]];
  }
  const copy = async (kind: (typeof EXPORTS)[number]) => {
    await navigator.clipboard.writeText(exportConstants(gains, convention, kind, store.build.value.name));
    setSaid(words.copied);
  };
  return (
    <details class="panel">
      <summary>{words.convention}</summary>
      <Select
        label={words.conventionChoice}
        value={name}
        options={CONVENTIONS.map((one) => ({ value: one.name, label: one.name }))}
        onChange={setName}
      />
      <table class="small">
        <tbody>
          {rows.map(([axis, text]) => (
            <tr key={axis}>
              <th scope="row">{axis}</th>
              <td>{text}</td>
            </tr>
          ))}
        </tbody>
      </table>
      <p class="small">
        {words.rateChange(String(gains.loop_Hz * 2))}{' '}
        {whatChangesWithRate(convention, gains.loop_Hz, gains.loop_Hz * 2).join('; ')}
      </p>
      <div class="row">
        <span class="faint">{words.exportAs}</span>
        {EXPORTS.map((kind) => (
          <Button key={kind} quiet onClick={() => void copy(kind)}>
            {kind === 'cpp' ? 'C++' : kind === 'c' ? 'C' : kind}
          </Button>
        ))}
        <span role="status">{said}</span>
      </div>
      <p class="small">{words.caution}</p>
    </details>
  );
}
