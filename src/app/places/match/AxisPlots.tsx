import { useMemo } from 'preact/hooks';
import type { AxisName } from '../../../craft/gains.ts';
import { TRUSTED_COHERENCE } from '../../../matching/spectra.ts';
import { LinePlot, type PlotMarker, type PlotSeries } from '../../plots/LinePlot.tsx';
import type { ShownAxis } from './messages.ts';
import { OverAndLeft } from './OverAndLeft.tsx';
import { matchTexts as words } from './texts.ts';

const COHERENCE_MARKS: readonly PlotMarker[] = [{ label: words.trusted, y: TRUSTED_COHERENCE }];

/** Pictures of one axis: the log with the pieces used, the held-back piece, the response, what is left over. */
export function AxisPlots(props: { axis: AxisName; shown: ShownAxis }) {
  const { axis, shown } = props;
  if (shown.overview === null) return <p class="faint">{words.nothingToShow}</p>;
  return (
    <>
      <Overview axis={axis} overview={shown.overview} />
      {shown.check !== null && <Check axis={axis} check={shown.check} />}
      <div class="match-pair">
        {shown.response !== null && <Response axis={axis} response={shown.response} />}
        {shown.left !== null && <Left axis={axis} left={shown.left} />}
      </div>
    </>
  );
}

function Overview(props: { axis: AxisName; overview: NonNullable<ShownAxis['overview']> }) {
  const { axis, overview } = props;
  const series = useMemo(
    (): PlotSeries[] => [
      ...(overview.setpoint_dps === null
        ? []
        : [{ label: words.setpoint, axis: 'faint' as const, values: overview.setpoint_dps }]),
      { label: words.rate, axis, values: overview.rate_dps },
    ],
    [axis, overview],
  );
  return (
    <LinePlot
      label={words.overview(axis)}
      x={overview.t_s}
      series={series}
      xLabel={words.time}
      xUnit="s"
      yLabel={words.rate}
      yUnit="deg/s"
      spans={overview.spans}
      height={150}
    />
  );
}

function Check(props: { axis: AxisName; check: NonNullable<ShownAxis['check']> }) {
  const { axis, check } = props;
  const over = useMemo(
    (): PlotSeries[] => [
      { label: words.log, axis: 'ink', values: check.measured_dps },
      { label: words.model, axis, values: check.simulated_dps },
    ],
    [axis, check],
  );
  const left = useMemo(
    (): PlotSeries[] => [{ label: words.difference, axis: 'ink', values: check.residual_dps }],
    [check],
  );
  return (
    <OverAndLeft
      t_s={check.t_s}
      over={{ label: words.check(axis), series: over, height: 170 }}
      left={{ label: words.residual(axis), series: left, height: 100 }}
    />
  );
}

function Response(props: { axis: AxisName; response: NonNullable<ShownAxis['response']> }) {
  const { axis, response } = props;
  const { measured, fitted, build } = response;
  const curves = (pick: (of: typeof measured) => Float64Array): PlotSeries[] => [
    { label: words.build, axis: 'faint', values: pick(build), x: build.f_Hz, side: 'B' },
    ...(fitted === null
      ? []
      : [{ label: words.model, axis: 'ink' as const, values: pick(fitted), x: fitted.f_Hz }]),
    { label: words.log, axis, values: pick(measured) },
  ];
  const range = [measured.f_Hz[0], measured.f_Hz[measured.f_Hz.length - 1]] as const;
  const gain = useMemo(() => curves((of) => of.gain_dB), [axis, response]);
  const phase = useMemo(() => curves((of) => of.phase_deg), [axis, response]);
  const coherence = useMemo(
    (): PlotSeries[] => [{ label: words.coherence, axis, values: response.coherence }],
    [axis, response],
  );
  return (
    <>
      <LinePlot
        label={words.responseGain(axis)}
        x={measured.f_Hz}
        series={gain}
        xLabel={words.frequency}
        xUnit="Hz"
        yLabel={words.magnitude}
        yUnit="dB"
        logX
        xRange={range}
        height={150}
      />
      <LinePlot
        label={words.responsePhase}
        x={measured.f_Hz}
        series={phase}
        xLabel={words.frequency}
        xUnit="Hz"
        yLabel={words.responsePhase}
        yUnit="°"
        logX
        xRange={range}
        height={150}
      />
      <LinePlot
        label={words.coherence}
        x={measured.f_Hz}
        series={coherence}
        xLabel={words.frequency}
        xUnit="Hz"
        yLabel={words.coherence}
        yUnit=""
        logX
        xRange={range}
        yRange={[0, 1]}
        markers={COHERENCE_MARKS}
        height={150}
      />
    </>
  );
}

function Left(props: { axis: AxisName; left: NonNullable<ShownAxis['left']> }) {
  const { axis, left } = props;
  const series = useMemo(
    (): PlotSeries[] => [{ label: words.leftLabel, axis, values: left.density }],
    [axis, left],
  );
  const markers = useMemo((): PlotMarker[] => left.lines.map(({ f_Hz }) => ({ x: f_Hz, label: '' })), [left]);
  return (
    <div>
      <LinePlot
        label={words.leftSpectrum}
        x={left.f_Hz}
        series={series}
        xLabel={words.frequency}
        xUnit="Hz"
        yLabel={words.density}
        yUnit="deg/s/√Hz"
        logX
        logY
        xRange={[left.f_Hz[0], left.f_Hz[left.f_Hz.length - 1]]}
        markers={markers}
        height={150}
      />
      {left.lines.length > 0 && (
        <p class="small">
          {words.lines(left.lines.map(({ f_Hz, label }) => `${f_Hz.toFixed(0)} Hz ${label}`).join(', '))}
        </p>
      )}
    </div>
  );
}
