import { useMemo, useState } from 'preact/hooks';
import { AXES, type AxisName } from '../../../craft/gains.ts';
import { InputError } from '../../../craft/problem.ts';
import {
  excitationAt_dps,
  excitationC,
  excitationDuration_s,
  excitationTable,
  largestTurn_deg,
  parseExcitation,
  suggestedExcitations,
  type Excitation,
} from '../../../matching/excitation.ts';
import { LinePlot, type PlotSeries } from '../../plots/LinePlot.tsx';
import { saveFile } from '../../storage/saveFile.ts';
import { useStore } from '../../store/context.ts';
import { readable } from '../../store/units.ts';
import { Button } from '../../widgets/Button.tsx';
import { NoticeBox } from '../../widgets/Notice.tsx';
import { NumberField } from '../../widgets/NumberField.tsx';
import { parseNumber } from '../../widgets/numberText.ts';
import { Select } from '../../widgets/Select.tsx';
import { matchTexts as words } from './texts.ts';

type Kind = Excitation['kind'];
type Form = 'c' | 'table';

const PREVIEW_POINTS = 1500;
/** Rows of the table that the page shows; all of them are copied. */
const SHOWN_ROWS = 14;

function suggested(kind: Kind, axis: AxisName, maxRate_dps: number): Excitation {
  const all = suggestedExcitations(axis, maxRate_dps);
  return all.find((one) => one.kind === kind) ?? all[0];
}

/** Doublets and a sweep for the person's own firmware, as C or as a table. */
export function Excitations() {
  const store = useStore();
  const gains = store.gains.value;
  const [one, setOne] = useState<Excitation>(() => suggested('doublet', 'roll', gains.maxRate_dps.roll));
  const [form, setForm] = useState<Form>('c');
  const checked = useMemo((): Excitation | InputError => {
    try {
      return parseExcitation(one);
    } catch (error) {
      if (error instanceof InputError) return error;
      throw error;
    }
  }, [one]);
  return (
    <section class="match-excitation" aria-label={words.excitation}>
      <h2>{words.excitation}</h2>
      <p>{words.excitationIntro}</p>
      <Select
        label={words.kind}
        value={one.kind}
        options={(['doublet', 'sweep'] as const).map((value) => ({ value, label: words.kinds[value] }))}
        onChange={(kind) => setOne(suggested(kind, one.axis, gains.maxRate_dps[one.axis]))}
      />
      <Select
        label={words.axisOf}
        value={one.axis}
        options={AXES.map((value) => ({ value, label: value }))}
        onChange={(axis) => setOne(suggested(one.kind, axis, gains.maxRate_dps[axis]))}
      />
      <Fields one={one} onChange={setOne} />
      {checked instanceof InputError ? (
        <div role="alert">
          <NoticeBox kind="error">
            {checked.problems[0].path}: {checked.problems[0].value}. {checked.problems[0].allowed}.
          </NoticeBox>
        </div>
      ) : (
        <Given one={checked} form={form} onForm={setForm} loop_Hz={gains.loop_Hz} />
      )}
    </section>
  );
}

function Fields(props: { one: Excitation; onChange: (one: Excitation) => void }) {
  const { one, onChange } = props;
  const amplitude = (
    <NumberField
      label={words.amplitude}
      value={one.amplitude_dps}
      min={5}
      max={150}
      step={1}
      unit="deg/s"
      onChange={(amplitude_dps) => onChange({ ...one, amplitude_dps })}
    />
  );
  if (one.kind === 'doublet') {
    return (
      <>
        {amplitude}
        <HalvesField halves_s={one.halves_s} onChange={(halves_s) => onChange({ ...one, halves_s })} />
        <NumberField
          label={words.rest}
          value={one.rest_s}
          min={0.5}
          max={10}
          step={0.1}
          unit="s"
          onChange={(rest_s) => onChange({ ...one, rest_s })}
        />
        <NumberField
          label={words.repeats}
          value={one.repeats}
          min={1}
          max={60}
          step={1}
          onChange={(value) => onChange({ ...one, repeats: Math.round(value) })}
        />
      </>
    );
  }
  const field = (
    key: 'from_Hz' | 'to_Hz' | 'duration_s' | 'taper_s',
    label: string,
    min: number,
    max: number,
    unit: string,
  ) => (
    <NumberField
      label={label}
      value={one[key]}
      min={min}
      max={max}
      unit={unit}
      onChange={(value) => onChange({ ...one, [key]: value })}
    />
  );
  return (
    <>
      {amplitude}
      {field('from_Hz', words.fromHz, 0.2, 5, 'Hz')}
      {field('to_Hz', words.toHz, 1, 30, 'Hz')}
      {field('duration_s', words.duration, 5, 120, 's')}
      {field('taper_s', words.taper, 0.5, 5, 's')}
    </>
  );
}

