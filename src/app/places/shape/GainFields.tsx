/** Gains of one axis and the loop's filters, each with slider, field, unit and the saved value. */
import { useState } from 'preact/hooks';
import type { AxisGains, AxisName, Gains } from '../../../craft/gains.ts';
import { useStore } from '../../store/context.ts';
import { NumberField } from '../../widgets/NumberField.tsx';
import { Toggle } from '../../widgets/Toggle.tsx';
import { shapeTexts as words } from './texts.ts';

const FIELDS = [
  ['p_us_per_dps', words.p, 'µs/(deg/s)', 1000, 0.5],
  ['i_us_per_deg', words.i, 'µs/deg', 100_000, 3],
  ['d_us_per_dps2', words.d, 'µs/(deg/s²)', 100, 0.01],
  ['feedforward_us_per_dps', words.ff, 'µs/(deg/s)', 1000, 0.5],
] as const;

export function GainFields(props: { axis: AxisName }) {
  const store = useStore();
  const [together, setTogether] = useState(false);
  const gains = store.gains.value;
  const saved = store.savedGains.value;
  const { axis } = props;
  const axes: readonly AxisName[] = together && axis !== 'yaw' ? ['roll', 'pitch'] : [axis];
  const setAxis = (key: keyof AxisGains, value: number, label: string): string | null =>
    store.setGains(
      (now): Gains => {
        const changed = Object.fromEntries(axes.map((one) => [one, { ...now.axes[one], [key]: value }]));
        return { ...now, axes: { ...now.axes, ...changed } };
      },
      `${axes.join(', ')} ${label}`,
      { quiet: true },
    )[0]?.allowed ?? null;
  const set = (change: Partial<Gains>, label: string): string | null =>
    store.setGains((now) => ({ ...now, ...change }), label, { quiet: true })[0]?.allowed ?? null;
  return (
    <div class="panel">
      {FIELDS.map(([key, label, unit, most, least]) => {
        const value = gains.axes[axis][key];
        const kept = saved.axes[axis][key];
        return (
          <NumberField
            key={key}
            label={label}
            value={value}
            saved={kept}
            unit={unit}
            min={-most}
            max={most}
            sliderMin={0}
            sliderMax={Math.max(3 * Math.abs(kept), least)}
            onChange={(next) => setAxis(key, next, label)}
          />
        );
      })}
      {axis !== 'yaw' && <Toggle label={words.both} on={together} onChange={setTogether} />}
      <NumberField
        label={words.dCut}
        value={gains.derivativeLowPass_Hz}
        saved={saved.derivativeLowPass_Hz}
        unit="Hz"
        min={0}
        max={20_000}
        sliderMax={300}
        onChange={(v) => set({ derivativeLowPass_Hz: v }, words.dCut)}
      />
      <NumberField
        label={words.gyroCut}
        value={gains.gyroLowPass_Hz}
        saved={saved.gyroLowPass_Hz}
        unit="Hz"
        min={0}
        max={20_000}
        sliderMax={300}
        onChange={(v) => set({ gyroLowPass_Hz: v }, words.gyroCut)}
      />
      <NumberField
        label={words.loop}
        value={gains.loop_Hz}
        saved={saved.loop_Hz}
        unit="Hz"
        min={50}
        max={8000}
        logarithmic
        onChange={(v) => set({ loop_Hz: v }, words.loop)}
      />
      <NumberField
        label={words.delay}
        value={gains.computeDelay_s * 1000}
        saved={saved.computeDelay_s * 1000}
        unit="ms"
        min={0}
        max={50}
        sliderMax={8}
        onChange={(v) => set({ computeDelay_s: v / 1000 }, words.delay)}
      />
    </div>
  );
}
