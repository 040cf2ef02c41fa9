/** Inertia from parts: a list of boxes, cylinders and points; the draft outlives a change of place. */
import { useMemo } from 'preact/hooks';
import { InputError, describeProblem } from '../../../craft/problem.ts';
import { inertiaFromParts, PARTS_FORMAT, parseParts, type PartsResult } from '../../../measuring/parts.ts';
import { useStore } from '../../store/context.ts';
import type { Store } from '../../store/store.ts';
import { Button } from '../../widgets/Button.tsx';
import { NoticeBox } from '../../widgets/Notice.tsx';
import { NumberField } from '../../widgets/NumberField.tsx';
import { Select } from '../../widgets/Select.tsx';
import { Found, rowsOf, type FoundRow } from './Found.tsx';
import { measureTexts } from './texts.ts';

const words = measureTexts.parts;
const SHAPES = ['box', 'cylinder', 'point'] as const;
const DIRECTIONS = ['x', 'y', 'z'] as const;
const MOST_PARTS = 100;
/** Entry of the place's memory: the lists of the crafts worked on last. */
const MEMORY = 'measure parts';
const MOST_LISTS = 8;

/** One part as typed; what its shape does not need is kept for when the shape is changed back. */
interface TypedPart {
  readonly name: string;
  readonly shape: (typeof SHAPES)[number];
  readonly mass_kg: number;
  readonly x_m: number;
  readonly y_m: number;
  readonly z_m: number;
  readonly a_m: number;
  readonly b_m: number;
  readonly c_m: number;
  readonly axis: (typeof DIRECTIONS)[number];
  readonly radius_m: number;
  readonly length_m: number;
  readonly heading_deg: number;
}

const NEW_PART: Omit<TypedPart, 'name'> = {
  shape: 'box',
  mass_kg: 0.1,
  x_m: 0,
  y_m: 0,
  z_m: 0,
  a_m: 0.1,
  b_m: 0.05,
  c_m: 0.03,
  axis: 'z',
  radius_m: 0.015,
  length_m: 0.03,
  heading_deg: 0,
};

interface KeptList {
  readonly craft: string;
  readonly parts: readonly TypedPart[];
}

export function PartsForm() {
  const store = useStore();
  const parts = partsNow(store);
  const keep = (next: readonly TypedPart[]): void => keepParts(store, next);
  const answer = useMemo(() => answerOf(parts), [parts]);
  const add = (): void => keep([...parts, { ...NEW_PART, name: words.newName(parts.length + 1) }]);
  return (
    <div class="measure-bench measure-parts">
      <section>
        <p>{words.what}</p>
        {parts.map((part, i) => (
          <PartFields
            key={i}
            part={part}
            number={i + 1}
            onChange={(next) => keep(parts.map((one, k) => (k === i ? next : one)))}
            onRemove={() => keep(parts.filter((_, k) => k !== i))}
          />
        ))}
        <Button disabled={parts.length >= MOST_PARTS} onClick={add}>
          {words.add}
        </Button>
      </section>
      <section aria-label={measureTexts.found}>
        {answer === null && <p class="faint">{words.nothing}</p>}
        {typeof answer === 'string' && <NoticeBox kind="error">{answer}</NoticeBox>}
        {answer !== null && typeof answer !== 'string' && (
          <Found result={answer} rows={partRows(answer)} label={words.label}>
            <p class="small">{words.replaces}</p>
          </Found>
        )}
      </section>
    </div>
  );
}

type Size = { [K in keyof TypedPart]: TypedPart[K] extends number ? K : never }[keyof TypedPart];

function PartFields(props: {
  part: TypedPart;
  number: number;
  onChange: (part: TypedPart) => void;
  onRemove: () => void;
}) {
  const { part, number, onChange } = props;
  const field = (key: Size, min: number, max: number, unit: string) => (
    <NumberField
      key={key}
      label={words.fields[key]}
      value={part[key]}
      unit={unit}
      min={min}
      max={max}
      noSlider
      onChange={(value) => onChange({ ...part, [key]: value })}
    />
  );
  const edge = (key: Size) => field(key, 0.0001, 5, 'm');
  return (
    <fieldset class="panel">
      <legend>{words.part(number)}</legend>
      <div class="row">
        <input
          class="text-input"
          type="text"
          aria-label={words.name}
          maxLength={80}
          value={part.name}
          onChange={(event) =>
            onChange({ ...part, name: event.currentTarget.value.trim() || words.newName(number) })
          }
        />
        <Button onClick={props.onRemove}>{words.remove(part.name)}</Button>
      </div>
      <div class="measure-part">
        <Select
          label={words.shape}
          value={part.shape}
          options={SHAPES.map((value) => ({ value, label: words.shapes[value] }))}
          onChange={(shape) => onChange({ ...part, shape })}
        />
        {field('mass_kg', 0.0001, 100, 'kg')}
        {(['x_m', 'y_m', 'z_m'] as const).map((key) => field(key, -5, 5, 'm'))}
        {part.shape === 'box' && (['a_m', 'b_m', 'c_m'] as const).map(edge)}
        {part.shape === 'cylinder' && (
          <>
            <Select
              label={words.along}
              value={part.axis}
              options={DIRECTIONS.map((value) => ({ value, label: words.directions[value] }))}
              onChange={(axis) => onChange({ ...part, axis })}
            />
            {(['radius_m', 'length_m'] as const).map(edge)}
          </>
        )}
        {part.shape !== 'point' && field('heading_deg', -360, 360, 'deg')}
      </div>
    </fieldset>
  );
}

/** null without parts, a sentence when they are refused. */
function answerOf(parts: readonly TypedPart[]): PartsResult | string | null {
  if (parts.length === 0) return null;
  try {
    return inertiaFromParts(parseParts({ format: PARTS_FORMAT, parts: parts.map(partOf) }, words.label));
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    return describeProblem(words.label, error.problems[0]);
  }
}

function partOf(part: TypedPart): unknown {
  const { name, mass_kg, shape, heading_deg } = part;
  const place = { name, mass_kg, shape, position_m: [part.x_m, part.y_m, part.z_m] };
  if (shape === 'point') return place;
  if (shape === 'box') return { ...place, heading_deg, size_m: [part.a_m, part.b_m, part.c_m] };
  return { ...place, heading_deg, axis: part.axis, radius_m: part.radius_m, length_m: part.length_m };
}

function partRows(result: PartsResult): FoundRow[] {
  const centre = result.centreOfMass_m.map((estimate, i) => ({
    name: measureTexts.balance.centre[DIRECTIONS[i]],
    estimate,
  }));
  return [
    { name: measureTexts.balance.mass, estimate: result.mass_kg },
    ...centre,
    ...rowsOf(result.quantities),
  ];
}

const NO_PARTS: readonly TypedPart[] = [];

function listsNow(store: Store): readonly KeptList[] {
  const kept = store.settings.value.places[MEMORY];
  return Array.isArray(kept) ? (kept as KeptList[]).filter((one) => Array.isArray(one.parts)) : [];
}

function partsNow(store: Store): readonly TypedPart[] {
  return listsNow(store).find(({ craft }) => craft === store.craft.value.id)?.parts ?? NO_PARTS;
}

function keepParts(store: Store, parts: readonly TypedPart[]): void {
  const craft = store.craft.value.id;
  const others = listsNow(store).filter((one) => one.craft !== craft);
  store.setPlaceMemory(MEMORY, [{ craft, parts }, ...others].slice(0, MOST_LISTS));
}
