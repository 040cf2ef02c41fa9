/** Shape: the frequency response behind the gains, A over B, with the map, starting gains and firmware units. */
import { signal, type Signal } from '@preact/signals';
import { useMemo, useState } from 'preact/hooks';
import { AXES, type AxisName, type Gains } from '../../../craft/gains.ts';
import type { Build } from '../../../craft/build.ts';
import { axisModels, type AxisModel, type TrimChoice } from '../../../shaping/axisModel.ts';
import type { AxisAnalysis } from '../../../shaping/analysis.ts';
import type { LoopCurves } from '../../../shaping/curves.ts';
import { loopView } from '../../../shaping/loopView.ts';
import { LEAST_COHERENCE, type SweepCheck, type SweepOptions } from '../../../shaping/sweepCheck.ts';
import { LinePlot, type PlotSeries } from '../../plots/LinePlot.tsx';
import { XyPlot } from '../../plots/XyPlot.tsx';
import { useStore } from '../../store/context.ts';
import { readable } from '../../store/units.ts';
import { Button } from '../../widgets/Button.tsx';
import { NoticeBox } from '../../widgets/Notice.tsx';
import { Select } from '../../widgets/Select.tsx';
import { Tabs } from '../../widgets/Tabs.tsx';
import './shape.css';
import { FirmwareUnits } from './FirmwareUnits.tsx';
import { useFlightCheck, type FlightCheck } from './flightCheck.ts';
import { GainFields } from './GainFields.tsx';
import { GainMap } from './GainMap.tsx';
import { Measures } from './Measures.tsx';
import { StartingGains } from './StartingGains.tsx';
import { shapeTexts as words } from './texts.ts';
import { Walk } from './Walk.tsx';

const TRIMS = {
  hover: {},
  forward: { forward_mps: 8 },
  climb: { climb_mps: 3 },
  low: { charge: 0.15 },
  released: { payloadReleased: true },
} as const satisfies Record<string, TrimChoice>;
type TrimName = keyof typeof TRIMS;

/** The check by simulation flies a hover; null: it cannot fly that trim. */
const FLOWN: Readonly<Record<TrimName, SweepOptions | null>> = {
  hover: {},
  forward: null,
  climb: null,
  low: { charge: TRIMS.low.charge },
  released: { payloadReleased: true },
};

type Models =
  | { readonly kind: 'ready'; readonly models: Record<AxisName, AxisModel> }
  | { readonly kind: 'none'; readonly reason: string };

function modelsOf(build: Build, trim: TrimChoice, elevation_m: number): Models {
  try {
    return { kind: 'ready', models: axisModels(build, { ...trim, elevation_m }) };
  } catch (error) {
    if (error instanceof RangeError) return { kind: 'none', reason: error.message };
    throw error;
  }
}

export default function Shape() {
  const store = useStore();
  const [axis, setAxis] = useState<AxisName>('roll');
  const [trim, setTrim] = useState<TrimName>('hover');
  const build = store.build.value;
  const elevation_m = store.scene.value.elevation_m;
  const models = useMemo(() => modelsOf(build, TRIMS[trim], elevation_m), [build, trim, elevation_m]);
  const gains = store.gains.value;
  const other = store.side.value === 'A' ? store.gainsB.value : store.gainsA.value;
  const trims = (Object.keys(TRIMS) as TrimName[]).filter(
    (name) => name !== 'released' || build.payload !== undefined,
  );
  return (
    <div class="shape">
      <section class="shape-side" aria-label={words.gains}>
        <Tabs
          label={words.axis}
          value={axis}
          tabs={AXES.map((value) => ({ value, label: value }))}
          onChange={setAxis}
        >
          <GainFields axis={axis} />
        </Tabs>
        <Select
          label={words.at}
          value={trim}
          options={trims.map((value) => ({ value, label: words.trims[value] }))}
          onChange={setTrim}
        />
        {models.kind === 'none' ? (
          <NoticeBox kind="error">
            {words.cannotTrim}: {models.reason}
          </NoticeBox>
        ) : (
          <>
            <PlantLine model={models.models[axis]} />
            <StartingGains trim={TRIMS[trim]} axis={axis} plant={models.models[axis].plant} />
          </>
        )}
        <FirmwareUnits axis={axis} />
      </section>
      {models.kind === 'ready' && (
        <Plots
          models={models.models}
          build={build}
          axis={axis}
          gains={gains}
          other={other}
          trim={TRIMS[trim]}
          flown={FLOWN[trim]}
        />
      )}
    </div>
  );
}