function HalvesField(props: { halves_s: readonly number[]; onChange: (halves_s: number[]) => void }) {
  const [typed, setTyped] = useState<string | null>(null);
  const settle = (text: string): void => {
    setTyped(null);
    const numbers = text
      .split(/[\s;]+/)
      .filter((part) => part !== '')
      .map((part) => parseNumber(part) ?? NaN);
    props.onChange(numbers);
  };
  return (
    <div class="field choice" title={words.halvesHint}>
      <label for="match-halves">
        {words.halves} <span class="unit">s</span>
      </label>
      <input
        id="match-halves"
        class="text-input"
        type="text"
        value={typed ?? props.halves_s.map((value) => (Number.isNaN(value) ? '?' : String(value))).join('  ')}
        onInput={(event) => setTyped(event.currentTarget.value)}
        onBlur={() => {
          if (typed !== null) settle(typed);
        }}
        onKeyDown={(event) => {
          if (event.key === 'Enter' && typed !== null) settle(typed);
        }}
      />
    </div>
  );
}

function Given(props: { one: Excitation; form: Form; onForm: (form: Form) => void; loop_Hz: number }) {
  const { one, form, loop_Hz } = props;
  const duration_s = excitationDuration_s(one);
  const text = useMemo(
    () => (form === 'c' ? excitationC(one) : excitationTable(one, loop_Hz)),
    [one, form, loop_Hz],
  );
  const t_s = useMemo(
    () => Float64Array.from({ length: PREVIEW_POINTS }, (_, i) => (duration_s * i) / (PREVIEW_POINTS - 1)),
    [duration_s],
  );
  const series = useMemo(
    (): PlotSeries[] => [
      { label: words.preview, axis: one.axis, values: t_s.map((t) => excitationAt_dps(one, t)) },
    ],
    [one, t_s],
  );
  const name = `${one.axis}-${one.kind}`;
  return (
    <>
      <LinePlot
        label={words.lasts(readable(duration_s, 3), readable(largestTurn_deg(one), 2))}
        x={t_s}
        series={series}
        xLabel={words.time}
        xUnit="s"
        yLabel={words.setpoint}
        yUnit="deg/s"
        height={130}
      />
      <div class="row">
        <div class="match-form">
          <Select
            label={words.form}
            value={form}
            options={[
              { value: 'c', label: words.asC },
              { value: 'table', label: words.asTable },
            ]}
            onChange={props.onForm}
          />
        </div>
        <CopyButton text={text} />
        <Button
          onClick={() =>
            form === 'c' ? saveFile(`${name}.c`, text, 'text/x-c') : saveFile(`${name}.csv`, text, 'text/csv')
          }
        >
          {words.save}
        </Button>
      </div>
      {form === 'table' && <p class="small faint">{words.tableHint(readable(loop_Hz))}</p>}
      <pre class="match-code" tabIndex={0} aria-label={form === 'c' ? words.asC : words.asTable}>
        {form === 'c' ? text : shortened(text)}
      </pre>
    </>
  );
}

function shortened(table: string): string {
  const lines = table.trimEnd().split('\n');
  const shown = lines.slice(0, SHOWN_ROWS + 1);
  return [...shown, words.more(lines.length - shown.length)].join('\n');
}

function CopyButton(props: { text: string }) {
  const [said, setSaid] = useState<{ text: string; words: string } | null>(null);
  const copy = (): void => {
    const { text } = props;
    navigator.clipboard.writeText(text).then(
      () => setSaid({ text, words: words.copied }),
      () => setSaid({ text, words: words.copyFailed }),
    );
  };
  return (
    <>
      <Button onClick={copy}>{words.copy}</Button>
      <span role="status" class="small">
        {said !== null && said.text === props.text ? said.words : ''}
      </span>
    </>
  );
}
