/** Centre of mass by balance: two scales, an edge, or two scales level and tilted for the height. */
import { useState } from 'preact/hooks';
import { InputError, describeProblem } from '../../../craft/problem.ts';
import {
  centreFromKnifeEdge,
  centreFromScales,
  heightFromTilt,
  type BalanceResult,
  type ScaleBalance,
} from '../../../measuring/balance.ts';
import { NoticeBox } from '../../widgets/Notice.tsx';
import { NumberField } from '../../widgets/NumberField.tsx';
import { parseNumber } from '../../widgets/numberText.ts';
import { Select } from '../../widgets/Select.tsx';
import { Found, type FoundRow } from './Found.tsx';
import { measureTexts } from './texts.ts';

const words = measureTexts.balance;
const METHODS = ['scales-x', 'scales-y', 'tilt', 'edge-x', 'edge-y'] as const;
type Method = (typeof METHODS)[number];

interface Typed {
  readonly first_m: number;
  readonly second_m: number;
  readonly first_kg: number | null;
  readonly second_kg: number | null;
  readonly tiltedFirst_kg: number | null;
  readonly tiltedSecond_kg: number | null;
  readonly tilt_deg: number;
  readonly contact_m: number;
  /** Smallest steps of scale, tape and protractor. */
  readonly massStep_kg: number;
  readonly lengthStep_m: number;
  readonly tiltStep_deg: number;
  readonly edges: string;
}

const EMPTY: Typed = {
  first_m: 0.15,
  second_m: -0.15,
  first_kg: null,
  second_kg: null,
  tiltedFirst_kg: null,
  tiltedSecond_kg: null,
  tilt_deg: 25,
  contact_m: 0.05,
  massStep_kg: 0.001,
  lengthStep_m: 0.001,
  tiltStep_deg: 0.5,
  edges: '',
};

export function BalanceForm() {
  const [method, setMethod] = useState<Method>('scales-x');
  const [typed, setTyped] = useState(EMPTY);
  const change = (part: Partial<Typed>): void => setTyped({ ...typed, ...part });
  const answer = answerOf(method, typed);
  return (
    <div class="measure-bench">
      <section>
        <p>{words.what}</p>
        <div class="panel">
          <Select
            label={words.method}
            value={method}
            options={METHODS.map((value) => ({ value, label: words.methods[value] }))}
            onChange={(value) => {
              setMethod(value);
              // A reading belongs to its place; it is not carried over to another.
              setTyped({ ...EMPTY, massStep_kg: typed.massStep_kg, lengthStep_m: typed.lengthStep_m });
            }}
          />
          {method.startsWith('edge') ? (
            <EdgeFields typed={typed} onChange={change} />
          ) : (
            <ScaleFields method={method} typed={typed} onChange={change} />
          )}
          <Metres
            label={words.lengthStep}
            value={typed.lengthStep_m}
            onChange={(v) => change({ lengthStep_m: Math.max(1e-5, v) })}
          />
        </div>
      </section>
      <section aria-label={measureTexts.found}>
        {answer === null && <p class="faint">{words.nothing}</p>}
        {typeof answer === 'string' && <NoticeBox kind="error">{answer}</NoticeBox>}
        {answer !== null && typeof answer !== 'string' && (
          <Found result={answer.result} rows={answer.rows} label={words.label} />
        )}
      </section>
    </div>
  );
}

interface FieldsProps {
  readonly typed: Typed;
  readonly onChange: (part: Partial<Typed>) => void;
}

