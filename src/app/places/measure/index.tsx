/** Measure: bench measurements to a build, how well each is known always beside it; the build's own numbers. */
import { useEffect, useMemo, useRef, useState } from 'preact/hooks';
import { buildFromMeasurements } from '../../../measuring/buildFromMeasurements.ts';
import type { Quantified } from '../../../measuring/estimate.ts';
import { WORKSHEETS, type Worksheet } from '../../../measuring/worksheets.ts';
import { LinePlot, type PlotSeries } from '../../plots/LinePlot.tsx';
import { useStore } from '../../store/context.ts';
import { readable } from '../../store/units.ts';
import { Button } from '../../widgets/Button.tsx';
import { FileDrop } from '../../widgets/FileDrop.tsx';
import { NoticeBox } from '../../widgets/Notice.tsx';
import { NumberField } from '../../widgets/NumberField.tsx';
import { Tabs } from '../../widgets/Tabs.tsx';
import type { BenchKind, BenchResult, FromBenchWorker, ToBenchWorker } from './bench.worker.ts';
import { BuildFields } from './BuildFields.tsx';
import './measure.css';
import { SwingForm } from './SwingForm.tsx';
import { measureTexts as words } from './texts.ts';

type Sheet = BenchKind | 'numbers';
const SHEETS: readonly Sheet[] = ['numbers', 'swing', 'stand', 'spinup', 'still'];
const PAPER: Readonly<Record<Sheet, readonly Worksheet['id'][]>> = {
  numbers: ['balance', 'parts'],
  swing: ['swing-bifilar', 'swing-compound'],
  stand: ['stand'],
  spinup: ['spinup'],
  still: ['still-rest', 'still-idle'],
};

export default function Measure() {
  const [sheet, setSheet] = useState<Sheet>('numbers');
  return (
    <div class="measure">
      <Tabs
        label={words.sheets}
        value={sheet}
        tabs={SHEETS.map((value) => ({ value, label: words.tabs[value] }))}
        onChange={setSheet}
      >
        <Cautions sheet={sheet} />
        {sheet === 'numbers' ? <BuildFields /> : <Bench key={sheet} kind={sheet} />}
        <Papers sheet={sheet} />
      </Tabs>
    </div>
  );
}

/** What can hurt in this measurement, before anything else. */
function Cautions(props: { sheet: Sheet }) {
  const papers = WORKSHEETS.filter((one) => PAPER[props.sheet].includes(one.id));
  const cautions = [...new Set(papers.flatMap((one) => one.cautions))];
  return (
    <ul class="measure-cautions" aria-label={words.cautions}>
      {cautions.map((one) => (
        <li key={one}>{one}</li>
      ))}
    </ul>
  );
}

function Bench(props: { kind: BenchKind }) {
  const { kind } = props;
  const store = useStore();
  const build = store.build.value;
  const [result, setResult] = useState<BenchResult | null>(null);
  const [refused, setRefused] = useState<string | null>(null);
  const [busy, setBusy] = useState(false);
  const [diameter, setDiameter] = useState(build.propeller.diameter_m);
  const worker = useRef<Worker | null>(null);
  useEffect(() => () => worker.current?.terminate(), []);
  const analyse = (files: ToBenchWorker['files']): void => {
    worker.current?.terminate();
    const one = new Worker(new URL('./bench.worker.ts', import.meta.url), { type: 'module' });
    worker.current = one;
    const job = store.jobs.start(words.tabs[kind], () => one.terminate());
    setBusy(true);
    setRefused(null);
    const end = (): void => {
      job.end();
      setBusy(false);
      one.terminate();
    };
    one.onmessage = ({ data }: MessageEvent<FromBenchWorker>) => {
      end();
      if (data.kind === 'done') setResult(data.result);
      else {
        const first = data.problems[0];
        setRefused(
          `${data.file}: ${first?.path ?? ''} ${first?.value ?? ''}. ${words.allowed}: ${first?.allowed ?? ''}`,
        );
      }
    };
    one.onerror = (event) => {
      end();
      setRefused(event.message);
    };
    one.postMessage({
      kind,
      files,
      diameter_m: diameter,
      elevation_m: store.scene.value.elevation_m,
    } satisfies ToBenchWorker);
  };
  const take = async (files: readonly File[]): Promise<void> => {
    const texts = await Promise.all(
      files.map(async (file) => ({ name: file.name, text: await file.text() })),
    );
    analyse(texts);
  };
  const accept = (): void => {
    if (result === null) return;
    store.attempt({}, () => {
      const { build: measured } = buildFromMeasurements(store.build.value, [result], words.tabs[kind]);
      store.setBuild(measured, words.tabs[kind]);
    });
  };
  return (
    <div class="measure-bench">
      <section>
        <p>{words.what[kind]}</p>
        {kind === 'stand' && (
          <NumberField
            label={words.diameter}
            value={diameter}
            unit="m"
            min={0.02}
            max={5}
            noSlider
            onChange={setDiameter}
          />
        )}
        {kind === 'swing' && <SwingForm onSwing={(text) => analyse([{ name: words.typed, text }])} />}
        <FileDrop
          label={words.drop[kind]}
          accept=".csv,.txt,.json"
          multiple
          onFiles={(files) => void take(files)}
        />
        {busy && <p role="status">{words.busy}</p>}
        {refused !== null && <NoticeBox kind="error">{refused}</NoticeBox>}
      </section>
      <section aria-label={words.found}>
        {result === null ? (
          <p class="faint">{words.nothing}</p>
        ) : (
          <>
            <Quantities result={result} />
            <BenchPlot result={result} />
            <Notes result={result} />
            <Button primary onClick={accept}>
              {words.accept}
            </Button>
          </>
        )}
      </section>
    </div>
  );
}