function PlantLine(props: { model: AxisModel }) {
  const { plant, fitError_dB, fitError_deg } = props.model;
  return (
    <p class="small faint">
      {words.fit(
        readable(plant.gain_dps2_per_us),
        readable(plant.lag_s * 1000),
        readable(plant.delay_s * 1000),
      )}
      , {words.fitError(readable(fitError_dB), readable(fitError_deg))}
    </p>
  );
}

interface PlotsProps {
  readonly models: Record<AxisName, AxisModel>;
  readonly build: Build;
  readonly axis: AxisName;
  readonly gains: Gains;
  readonly other: Gains | null;
  readonly trim: TrimChoice;
  readonly flown: SweepOptions | null;
}

function Plots(props: PlotsProps) {
  const { models, build, axis, gains, other } = props;
  const flown = useFlightCheck(build, gains, axis, props.flown);
  const a = useMemo(() => loopView(models[axis], build, gains, axis), [models, build, gains, axis]);
  const b = useMemo(
    () => (other === null ? null : loopView(models[axis], build, other, axis)),
    [models, build, other, axis],
  );
  const cursor = useMemo(() => signal<number | null>(null), []);
  const series = (pick: (curves: LoopCurves) => Float64Array): PlotSeries[] => [
    { label: 'A', axis, values: pick(a.curves), side: 'A' },
    ...(b === null
      ? []
      : [{ label: 'B', axis: 'ink' as const, values: pick(b.curves), x: b.curves.f_Hz, side: 'B' as const }]),
  ];
  const gainSeries = useMemo(
    () => [...series((c) => c.gain_dB), ...measured(flown.check, (check) => check.measured_dB)],
    [a, b, axis, flown.check],
  );
  const phaseSeries = useMemo(
    () => [...series((c) => c.phase_deg), ...measured(flown.check, (check) => check.measured_deg)],
    [a, b, axis, flown.check],
  );
  const sensitivitySeries = useMemo(() => series((c) => c.sensitivity_dB), [a, b, axis]);
  const noiseSeries = useMemo(() => series((c) => c.noise_us_per_rtHz), [a, b, axis]);
  const range = useMemo(() => rangeOf(a.curves, b?.curves ?? null), [a, b]);
  const crossover = a.analysis.margins.crossover_Hz;
  const markers = useMemo(
    () => [
      { label: '0 dB', y: 0 },
      ...(crossover === null ? [] : [{ label: words.table.crossover, x: crossover }]),
    ],
    [crossover],
  );
  const phaseMarkers = useMemo(
    () => [{ label: '−180°', y: -180 }, ...(crossover === null ? [] : [{ label: '', x: crossover }])],
    [crossover],
  );
  return (
    <div class="shape-plots">
      <p class={a.analysis.stable ? 'shape-say' : 'shape-say bad'} role="status">
        <strong>{axis}</strong>: {a.analysis.statement}
      </p>
      <MarginTable a={a.analysis} b={b?.analysis ?? null} />
      <FlownRow flown={flown} can={props.flown !== null} />
      <div class="shape-grid">
        <LinePlot
          label={words.bodeGain}
          x={a.curves.f_Hz}
          series={gainSeries}
          xLabel={words.frequency}
          xUnit="Hz"
          yLabel={words.bodeGain}
          yUnit="dB"
          logX
          xRange={range}
          markers={markers}
          cursor={cursor}
          height={170}
        />
        <NyquistPlot a={a.curves} b={b?.curves ?? null} axis={axis} />
        <LinePlot
          label={words.bodePhase}
          x={a.curves.f_Hz}
          series={phaseSeries}
          xLabel={words.frequency}
          xUnit="Hz"
          yLabel={words.bodePhase}
          yUnit="deg"
          logX
          xRange={range}
          markers={phaseMarkers}
          cursor={cursor}
          height={170}
        />
        <StepPlot a={a.curves} b={b?.curves ?? null} axis={axis} />
        <LinePlot
          label={words.sensitivity}
          x={a.curves.f_Hz}
          series={sensitivitySeries}
          xLabel={words.frequency}
          xUnit="Hz"
          yLabel={words.sensitivity}
          yUnit="dB"
          logX
          xRange={range}
          cursor={cursor}
          height={150}
        />
        <LinePlot
          label={words.noise}
          x={a.curves.f_Hz}
          series={noiseSeries}
          xLabel={words.frequency}
          xUnit="Hz"
          yLabel={words.noise}
          yUnit="µs/√Hz"
          logX
          xRange={range}
          cursor={cursor}
          height={150}
        />
        <RootPlot a={a.curves} b={b?.curves ?? null} />
        <GainMap build={build} gains={gains} other={other} axis={axis} trim={props.trim} />
        {flown.check !== null && <CoherencePlot check={flown.check} range={range} cursor={cursor} />}
        <Measures build={build} gains={gains} other={other} axis={axis} trim={props.trim} />
      </div>
      <Walk axis={axis} />
    </div>
  );
}

