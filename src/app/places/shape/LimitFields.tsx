/** The limits that starting gains must keep, changed by the person and kept with the craft. */
import { STARTING_LIMITS, type StartingLimits } from '../../../shaping/startingGains.ts';
import { useStore } from '../../store/context.ts';
import { Button } from '../../widgets/Button.tsx';
import { NumberField } from '../../widgets/NumberField.tsx';
import { keptShape } from './kept.ts';
import { shapeTexts } from './texts.ts';

const words = shapeTexts.limits;

type Plain = Exclude<keyof StartingLimits, 'uncertainty'>;
/** Field, unit, least and most. */
const FIELDS: readonly (readonly [Plain, string, number, number])[] = [
  ['maxSensitivity', '', 1.05, 4],
  ['phaseMargin_deg', 'deg', 10, 85],
  ['delayMargin_ms', 'ms', 0, 100],
  ['noiseAtMotor_us_rms', 'µs', 0.1, 200],
  ['overshoot_pct', '%', 0, 100],
  ['leastIntegralTime_crossovers', '', 0, 50],
];
const SPREADS = ['mass', 'voltage', 'thrust'] as const;
const MOST_SPREAD_PCT = 40;

export function LimitFields(props: { limits: StartingLimits }) {
  const { limits } = props;
  const store = useStore();
  const set = (next: StartingLimits): void =>
    store.setSheet('shape', { ...keptShape(store.craft.value.sheets.shape), limits: next }, words.label);
  return (
    <details>
      <summary>{words.label}</summary>
      {FIELDS.map(([key, unit, min, max]) => (
        <NumberField
          key={key}
          label={words.fields[key]}
          value={limits[key]}
          saved={STARTING_LIMITS[key]}
          unit={unit}
          min={min}
          max={max}
          noSlider
          onChange={(value) => set({ ...limits, [key]: value })}
        />
      ))}
      {SPREADS.map((key) => (
        <NumberField
          key={key}
          label={words.spreads[key]}
          value={100 * limits.uncertainty[key]}
          saved={100 * STARTING_LIMITS.uncertainty[key]}
          unit="%"
          min={0}
          max={MOST_SPREAD_PCT}
          noSlider
          onChange={(value) => set({ ...limits, uncertainty: { ...limits.uncertainty, [key]: value / 100 } })}
        />
      ))}
      <Button quiet onClick={() => set(STARTING_LIMITS)}>
        {words.back}
      </Button>
    </details>
  );
}