function Quantities(props: { result: BenchResult }) {
  const rows = Object.entries(props.result.quantities) as [string, Quantified | undefined][];
  return (
    <table class="measure-found">
      <thead>
        <tr>
          <th>{words.quantity}</th>
          <th>{words.value}</th>
          <th>{words.known}</th>
          <th>{words.means}</th>
        </tr>
      </thead>
      <tbody>
        {rows.map(([name, one]) =>
          one === undefined ? null : (
            <tr key={name}>
              <th scope="row">{spoken(name)}</th>
              <td>
                <b>{readable(one.value)}</b> <span class="unit">{one.unit === '1' ? '' : one.unit}</span>
              </td>
              <td>
                ± {readable(1.96 * one.sigma)}
                {one.relative_pct === undefined ? '' : ` (${readable(1.96 * one.relative_pct)} %)`}
              </td>
              <td class="small">{one.meaning}</td>
            </tr>
          ),
        )}
      </tbody>
    </table>
  );
}

/** "thrustCoefficient", "inertia_xx_kgm2" as words; the unit stands beside the value. */
function spoken(name: string): string {
  return name
    .replace(/_(kgm2|s|ohm|dps|Hz|A|V|W|rpm_per_V|dps_per_rtHz|g_per_W)$/, '')
    .replace(/_/g, ' ')
    .replace(/([a-z])([A-Z])/g, (_all, a: string, b: string) => `${a} ${b.toLowerCase()}`);
}

function Notes(props: { result: BenchResult }) {
  if (props.result.notes.length === 0) return null;
  return (
    <ul class="small">
      {props.result.notes.map((note) => (
        <li key={note}>{note}</li>
      ))}
    </ul>
  );
}

/** The measured points with what was made of them, where a plot says more than numbers. */
function BenchPlot(props: { result: BenchResult }) {
  const { result } = props;
  const drawn = useMemo(() => plotOf(result), [result]);
  if (drawn === null) return null;
  return <LinePlot {...drawn} height={190} />;
}

function plotOf(result: BenchResult) {
  if (result.measurement === 'stand') {
    const table = result.propeller.staticTable ?? [];
    if (table.length < 2) return null;
    const series: PlotSeries[] = [{ label: 'C_T', axis: 'roll', values: table.map((row) => row.ct) }];
    return {
      label: words.plots.stand,
      x: table.map((row) => row.rpm),
      series,
      xLabel: '',
      xUnit: 'rev/min',
      yLabel: 'C_T',
      yUnit: '',
    };
  }
  if (result.measurement === 'still') {
    const axes = ['roll', 'pitch', 'yaw'] as const;
    const found = axes.flatMap((axis) => {
      const spectrum = result.axes[axis]?.spectrum;
      return spectrum === undefined ? [] : [{ axis, spectrum }];
    });
    if (found.length === 0) return null;
    return {
      label: words.plots.still,
      x: found[0].spectrum.frequency_Hz,
      series: found.map(({ axis, spectrum }): PlotSeries => ({
        label: axis,
        axis,
        values: spectrum.density,
        x: spectrum.frequency_Hz,
      })),
      xLabel: '',
      xUnit: 'Hz',
      yLabel: words.plots.still,
      yUnit: 'deg/s/√Hz',
      logX: true,
      logY: true,
    };
  }
  return null;
}

function Papers(props: { sheet: Sheet }) {
  const papers = WORKSHEETS.filter((one) => PAPER[props.sheet].includes(one.id));
  return (
    <div class="measure-papers">
      {papers.map((paper) => (
        <details key={paper.id}>
          <summary>
            {words.worksheet}: {paper.title}
          </summary>
          <p>{paper.purpose}</p>
          <ol>
            {paper.steps.map((step) => (
              <li key={step}>{step}</li>
            ))}
          </ol>
          <Button onClick={() => print(paper)}>{words.print}</Button>
        </details>
      ))}
    </div>
  );
}

/** Prints one worksheet from a frame of its own, so that the page stays as it is. */
function print(paper: Worksheet): void {
  const frame = document.createElement('iframe');
  frame.style.display = 'none';
  frame.srcdoc = paperHtml(paper);
  frame.onload = () => {
    frame.contentWindow?.print();
    setTimeout(() => frame.remove(), 60_000);
  };
  document.body.append(frame);
}

function paperHtml(paper: Worksheet): string {
  const list = (tag: 'ol' | 'ul', items: readonly string[]) =>
    `<${tag}>${items.map((item) => `<li>${item}</li>`).join('')}</${tag}>`;
  const fields = paper.fields
    .map(
      (field) =>
        `<tr><td>${field.label}, ${field.unit}</td>${'<td class="box"></td>'.repeat(field.repeats)}</tr>`,
    )
    .join('');
  return `<!doctype html><meta charset="utf-8"><title>${paper.title}</title><style>body{font:12px/1.45 system-ui,sans-serif;margin:15mm}td{border-bottom:1px solid #999;padding:4px 8px}.box{min-width:60px;border:1px solid #000}.c{border:2px solid #000;padding:4px 8px}</style><h1>${paper.title}</h1><p>${paper.purpose}</p><div class="c">${list('ul', paper.cautions)}</div><h2>${words.tools}</h2>${list('ul', paper.tools)}<h2>${words.steps}</h2>${list('ol', paper.steps)}<table>${fields}</table><p>${paper.result}</p>`;
}
