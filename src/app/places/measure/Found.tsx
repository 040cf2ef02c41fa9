/** What a measurement gives: each number with how well it is known, what that does, and the way into the build. */
import type { ComponentChildren } from 'preact';
import { useState } from 'preact/hooks';
import type { Build } from '../../../craft/build.ts';
import type { Measurement } from '../../../measuring/buildFromMeasurements.ts';
import { NORMAL_95, type Estimate } from '../../../measuring/estimate.ts';
import { useStore } from '../../store/context.ts';
import { sameJson } from '../../store/document.ts';
import { readable } from '../../store/units.ts';
import { Button } from '../../widgets/Button.tsx';
import { acceptResult } from './accept.ts';
import { measureTexts as words } from './texts.ts';

export interface FoundRow {
  readonly name: string;
  readonly estimate: Estimate & { readonly meaning?: string };
}

/** Names of a record's quantities as words; the unit stands beside the value. */
export function rowsOf(quantities: object): FoundRow[] {
  return Object.entries(quantities as Record<string, FoundRow['estimate'] | undefined>).flatMap(
    ([name, estimate]) => (estimate === undefined ? [] : [{ name: spoken(name), estimate }]),
  );
}

export function Found(props: {
  result: Measurement;
  rows: readonly FoundRow[];
  label: string;
  children?: ComponentChildren;
}) {
  const { result } = props;
  return (
    <>
      <Quantities rows={props.rows} />
      {props.children}
      {result.notes.length > 0 && (
        <ul class="small">
          {result.notes.map((note) => (
            <li key={note}>{note}</li>
          ))}
        </ul>
      )}
      <Accept result={result} label={props.label} />
    </>
  );
}

function Accept(props: { result: Measurement; label: string }) {
  const store = useStore();
  const [taken, setTaken] = useState<{ result: Measurement; build: Build } | null>(null);
  const accepted = taken?.result === props.result && sameJson(taken.build, store.build.value);
  const take = (): void => {
    if (acceptResult(store, props.result, props.label))
      setTaken({ result: props.result, build: store.build.value });
  };
  return (
    <>
      <div class="row">
        <Button primary disabled={accepted} onClick={take}>
          {words.accept}
        </Button>
        <span role="status">{accepted ? words.accepted : ''}</span>
      </div>
      <p class="small faint">{words.notClearance}</p>
    </>
  );
}

function Quantities(props: { rows: readonly FoundRow[] }) {
  return (
    <table class="measure-found">
      <thead>
        <tr>
          <th scope="col">{words.quantity}</th>
          <th scope="col">{words.value}</th>
          <th scope="col">{words.known}</th>
          <th scope="col">{words.means}</th>
        </tr>
      </thead>
      <tbody>
        {props.rows.map(({ name, estimate }) => (
          <tr key={name}>
            <th scope="row">{name}</th>
            <td>
              <b>{readable(estimate.value)}</b>{' '}
              <span class="unit">{estimate.unit === '1' ? '' : estimate.unit}</span>
            </td>
            <td>{knownTo(estimate)}</td>
            <td class="small">{estimate.meaning ?? ''}</td>
          </tr>
        ))}
      </tbody>
    </table>
  );
}

/** "± 0.0012 (2.1 %)"; no share where the value may as well be 0. */
function knownTo({ value, sigma }: Estimate): string {
  const half = NORMAL_95 * sigma;
  const share = Math.abs(value) > half ? ` (${readable((100 * half) / Math.abs(value), 2)} %)` : '';
  return `± ${readable(half, 2)}${share}`;
}

/** "thrustCoefficient", "inertia_xx_kgm2" as words. */
function spoken(name: string): string {
  return name
    .replace(/_(kgm2|s|ohm|dps|Hz|A|V|W|rpm|rpm_per_V|dps_per_rtHz|g_per_W)$/, '')
    .replace(/_/g, ' ')
    .replace(/([a-z])([A-Z])/g, (_all, a: string, b: string) => `${a} ${b.toLowerCase()}`);
}
