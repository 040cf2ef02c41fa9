/** A bifilar swing test typed in: the CSV that a file would hold. */
import { useState } from 'preact/hooks';
import { AXES, type AxisName } from '../../../craft/gains.ts';
import { useStore } from '../../store/context.ts';
import { Button } from '../../widgets/Button.tsx';
import { NumberField } from '../../widgets/NumberField.tsx';
import { Select } from '../../widgets/Select.tsx';
import { measureTexts } from './texts.ts';

const words = measureTexts.swingForm;

export function SwingForm(props: { onSwing: (text: string) => void }) {
  const store = useStore();
  const [axis, setAxis] = useState<AxisName>('roll');
  const [distance, setDistance] = useState(0.3);
  const [length, setLength] = useState(1.2);
  const [mass, setMass] = useState(store.build.value.airframe.mass_kg);
  const [swings, setSwings] = useState(20);
  const [timings, setTimings] = useState('');
  const text = (): string =>
    [
      '# method: bifilar',
      `# axis: ${axis}`,
      `# mass_kg: ${mass}`,
      `# wireDistance_m: ${distance}`,
      `# wireLength_m: ${length}`,
      'swings,time_s',
      ...timings
        .split(/[\s;]+/)
        .filter((one) => one !== '')
        .map((one) => `${swings},${one.replace(',', '.')}`),
      '',
    ].join('\n');
  return (
    <div class="panel">
      <Select
        label={words.axis}
        value={axis}
        options={AXES.map((value) => ({ value, label: value }))}
        onChange={setAxis}
      />
      <NumberField
        label={words.mass}
        value={mass}
        unit="kg"
        min={0.01}
        max={150}
        noSlider
        onChange={setMass}
      />
      <NumberField
        label={words.distance}
        value={distance}
        unit="m"
        min={0.01}
        max={5}
        noSlider
        onChange={setDistance}
      />
      <NumberField
        label={words.length}
        value={length}
        unit="m"
        min={0.05}
        max={20}
        noSlider
        onChange={setLength}
      />
      <NumberField
        label={words.swings}
        value={swings}
        min={1}
        max={500}
        step={1}
        noSlider
        onChange={(value) => setSwings(Math.round(value))}
      />
      <label class="measure-timings">
        {words.timings} <span class="faint">{words.timingsHint}</span>
        <input
          class="text-input"
          type="text"
          value={timings}
          onInput={(event) => setTimings(event.currentTarget.value)}
        />
      </label>
      <Button primary onClick={() => props.onSwing(text())}>
        {words.go}
      </Button>
    </div>
  );
}
