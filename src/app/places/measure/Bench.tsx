/** Files of one bench: worked out beside the page, their columns shown and corrected, the result drawn. */
import { useEffect, useRef, useState } from 'preact/hooks';
import { describeProblem } from '../../../craft/problem.ts';
import type { ColumnMapping } from '../../../measuring/columns.ts';
import { useStore } from '../../store/context.ts';
import { FileDrop } from '../../widgets/FileDrop.tsx';
import { NoticeBox } from '../../widgets/Notice.tsx';
import { NumberField } from '../../widgets/NumberField.tsx';
import type { BenchKind } from './kinds.ts';
import type { FromBenchWorker, Looked, ToBenchWorker } from './bench.worker.ts';
import { BenchPlot } from './BenchPlot.tsx';
import { rememberedShapes, rememberShape, shapeOf } from './columnMemory.ts';
import { ColumnsTable } from './ColumnsTable.tsx';
import { Found, rowsOf } from './Found.tsx';
import { refusedFiles } from './limits.ts';
import { SwingForm } from './SwingForm.tsx';
import { measureTexts as words } from './texts.ts';

type Done = Extract<FromBenchWorker, { kind: 'done' }>;

/** A file whose columns can be corrected; `run` counts, so that a new answer starts the table anew. */
interface Opened {
  readonly files: readonly File[];
  readonly looked: Looked;
  readonly run: number;
}

const DEFAULT_POLES = 14;

export function Bench(props: { kind: BenchKind }) {
  const { kind } = props;
  const bench = useBench(kind);
  const { done, opened } = bench;
  return (
    <div class="measure-bench">
      <section>
        <p>{words.what[kind]}</p>
        {kind === 'stand' && (
          <NumberField
            label={words.diameter}
            value={bench.diameter}
            unit="m"
            min={0.02}
            max={5}
            noSlider
            onChange={bench.setDiameter}
          />
        )}
        {opened?.looked.mapping.electricalSpeed !== undefined && (
          <NumberField
            label={words.poles}
            value={bench.poles}
            min={2}
            max={100}
            step={2}
            noSlider
            onChange={bench.setPoles}
          />
        )}
        {kind === 'swing' && (
          <SwingForm onSwing={(text) => bench.take([new File([text], words.typed)], null)} />
        )}
        <FileDrop
          label={words.drop[kind]}
          accept=".csv,.txt,.json"
          multiple
          onFiles={(files) => bench.take(files, null)}
        />
        {bench.busy && <p role="status">{words.busy}</p>}
        {bench.refused !== null && <NoticeBox kind="error">{bench.refused}</NoticeBox>}
        {kind !== 'swing' && opened !== null && (
          <ColumnsTable
            key={opened.run}
            kind={kind}
            looked={opened.looked}
            onRun={(mapping) => bench.take(opened.files, mapping)}
          />
        )}
      </section>
      <section aria-label={words.found}>
        {done === null ? (
          <p class="faint">{words.nothing}</p>
        ) : (
          <Found result={done.result} rows={rowsOf(done.result.quantities)} label={words.tabs[kind]}>
            <BenchPlot result={done.result} traces={done.traces} />
          </Found>
        )}
      </section>
    </div>
  );
}

/** One bench's worker and what came of it; a refused file leaves the last result in place. */
function useBench(kind: BenchKind) {
  const store = useStore();
  const [done, setDone] = useState<Done | null>(null);
  const [opened, setOpened] = useState<Opened | null>(null);
  const [refused, setRefused] = useState<string | null>(null);
  const [busy, setBusy] = useState(false);
  const [diameter, setDiameter] = useState(store.build.value.propeller.diameter_m);
  const [poles, setPoles] = useState(DEFAULT_POLES);
  const stop = useRef<(() => void) | null>(null);
  const runs = useRef(0);
  useEffect(() => () => stop.current?.(), []);

  const hear = (files: readonly File[], data: FromBenchWorker): void => {
    const { looked } = data;
    runs.current++;
    setOpened(looked === null ? null : { files, looked, run: runs.current });
    if (data.kind === 'refused') {
      setRefused(describeProblem(data.file, data.problems[0]));
      return;
    }
    setDone(data);
    if (looked?.from === 'user')
      rememberShape(store, { shape: shapeOf(kind, looked.heads), mapping: looked.mapping });
  };

  const take = (files: readonly File[], mapping: ColumnMapping | null): void => {
    stop.current?.();
    const problem = refusedFiles(kind, files);
    setRefused(problem);
    if (problem !== null) return;
    const worker = new Worker(new URL('./bench.worker.ts', import.meta.url), { type: 'module' });
    const job = store.jobs.start(words.tabs[kind], () => stop.current?.());
    stop.current = () => {
      stop.current = null;
      worker.terminate();
      job.end();
      setBusy(false);
    };
    setBusy(true);
    worker.onmessage = ({ data }: MessageEvent<FromBenchWorker>) => {
      stop.current?.();
      hear(files, data);
    };
    worker.onerror = (event) => {
      stop.current?.();
      setRefused(event.message);
    };
    const elevation_m = store.scene.value.elevation_m;
    const remembered = rememberedShapes(store);
    const task: ToBenchWorker = {
      kind,
      files,
      mapping,
      remembered,
      diameter_m: diameter,
      elevation_m,
      poles,
    };
    worker.postMessage(task);
  };
  return { done, opened, refused, busy, diameter, setDiameter, poles, setPoles, take };
}
