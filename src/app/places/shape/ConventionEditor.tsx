/** The person's own gain convention: how the firmware counts, told field by field. */
import { conventionSchema, type Convention } from '../../../shaping/conventions.ts';
import { NumberField } from '../../widgets/NumberField.tsx';
import { Select } from '../../widgets/Select.tsx';
import { shapeTexts } from './texts.ts';

const words = shapeTexts.ownConvention;
const KEYS = ['p', 'i', 'd', 'ff'] as const;
const DEFAULT_SPAN_US = 1000;

const optionsOf = <T extends string>(labels: Readonly<Record<T, string>>) =>
  (Object.keys(labels) as T[]).map((value) => ({ value, label: labels[value] }));

export function ConventionEditor(props: { own: Convention; onChange: (next: Convention) => void }) {
  const { own } = props;
  const set = (change: Partial<Convention>): void => {
    const next = conventionSchema.safeParse({ ...own, ...change });
    if (next.success) props.onChange(next.data);
  };
  return (
    <div class="shape-own">
      <label class="field choice">
        <span class="label">{words.name}</span>
        <input
          type="text"
          value={own.name}
          maxLength={80}
          onChange={(event) => {
            const name = event.currentTarget.value.trim();
            if (name === '') event.currentTarget.value = own.name;
            else set({ name });
          }}
        />
      </label>
      <Select
        label={words.rate}
        value={own.rate}
        options={optionsOf(words.rates)}
        onChange={(rate) => set({ rate })}
      />
      <Select
        label={words.output}
        value={own.output}
        options={optionsOf(words.outputs)}
        onChange={(output) =>
          set(
            output === 'share'
              ? { output, outputSpan_us: own.outputSpan_us ?? DEFAULT_SPAN_US }
              : { output, outputSpan_us: undefined },
          )
        }
      />
      {own.output === 'share' && (
        <NumberField
          label={words.span}
          value={own.outputSpan_us ?? DEFAULT_SPAN_US}
          unit="µs"
          min={1}
          max={10_000}
          noSlider
          onChange={(outputSpan_us) => set({ outputSpan_us })}
        />
      )}
      <Select
        label={words.integral}
        value={own.integral}
        options={optionsOf(words.integrals)}
        onChange={(integral) => set({ integral })}
      />
      <Select
        label={words.derivative}
        value={own.derivative}
        options={optionsOf(words.derivatives)}
        onChange={(derivative) => set({ derivative })}
      />
      {KEYS.map((key) => (
        <NumberField
          key={key}
          label={words.scale(key.toUpperCase())}
          value={own.scale[key]}
          min={1e-9}
          max={1e9}
          noSlider
          onChange={(value) => set({ scale: { ...own.scale, [key]: value } })}
        />
      ))}
    </div>
  );
}