/** Up to half the faster loop's rate: beyond it there is nothing to draw. */
function rangeOf(a: LoopCurves, b: LoopCurves | null): readonly [number, number] {
  const last = (curves: LoopCurves) => curves.f_Hz[curves.f_Hz.length - 1];
  return [a.f_Hz[0], Math.max(last(a), b === null ? 0 : last(b))];
}

/** What the flight measured, over the computed lines. */
function measured(check: SweepCheck | null, pick: (check: SweepCheck) => Float64Array): PlotSeries[] {
  if (check === null) return [];
  return [{ label: words.flown.label, axis: 'accent', values: pick(check), x: check.f_Hz, dots: true }];
}

function FlownRow(props: { flown: FlightCheck; can: boolean }) {
  const { flown, can } = props;
  return (
    <div class="row shape-flown">
      <Button disabled={flown.busy || !can} title={words.flown.hint} onClick={flown.run}>
        {words.flown.run}
      </Button>
      <span role="status">
        {!can ? words.flown.only : flown.busy ? `${words.flown.job} …` : (flown.check?.statement ?? '')}
      </span>
    </div>
  );
}

const COHERENCE_MARKS = [{ label: String(LEAST_COHERENCE), y: LEAST_COHERENCE }];

function CoherencePlot(props: {
  check: SweepCheck;
  range: readonly [number, number];
  cursor: Signal<number | null>;
}) {
  const { check } = props;
  const series = useMemo(
    (): PlotSeries[] => [
      { label: words.flown.coherenceShort, axis: 'accent', values: check.coherence, dots: true },
    ],
    [check],
  );
  return (
    <div class="shape-full">
      <LinePlot
        label={words.flown.coherence}
        x={check.f_Hz}
        series={series}
        xLabel={words.frequency}
        xUnit="Hz"
        yLabel={words.flown.coherenceShort}
        yUnit=""
        logX
        xRange={props.range}
        yRange={[0, 1]}
        markers={COHERENCE_MARKS}
        cursor={props.cursor}
        height={130}
      />
    </div>
  );
}

const NYQUIST_RANGE = {
  x: { low: -2.5, high: 1, label: 'Re', unit: '' },
  y: { low: -2, high: 1, label: 'Im', unit: '' },
};

function NyquistPlot(props: { a: LoopCurves; b: LoopCurves | null; axis: AxisName }) {
  const { a, b, axis } = props;
  const curves = useMemo(
    () => [
      { label: 'A', axis, x: a.nyquistRe, y: a.nyquistIm, side: 'A' as const },
      ...(b === null
        ? []
        : [{ label: 'B', axis: 'ink' as const, x: b.nyquistRe, y: b.nyquistIm, side: 'B' as const }]),
    ],
    [a, b, axis],
  );
  // Inside this circle about −1 the sensitivity is above 1.6.
  const circles = useMemo(() => [{ x: -1, y: 0, radius: 1 / 1.6, label: 'Ms 1.6' }], []);
  const points = useMemo(() => [{ x: -1, y: 0, label: '−1', axis: 'accent' as const }], []);
  return (
    <XyPlot
      label={words.nyquist}
      curves={curves}
      x={NYQUIST_RANGE.x}
      y={NYQUIST_RANGE.y}
      equalScales
      circles={circles}
      points={points}
      describe={(curve, index) => `${readable((curve === 0 || b === null ? a : b).f_Hz[index])} Hz`}
      height={190}
    />
  );
}

