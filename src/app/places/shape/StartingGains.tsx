/** Starting gains by constrained optimisation in the worker, with the published rules beside them. */
import { useEffect, useState } from 'preact/hooks';
import { AXES, type AxisName } from '../../../craft/gains.ts';
import type { TrimChoice } from '../../../shaping/axisModel.ts';
import type { Plant } from '../../../shaping/continuous.ts';
import {
  amigoGains,
  simcGains,
  type AxisGainsFound,
  type Loosening,
  type StartingSet,
} from '../../../shaping/startingGains.ts';
import { useStore } from '../../store/context.ts';
import { readable } from '../../store/units.ts';
import { Button } from '../../widgets/Button.tsx';
import { keptShape } from './kept.ts';
import { LimitFields } from './LimitFields.tsx';
import { useOneShot } from './oneShot.ts';
import { shapeTexts as words } from './texts.ts';

export function StartingGains(props: { trim: TrimChoice; axis: AxisName; plant: Plant }) {
  const store = useStore();
  const [found, setFound] = useState<StartingSet | null>(null);
  const search = useOneShot(words.starting, 'shape:start');
  const kept = keptShape(store.craft.value.sheets.shape);
  const limitsKey = JSON.stringify(kept.limits);
  useEffect(() => setFound(null), [store.craft.value.id, props.trim, limitsKey]);
  const start = (): void =>
    search.ask(
      {
        kind: 'start',
        build: store.build.value,
        gains: store.gains.value,
        trim: props.trim,
        limits: kept.limits,
      },
      (answer) => {
        if (answer.kind === 'started') setFound(answer.found);
      },
    );
  const gains = store.gains.value;
  const tick_s = 1 / gains.loop_Hz;
  const extra_s = gains.computeDelay_s + store.build.value.gyro.delay_s;
  return (
    <div class="panel">
      <Button primary disabled={search.busy} onClick={start}>
        {words.start}
      </Button>
      {found !== null && (
        <>
          <GainsRow label={words.starting} gains={found.axes[props.axis]} />
          <ul class="small">
            {AXES.map((axis) => (
              <li key={axis}>
                {words.limitedBy(axis, found.axes[axis].active, found.axes[axis].loosenedBy)}
              </li>
            ))}
          </ul>
          <Loosened changes={found.axes[props.axis].loosening} axis={props.axis} />
          <div class="row">
            <Button onClick={() => store.setGains({ ...found.gains, name: gains.name }, words.starting)}>
              {words.useStart}
            </Button>
            <Button
              onClick={() => {
                store.copyToB();
                store.setGains(found.gains, words.starting, { side: 'B' });
              }}
            >
              {words.compareStart}
            </Button>
          </div>
        </>
      )}
      <LimitFields limits={kept.limits} />
      {props.plant.lag_s > 0.001 && (
        <details>
          <summary>{words.rules}</summary>
          <GainsRow label={words.simc} gains={simcGains(props.plant, tick_s, extra_s)} />
          <GainsRow label={words.amigo} gains={amigoGains(props.plant, tick_s, extra_s)} />
        </details>
      )}
    </div>
  );
}

/** What a change of the bench would bring, the best first. */
function Loosened(props: { changes: readonly Loosening[]; axis: AxisName }) {
  const worth = props.changes.filter((one) => one.gain_pct >= 1);
  if (worth.length === 0) return null;
  return (
    <p class="small">
      {words.loosening(props.axis)}{' '}
      {worth.map((one) => words.loosened(one.change, one.gain_pct.toFixed(0))).join('; ')}.
    </p>
  );
}

function GainsRow(props: { label: string; gains: AxisGainsFound }) {
  const { p_us_per_dps: p, i_us_per_deg: i, d_us_per_dps2: d } = props.gains;
  return (
    <p class="small">
      {props.label}: P <b>{readable(p)}</b>, I <b>{readable(i)}</b>, D <b>{readable(d)}</b>
    </p>
  );
}