function ScaleFields(props: FieldsProps & { method: Method }) {
  const { method, typed, onChange } = props;
  const names = method === 'scales-y' ? words.sides : words.ends;
  return (
    <>
      <Metres
        label={words.place(names[0])}
        value={typed.first_m}
        onChange={(first_m) => onChange({ first_m })}
      />
      <Reading
        label={words.reading(names[0])}
        value={typed.first_kg}
        onChange={(first_kg) => onChange({ first_kg })}
      />
      <Metres
        label={words.place(names[1])}
        value={typed.second_m}
        onChange={(second_m) => onChange({ second_m })}
      />
      <Reading
        label={words.reading(names[1])}
        value={typed.second_kg}
        onChange={(second_kg) => onChange({ second_kg })}
      />
      {method === 'tilt' && (
        <>
          <NumberField
            label={words.tilt}
            value={typed.tilt_deg}
            unit="deg"
            min={5}
            max={60}
            noSlider
            onChange={(tilt_deg) => onChange({ tilt_deg })}
          />
          <Reading
            label={words.tilted(names[0])}
            value={typed.tiltedFirst_kg}
            onChange={(tiltedFirst_kg) => onChange({ tiltedFirst_kg })}
          />
          <Reading
            label={words.tilted(names[1])}
            value={typed.tiltedSecond_kg}
            onChange={(tiltedSecond_kg) => onChange({ tiltedSecond_kg })}
          />
          <Metres
            label={words.contact}
            value={typed.contact_m}
            onChange={(contact_m) => onChange({ contact_m })}
          />
          <NumberField
            label={words.tiltStep}
            value={typed.tiltStep_deg}
            unit="deg"
            min={0.01}
            max={5}
            noSlider
            onChange={(tiltStep_deg) => onChange({ tiltStep_deg })}
          />
        </>
      )}
      <NumberField
        label={words.massStep}
        value={typed.massStep_kg}
        unit="kg"
        min={1e-5}
        max={1}
        noSlider
        onChange={(massStep_kg) => onChange({ massStep_kg })}
      />
    </>
  );
}

function EdgeFields({ typed, onChange }: FieldsProps) {
  return (
    <label class="measure-timings">
      {words.edges} <span class="faint">{words.edgesHint}</span>
      <input
        class="text-input"
        type="text"
        value={typed.edges}
        onInput={(event) => onChange({ edges: event.currentTarget.value })}
      />
    </label>
  );
}

function Metres(props: { label: string; value: number; onChange: (value: number) => void }) {
  return <NumberField {...props} unit="m" min={-5} max={5} noSlider />;
}

/** A scale's reading; 0 stands for "not read yet". */
function Reading(props: { label: string; value: number | null; onChange: (value: number) => void }) {
  return <NumberField {...props} value={props.value ?? 0} unit="kg" min={0} max={150} noSlider />;
}

type Answer = { readonly result: BalanceResult; readonly rows: readonly FoundRow[] } | string | null;

/** null while readings are missing, a sentence when they are refused. */
function answerOf(method: Method, typed: Typed): Answer {
  try {
    const result = resultOf(method, typed);
    return result === null ? null : { result, rows: rowsOf(result, typed) };
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    return describeProblem(words.label, error.problems[0]);
  }
}

function resultOf(method: Method, typed: Typed): BalanceResult | null {
  const { lengthStep_m, massStep_kg } = typed;
  if (method === 'edge-x' || method === 'edge-y') {
    const texts = typed.edges.split(/[\s;]+/).filter((one) => one !== '');
    if (texts.length === 0) return null;
    const positions_m = texts.map((one) => (parseNumber(one) ?? NaN) / 1000);
    return centreFromKnifeEdge({ axis: method === 'edge-x' ? 'x' : 'y', positions_m, lengthStep_m });
  }
  const { first_kg, second_kg, tiltedFirst_kg, tiltedSecond_kg } = typed;
  if (first_kg === null || second_kg === null) return null;
  const level: ScaleBalance = {
    axis: method === 'scales-y' ? 'y' : 'x',
    scales: [
      { position_m: typed.first_m, reading_kg: first_kg },
      { position_m: typed.second_m, reading_kg: second_kg },
    ],
    massStep_kg,
    lengthStep_m,
  };
  if (method !== 'tilt') return centreFromScales(level);
  if (tiltedFirst_kg === null || tiltedSecond_kg === null) return null;
  return heightFromTilt({
    level,
    tiltedReadings_kg: [tiltedFirst_kg, tiltedSecond_kg],
    tilt_deg: typed.tilt_deg,
    tiltStep_deg: typed.tiltStep_deg,
    contactDown_m: typed.contact_m,
  });
}

function rowsOf(result: BalanceResult, typed: Typed): FoundRow[] {
  const centre = { name: words.centre[result.axis], estimate: result.centre };
  if (result.mass_kg === null) return [centre];
  // Two readings, each rounded to the scale's step: 1/√12 of it, and √2 for two.
  const sigma = typed.massStep_kg / Math.sqrt(6);
  return [
    centre,
    { name: words.mass, estimate: { value: result.mass_kg, sigma, unit: 'kg', meaning: words.massMeans } },
  ];
}