function StepPlot(props: { a: LoopCurves; b: LoopCurves | null; axis: AxisName }) {
  const { a, b, axis } = props;
  const shown = useMemo(() => {
    const step = a.step ?? b?.step ?? null;
    if (step === null) return null;
    const series: PlotSeries[] = [];
    if (a.step !== null) series.push({ label: 'A', axis, values: a.step.y, x: a.step.t_s, side: 'A' });
    if (b?.step != null) series.push({ label: 'B', axis: 'ink', values: b.step.y, x: b.step.t_s, side: 'B' });
    return { x: step.t_s, series };
  }, [a, b, axis]);
  const markers = useMemo(() => [{ label: '1', y: 1 }], []);
  if (shown === null) return <p class="faint">{words.unstable}</p>;
  return (
    <LinePlot
      label={words.step}
      x={shown.x}
      series={shown.series}
      xLabel={words.time}
      xUnit="s"
      yLabel={words.rate}
      yUnit=""
      markers={markers}
      xRange={[0, Math.min(0.8, shown.x[shown.x.length - 1])]}
      height={170}
    />
  );
}

const UNIT_CIRCLE = [{ x: 0, y: 0, radius: 1, label: '|z| = 1' }];

function RootPlot(props: { a: LoopCurves; b: LoopCurves | null }) {
  const points = useMemo(
    () => [
      ...props.a.poles.map((pole) => ({ x: pole.re, y: pole.im, label: '', axis: 'accent' as const })),
      ...(props.b?.poles ?? []).map((pole) => ({
        x: pole.re,
        y: pole.im,
        label: '',
        axis: 'faint' as const,
      })),
    ],
    [props.a, props.b],
  );
  return (
    <XyPlot
      label={words.roots}
      curves={[]}
      x={{ low: -1.3, high: 1.3, label: words.roots, unit: '' }}
      y={{ low: -1.3, high: 1.3, label: '', unit: '' }}
      equalScales
      circles={UNIT_CIRCLE}
      points={points}
      height={230}
    />
  );
}

function MarginTable(props: { a: AxisAnalysis; b: AxisAnalysis | null }) {
  const rows: [string, string, (x: AxisAnalysis) => number | null][] = [
    [words.table.gainMargin, 'dB', (x) => x.margins.gainMargin_dB],
    [words.table.phaseMargin, 'deg', (x) => x.margins.phaseMargin_deg],
    [words.table.delayMargin, 'ms', (x) => (x.stable ? x.margins.delayMargin_ms : null)],
    [words.table.crossover, 'Hz', (x) => x.margins.crossover_Hz],
    [words.table.ms, '', (x) => x.margins.maxSensitivity],
    [words.table.rise, 'ms', (x) => (x.step.rise_s === null ? null : x.step.rise_s * 1000)],
    [words.table.overshoot, '%', (x) => x.step.overshoot_pct],
    [words.table.settle, 'ms', (x) => (x.step.settle_s === null ? null : x.step.settle_s * 1000)],
    [words.table.noise, 'µs rms', (x) => x.noiseAtMotor_us_rms],
  ];
  const shown = (value: number | null) =>
    value === null || !Number.isFinite(value) ? '—' : String(Number(value.toPrecision(3)));
  return (
    <dl class="shape-margins" aria-label={words.table.label}>
      {rows.map(([name, unit, pick]) => (
        <div key={name}>
          <dt>{name}</dt>
          <dd>
            <b>{shown(pick(props.a))}</b> <span class="unit">{unit}</span>
            {props.b !== null && <span class="faint"> B {shown(pick(props.b))}</span>}
          </dd>
        </div>
      ))}
    </dl>
  );
}
