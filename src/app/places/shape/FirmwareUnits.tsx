/** The gains in a firmware's own way of counting: live, typed in those units, and as source text to copy. */
import { useState } from 'preact/hooks';
import { AXES, type AxisName } from '../../../craft/gains.ts';
import {
  CONVENTIONS,
  exportConstants,
  EXPORTS,
  fromConvention,
  toConvention,
  whatChangesWithRate,
  type AxisConstants,
  type Constants,
  type Convention,
} from '../../../shaping/conventions.ts';
import { useStore } from '../../store/context.ts';
import { Button } from '../../widgets/Button.tsx';
import { NumberField } from '../../widgets/NumberField.tsx';
import { Select } from '../../widgets/Select.tsx';
import { ConventionEditor } from './ConventionEditor.tsx';
import { keptShape } from './kept.ts';
import { shapeTexts as words } from './texts.ts';

const OWN = 'own';
const KEYS = ['p', 'i', 'd', 'ff'] as const;
const LARGEST = 1e12;

export function FirmwareUnits(props: { axis: AxisName }) {
  const store = useStore();
  const kept = keptShape(store.craft.value.sheets.shape);
  const own = kept.shown === OWN || kept.shown === kept.own?.name ? kept.own : null;
  const convention = own ?? CONVENTIONS.find((one) => one.name === kept.shown) ?? CONVENTIONS[0];
  const keep = (change: Partial<typeof kept>): void =>
    store.setSheet(
      'shape',
      { ...keptShape(store.craft.value.sheets.shape), ...change },
      words.conventionChoice,
    );
  const choose = (name: string): void => {
    if (name !== OWN) keep({ shown: name });
    // A first own convention begins as the one that was shown.
    else keep({ shown: OWN, own: kept.own ?? { ...convention, name: words.own } });
  };
  return (
    <details class="panel">
      <summary>{words.convention}</summary>
      <Select
        label={words.conventionChoice}
        value={own === null ? convention.name : OWN}
        options={[
          ...CONVENTIONS.map((one) => ({ value: one.name, label: one.name })),
          { value: OWN, label: kept.own?.name ?? words.own },
        ]}
        onChange={choose}
      />
      {own !== null && <ConventionEditor own={own} onChange={(next) => keep({ own: next, shown: OWN })} />}
      <ConstantFields axis={props.axis} convention={convention} />
      <Exports convention={convention} />
      <p class="small">{words.caution}</p>
    </details>
  );
}

/** The axis's constants as the firmware has them; what is typed here becomes the gain. */
function ConstantFields(props: { axis: AxisName; convention: Convention }) {
  const { axis, convention } = props;
  const store = useStore();
  const gains = store.gains.value;
  const constants = constantsOf(() => toConvention(gains, convention));
  if (typeof constants === 'string') return <p class="bad">{constants}</p>;
  const set = (key: keyof AxisConstants, value: number): string | null =>
    store.setGains(
      fromConvention({ ...constants, [axis]: { ...constants[axis], [key]: value } }, convention, gains),
      `${axis} ${key.toUpperCase()}`,
      { quiet: true },
    )[0]?.allowed ?? null;
  return (
    <fieldset class="shape-constants">
      <legend>{words.inUnits(axis)}</legend>
      {KEYS.map((key) => (
        <NumberField
          key={key}
          label={key.toUpperCase()}
          value={constants[axis][key]}
          min={-LARGEST}
          max={LARGEST}
          noSlider
          onChange={(value) => set(key, value)}
        />
      ))}
    </fieldset>
  );
}

/** A convention by times cannot say an integral without P: the reason then stands in its place. */
function constantsOf(convert: () => Constants): Constants | string {
  try {
    return convert();
  } catch (error) {
    if (error instanceof RangeError) return error.message;
    throw error;
  }
}

function Exports(props: { convention: Convention }) {
  const { convention } = props;
  const store = useStore();
  const [said, setSaid] = useState('');
  const gains = store.gains.value;
  const sayable = typeof constantsOf(() => toConvention(gains, convention)) !== 'string';
  const copy = async (kind: (typeof EXPORTS)[number]) => {
    await navigator.clipboard.writeText(exportConstants(gains, convention, kind, store.build.value.name));
    setSaid(words.copied);
  };
  const rates = [gains.loop_Hz / 2, gains.loop_Hz * 2].filter((rate) => rate >= 50 && rate <= 8000);
  const changes = sameTogether(
    rates.map((rate) => [whatChangesWithRate(convention, gains.loop_Hz, rate).join('; '), rate]),
  );
  return (
    <>
      {changes.map(([what, at]) => (
        <p class="small" key={what}>
          {words.rateChange(at.join(words.or))} {what}
        </p>
      ))}
      <div class="row">
        <span class="faint">{words.exportAs}</span>
        {EXPORTS.map((kind) => (
          <Button key={kind} quiet disabled={!sayable} onClick={() => void copy(kind)}>
            {words.exports[kind]}
          </Button>
        ))}
        <span role="status">{said}</span>
      </div>
      <p class="small faint">{words.allAxes(AXES.join(', '))}</p>
    </>
  );
}

/** What holds for several rates is said once. */
function sameTogether(said: readonly (readonly [string, number])[]): [string, number[]][] {
  const rates = new Map<string, number[]>();
  for (const [what, rate] of said) rates.set(what, [...(rates.get(what) ?? []), rate]);
  return [...rates];
}
