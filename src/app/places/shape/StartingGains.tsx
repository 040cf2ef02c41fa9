/** Starting gains by constrained optimisation in the worker, with the published rules beside them. */
import { useEffect, useRef, useState } from 'preact/hooks';
import { AXES, type AxisName } from '../../../craft/gains.ts';
import type { TrimChoice } from '../../../shaping/axisModel.ts';
import type { Plant } from '../../../shaping/continuous.ts';
import {
  amigoGains,
  simcGains,
  type AxisGainsFound,
  type StartingSet,
} from '../../../shaping/startingGains.ts';
import { useStore } from '../../store/context.ts';
import { readable } from '../../store/units.ts';
import { Button } from '../../widgets/Button.tsx';
import type { FromShapeWorker, ToShapeWorker } from './shape.worker.ts';
import { shapeTexts as words } from './texts.ts';
import { useShapeWorker } from './useShapeWorker.ts';

export function StartingGains(props: { trim: TrimChoice; axis: AxisName; plant: Plant }) {
  const store = useStore();
  const worker = useShapeWorker();
  const [found, setFound] = useState<StartingSet | null>(null);
  const [busy, setBusy] = useState(false);
  const id = useRef(0);
  useEffect(() => setFound(null), [store.craft.value.id, props.trim]);
  const start = () => {
    const one = worker.current;
    if (one === null) return;
    const job = store.jobs.start(words.starting);
    const own = ++id.current;
    setBusy(true);
    one.onmessage = ({ data }: MessageEvent<FromShapeWorker>) => {
      if (data.id !== own) return;
      job.end();
      setBusy(false);
      if (data.kind === 'started') setFound(data.found);
      else if (data.kind === 'failed') store.notices.tell('error', data.reason, { topic: 'shape:start' });
    };
    one.postMessage({
      kind: 'start',
      id: own,
      build: store.build.value,
      gains: store.gains.value,
      trim: props.trim,
    } satisfies ToShapeWorker);
  };
  const gains = store.gains.value;
  const tick_s = 1 / gains.loop_Hz;
  const extra_s = gains.computeDelay_s + store.build.value.gyro.delay_s;
  return (
    <div class="panel">
      <Button primary disabled={busy} onClick={start}>
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

function GainsRow(props: { label: string; gains: AxisGainsFound }) {
  const { p_us_per_dps: p, i_us_per_deg: i, d_us_per_dps2: d } = props.gains;
  return (
    <p class="small">
      {props.label}: P <b>{readable(p)}</b>, I <b>{readable(i)}</b>, D <b>{readable(d)}</b>
    </p>
  );
}
