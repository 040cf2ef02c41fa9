/** The map of derivative gain against its cutoff: two layers, what the band allows, the trade-off front. */
import { useEffect, useMemo, useRef, useState } from 'preact/hooks';
import { runPool, type PoolRun } from '../../../trials/pool.ts';
import { trialByName } from '../../../trials/registry.ts';
import {
  axisValue,
  cellsInOrder,
  cellTask,
  derivativeMap,
  tradeOffFront,
  type Sweep,
} from '../../../trials/sweep.ts';
import { createMapGrid, setMapCell } from '../../plots/mapGrid.ts';
import { MapPlot, type MapPoint } from '../../plots/MapPlot.tsx';
import { useStore } from '../../store/context.ts';
import { Button } from '../../widgets/Button.tsx';
import { Select } from '../../widgets/Select.tsx';
import { webWorker, workerCount } from './browserPool.ts';
import { proveTexts as words } from './texts.ts';

const CELLS = 24;
type Layer = 'excursion' | 'activity';

export function DerivativeMap() {
  const store = useStore();
  const [layer, setLayer] = useState<Layer>('activity');
  const [version, setVersion] = useState(0);
  const [state, setState] = useState<'idle' | 'running' | 'paused'>('idle');
  const [sweep, setSweep] = useState<Sweep | null>(null);
  const grids = useRef({ excursion: createMapGrid(CELLS, CELLS), activity: createMapGrid(CELLS, CELLS) });
  const run = useRef<PoolRun | null>(null);
  useEffect(() => () => run.current?.cancel(), []);
  const start = (): void => {
    const subject = { build: store.build.value, gains: store.gains.value, wind: null };
    const one = derivativeMap(subject, CELLS);
    grids.current = { excursion: createMapGrid(CELLS, CELLS), activity: createMapGrid(CELLS, CELLS) };
    const order = cellsInOrder(CELLS, CELLS);
    const workers = Array.from({ length: workerCount() }, webWorker);
    const job = store.jobs.start(words.mapJob, () => run.current?.cancel());
    let done = 0;
    let drawn_ms = 0;
    setSweep(one);
    setState('running');
    run.current = runPool(
      workers,
      order.length,
      (index) => cellTask(one, subject, order[index]),
      (index, answer) => {
        done++;
        job.progress(done / order.length);
        const { column, row, block } = order[index];
        const scores = answer.kind === 'done' ? answer.result.scores : null;
        const lost = answer.kind !== 'done' || answer.result.stopped !== null;
        setMapCell(grids.current.excursion, column, row, scores?.[0]?.value ?? NaN, lost, block);
        setMapCell(grids.current.activity, column, row, scores?.[1]?.value ?? NaN, lost, block);
        const now_ms = performance.now();
        if (now_ms - drawn_ms > 120 || done === order.length) {
          drawn_ms = now_ms;
          setVersion((v) => v + 1);
        }
      },
    );
    void run.current.done.then(() => {
      workers.forEach((worker) => worker.end());
      job.end();
      setState('idle');
      setVersion((v) => v + 1);
    });
  };
  const pick = (point: MapPoint): void => {
    const problems = store.setGains((gains) => {
      const d_us_per_dps2 = Number(point.x.toPrecision(3));
      const { roll, pitch } = gains.axes;
      return {
        ...gains,
        derivativeLowPass_Hz: Math.round(point.y),
        axes: { ...gains.axes, roll: { ...roll, d_us_per_dps2 }, pitch: { ...pitch, d_us_per_dps2 } },
      };
    }, words.map);
    if (problems.length === 0) location.hash = '#/fly';
  };
  const front = useMemo(() => (sweep === null ? null : frontOf(sweep, grids.current)), [sweep, version]);
  const gains = store.gains.value;
  const levels = useMemo(() => (sweep === null ? [] : levelsOf(layer, sweep)), [layer, sweep]);
  return (
    <section class="panel prove-map" aria-label={words.map}>
      <h2>{words.map}</h2>
      <p class="small">{words.mapText}</p>
      <div class="row">
        {state === 'idle' ? (
          <Button primary onClick={start}>
            {words.mapRun}
          </Button>
        ) : (
          <>
            <Button onClick={() => run.current?.cancel()}>{words.mapStop}</Button>
            <Button
              onClick={() => {
                if (state === 'paused') run.current?.resume();
                else run.current?.pause();
                setState(state === 'paused' ? 'running' : 'paused');
              }}
            >
              {state === 'paused' ? words.mapResume : words.mapPause}
            </Button>
          </>
        )}
        <Select
          label={words.mapLayer}
          value={layer}
          options={[
            { value: 'activity', label: words.layers.activity },
            { value: 'excursion', label: words.layers.excursion },
          ]}
          onChange={setLayer}
        />
      </div>
      {sweep !== null && (
        <MapPlot
          label={`${words.map}: ${words.layers[layer]}`}
          x={{ low: sweep.x.from, high: sweep.x.to, label: 'D', unit: 'µs/(deg/s²)' }}
          y={{
            low: sweep.y?.from ?? 10,
            high: sweep.y?.to ?? 200,
            log: true,
            label: 'D low-pass',
            unit: 'Hz',
          }}
          grid={grids.current[layer]}
          version={version}
          levels={levels}
          valueLabel={words.layers[layer]}
          valueUnit={scoreOf(layer, sweep).unit}
          point={{ x: gains.axes.roll.d_us_per_dps2, y: Math.max(10, gains.derivativeLowPass_Hz) }}
          {...(front === null ? {} : { curves: [front] })}
          onPick={pick}
          height={340}
        />
      )}
    </section>
  );
}

/** Contours either side of the band; peak rates of the demo crafts lie between 5 and 8 deg/s, noise from 2 µs. */
const PLAIN_LEVELS = { activity: [5, 10, 40], excursion: [5.5, 6, 6.5, 7, 10] };

/** The layer is the trial's own score, so that unit and band are its own too. */
function scoreOf(layer: Layer, sweep: Sweep) {
  return trialByName(sweep.trial).scores[layer === 'excursion' ? 0 : 1];
}

function levelsOf(layer: Layer, sweep: Sweep) {
  const { name, band } = scoreOf(layer, sweep);
  const allowed = (sweep.bands[name] ?? band).most;
  const plain = PLAIN_LEVELS[layer].filter((at) => at !== allowed).map((at) => ({ at, label: String(at) }));
  if (allowed === undefined) return plain;
  return [...plain, { at: allowed, label: String(allowed), strong: true }].sort((a, b) => a.at - b.at);
}

/** The cells that no other betters in both layers, as a line over the map. */
function frontOf(
  sweep: Sweep,
  grids: { excursion: ReturnType<typeof createMapGrid>; activity: ReturnType<typeof createMapGrid> },
) {
  const indices = tradeOffFront(Array.from(grids.excursion.values), Array.from(grids.activity.values));
  if (indices.length < 2 || sweep.y === undefined) return null;
  const y = sweep.y;
  return {
    label: 'front',
    axis: 'accent' as const,
    x: Float64Array.from(indices, (i) => axisValue(sweep.x, i % CELLS)),
    y: Float64Array.from(indices, (i) => axisValue(y, Math.floor(i / CELLS))),
  };
}
