/** What to sweep: trial, one or two numbers by path, their ranges; refused with what is allowed before any flight. */
import { useId, useState } from 'preact/hooks';
import { InputError } from '../../../craft/problem.ts';
import { numberPaths, resolve, valueAt } from '../../../trials/overrides.ts';
import { TRIALS, trialByName } from '../../../trials/registry.ts';
import { MOST_CELLS, parseSweep, SWEEP_FORMAT, type Subject, type Sweep } from '../../../trials/sweep.ts';
import type { Trial } from '../../../trials/trial.ts';
import { useStore } from '../../store/context.ts';
import { Button } from '../../widgets/Button.tsx';
import { Select } from '../../widgets/Select.tsx';
import { Toggle } from '../../widgets/Toggle.tsx';
import { useDesk } from './shared.ts';
import { proveTexts as words } from './texts.ts';

/** As typed: what is not a number is refused by the sweep's own parser, with what is allowed. */
interface AxisForm {
  readonly path: string;
  readonly from: string;
  readonly to: string;
  readonly count: string;
  readonly log: boolean;
}
interface Form {
  readonly trial: string;
  readonly second: boolean;
  readonly x: AxisForm;
  readonly y: AxisForm;
}

const FIRST: Form = {
  trial: 'rate-step-roll-small',
  second: true,
  x: { path: 'gains.axes.roll.p_us_per_dps', from: '', to: '', count: '8', log: false },
  y: { path: 'build.airframe.mass_kg', from: '', to: '', count: '8', log: false },
};
const MEMORY = 'prove.sweep';

export function SweepForm(props: { subject: Subject; busy: boolean; onStart: (sweep: Sweep) => void }) {
  const store = useStore();
  const { kept } = useDesk();
  const listId = useId();
  const [form, setForm] = useState(() => formOf(store.settings.value.places[MEMORY], props.subject));
  const [problems, setProblems] = useState<readonly string[]>([]);
  const trial = trialByName(form.trial);
  const change = (next: Partial<Form>): void => {
    setProblems([]);
    setForm({ ...form, ...next });
  };
  const said = (act: () => void): void => {
    try {
      act();
      setProblems([]);
    } catch (error) {
      if (!(error instanceof InputError)) throw error;
      setProblems(
        error.problems.map(({ path, value, allowed }) => `${path}: ${String(value)}; allowed: ${allowed}`),
      );
    }
  };
  /** A path that leads to a number brings a range around it. */
  const choosePath = (axis: 'x' | 'y', path: string): void => {
    setForm({ ...form, [axis]: { ...form[axis], path } });
    said(() => {
      const range = rangeAround(foundAt(trial, props.subject, path));
      setForm({ ...form, [axis]: { ...form[axis], path, ...range } });
    });
  };
  const start = (): void =>
    said(() => {
      const raw = {
        format: SWEEP_FORMAT,
        trial: form.trial,
        x: axisOf(form.x),
        ...(form.second ? { y: axisOf(form.y) } : {}),
        bands: kept.bands[form.trial] ?? {},
        seed: kept.seed,
      };
      const sweep = parseSweep(raw, props.subject, 'sweep');
      store.setPlaceMemory(MEMORY, form);
      props.onStart(sweep);
    });
  const cells = (Number(form.x.count) || 0) * (form.second ? Number(form.y.count) || 0 : 1);
  return (
    <form
      class="prove-sweep"
      aria-label={words.sweepForm}
      onSubmit={(event) => {
        event.preventDefault();
        start();
      }}
    >
      <h3>{words.sweepForm}</h3>
      <datalist id={listId}>
        {numberPaths(trial, props.subject).map((path) => (
          <option key={path} value={path} />
        ))}
      </datalist>
      <Select
        label={words.trialChoice}
        value={form.trial}
        options={TRIALS.map((one) => ({ value: one.name, label: one.title }))}
        onChange={(next) => change({ trial: next })}
      />
      <AxisFields
        axis={words.x}
        listId={listId}
        form={form.x}
        onPath={(path) => choosePath('x', path)}
        onChange={(x) => change({ x })}
      />
      <Toggle label={words.second} on={form.second} onChange={(second) => change({ second })} />
      {form.second && (
        <AxisFields
          axis={words.y}
          listId={listId}
          form={form.y}
          onPath={(path) => choosePath('y', path)}
          onChange={(y) => change({ y })}
        />
      )}
      <div class="row">
        <Button disabled={props.busy} title={props.busy ? words.busy : undefined} onClick={start}>
          {words.sweepRun}
        </Button>
        <span class="faint small">{words.cellsAsked(cells, MOST_CELLS)}</span>
      </div>
      {problems.length > 0 && (
        <ul class="prove-problems" role="alert">
          {problems.map((line) => (
            <li key={line}>{line}</li>
          ))}
        </ul>
      )}
    </form>
  );
}

