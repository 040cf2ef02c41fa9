/** Which column of the file is what: as proposed from the heads, corrected here, kept for files of this shape. */
import { useState } from 'preact/hooks';
import type { ColumnChoice, ColumnKey, ColumnMapping } from '../../../measuring/columns.ts';
import { DIMENSIONS, type Quantity } from '../../../measuring/heads.ts';
import { unitsOf } from '../../../measuring/units.ts';
import { Button } from '../../widgets/Button.tsx';
import type { BenchKind } from './kinds.ts';
import type { Looked } from './bench.worker.ts';
import { KEYS_OF } from './columnMemory.ts';
import { measureTexts } from './texts.ts';

const words = measureTexts.columns;

export function ColumnsTable(props: {
  kind: Exclude<BenchKind, 'swing'>;
  looked: Looked;
  onRun: (mapping: ColumnMapping) => void;
}) {
  const { looked } = props;
  const [mapping, setMapping] = useState(looked.mapping);
  const changed = JSON.stringify(mapping) !== JSON.stringify(looked.mapping);
  const set = (key: ColumnKey, choice: ColumnChoice | null): void => {
    // A column is one quantity: whoever had it lets go of it.
    const others = Object.entries(mapping).filter(
      ([name, other]) => name !== key && other.column !== choice?.column,
    );
    setMapping(Object.fromEntries(choice === null ? others : [...others, [key, choice]]));
  };
  return (
    <section class="panel measure-columns" aria-label={words.title}>
      <h3>{words.title}</h3>
      <p class="small faint">{words.from[looked.from]}</p>
      <table>
        <thead>
          <tr>
            <th scope="col">{words.quantity}</th>
            <th scope="col">{words.column}</th>
            <th scope="col">{words.unit}</th>
          </tr>
        </thead>
        <tbody>
          {KEYS_OF[props.kind].map((key) => (
            <ColumnRow key={key} name={key} heads={looked.heads} choice={mapping[key]} onChange={set} />
          ))}
        </tbody>
      </table>
      <Button primary={changed} disabled={!changed} onClick={() => props.onRun(mapping)}>
        {words.again}
      </Button>
    </section>
  );
}

function ColumnRow(props: {
  name: ColumnKey;
  heads: readonly string[];
  choice: ColumnChoice | undefined;
  onChange: (key: ColumnKey, choice: ColumnChoice | null) => void;
}) {
  const { name, choice } = props;
  const label = words.names[name] ?? name;
  const dimensions = DIMENSIONS[name.split('_')[0] as Quantity];
  const units = dimensions.length === 0 ? [] : unitsOf(dimensions).split(', ');
  return (
    <tr>
      <th scope="row">{label}</th>
      <td>
        <select
          aria-label={`${words.column}: ${label}`}
          value={choice?.column ?? ''}
          onChange={({ currentTarget: { value } }) =>
            props.onChange(
              name,
              value === ''
                ? null
                : { column: value, unit: choice?.unit ?? words.usual[name] ?? units[0] ?? null },
            )
          }
        >
          <option value="">{words.none}</option>
          {props.heads.map((head) => (
            <option key={head} value={head}>
              {head}
            </option>
          ))}
        </select>
      </td>
      <td>
        {choice !== undefined && units.length > 0 && (
          <select
            aria-label={`${words.unit}: ${label}`}
            value={choice.unit ?? ''}
            onChange={({ currentTarget: { value } }) =>
              props.onChange(name, { ...choice, unit: value === '' ? null : value })
            }
          >
            <option value="">{words.unsaid}</option>
            {units.map((unit) => (
              <option key={unit} value={unit}>
                {unit}
              </option>
            ))}
          </select>
        )}
      </td>
    </tr>
  );
}