function AxisFields(props: {
  axis: string;
  listId: string;
  form: AxisForm;
  onPath: (path: string) => void;
  onChange: (form: AxisForm) => void;
}) {
  const { axis, form, onChange } = props;
  const field = (key: 'from' | 'to' | 'count') => (
    <label class="prove-axis-number">
      <span class="faint">{words[key]}</span>
      <input
        class="text-input"
        inputMode="decimal"
        aria-label={words.field(axis, words[key])}
        value={form[key]}
        onChange={(event) => onChange({ ...form, [key]: event.currentTarget.value })}
      />
    </label>
  );
  return (
    <fieldset class="prove-axis">
      <input
        class="text-input"
        list={props.listId}
        aria-label={words.path(axis)}
        title={words.pathHint}
        placeholder={words.pathHint}
        spellcheck={false}
        autocomplete="off"
        value={form.path}
        onChange={(event) => props.onPath(event.currentTarget.value.trim())}
      />
      <div class="prove-axis-range">
        {field('from')}
        {field('to')}
        {field('count')}
        <Toggle
          label={words.log}
          hint={words.field(axis, words.log)}
          on={form.log}
          onChange={(log) => onChange({ ...form, log })}
        />
      </div>
    </fieldset>
  );
}

/** The number at `path`; NaN at an optional one that is absent. @throws InputError when there is no such place */
function foundAt(trial: Trial, subject: Subject, path: string): number {
  const value = valueAt(trial, subject, path, 'sweep');
  if (!Number.isNaN(value)) return value;
  try {
    // Whether an absent field may be there is the parser's to say; which value is allowed comes later.
    resolve(trial, subject, { [path]: 1 }, 'sweep');
  } catch (error) {
    if (!(error instanceof InputError) || error.problems.some((one) => one.path === 'path')) throw error;
  }
  return value;
}

/** A number where there is one; else the text, which the parser then names. */
function typed(text: string): number | string {
  const value = Number(text.replace(',', '.').replace('−', '-'));
  return text.trim() === '' || Number.isNaN(value) ? text : value;
}

function axisOf({ path, from, to, count, log }: AxisForm) {
  return { path, from: typed(from), to: typed(to), count: typed(count), logarithmic: log };
}

/** Half to twice the value; 0 to 1 around nothing. */
function rangeAround(value: number): { from: string; to: string } {
  if (!Number.isFinite(value) || value === 0) return { from: '0', to: '1' };
  const ends = [value / 2, value * 2].sort((a, b) => a - b).map((end) => String(Number(end.toPrecision(3))));
  return { from: ends[0], to: ends[1] };
}

function formOf(memory: unknown, subject: Subject): Form {
  const kept = { ...FIRST, ...(typeof memory === 'object' ? memory : {}) } as Form;
  const form = TRIALS.some(({ name }) => name === kept.trial) ? kept : FIRST;
  const filled = (axis: AxisForm): AxisForm => {
    if (axis.from !== '') return axis;
    return { ...axis, ...rangeAround(valueAt(trialByName(form.trial), subject, axis.path)) };
  };
  return { ...form, x: filled(form.x), y: filled(form.y) };
}
