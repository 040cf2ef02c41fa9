/** The measured points with what was made of them. */
import { useMemo } from 'preact/hooks';
import type { StandResult } from '../../../measuring/stand.ts';
import type { StillResult } from '../../../measuring/still.ts';
import type { VibrationPeak } from '../../../measuring/vibration.ts';
import { LinePlot, type LinePlotProps, type PlotMarker } from '../../plots/LinePlot.tsx';
import type { BenchResult, SpinTrace } from './bench.worker.ts';
import { measureTexts } from './texts.ts';

const words = measureTexts.plots;
const HEIGHT = 210;
const FIT_POINTS = 80;
const AXES = ['roll', 'pitch', 'yaw'] as const;

export function BenchPlot(props: { result: BenchResult; traces: readonly SpinTrace[] }) {
  const { result, traces } = props;
  const plots = useMemo(() => plotsOf(result, traces), [result, traces]);
  return (
    <>
      {plots.map((plot) => (
        <LinePlot key={plot.label} {...plot} height={HEIGHT} />
      ))}
      {result.measurement === 'stand' && <Outliers stand={result} />}
    </>
  );
}

function Outliers(props: { stand: StandResult }) {
  const { outliers } = props.stand;
  if (outliers.length === 0) return <p class="small">{words.noOutliers}</p>;
  return (
    <>
      <p class="small">{words.leftOut(outliers.length)}</p>
      <ul class="small">
        {outliers.map((row) => (
          <li key={`${row.file} ${row.row}`}>{words.outlier(row.file, row.row, row.outlier ?? '')}</li>
        ))}
      </ul>
    </>
  );
}

function plotsOf(result: BenchResult, traces: readonly SpinTrace[]): LinePlotProps[] {
  if (result.measurement === 'stand') return standPlots(result);
  if (result.measurement === 'still') return stillPlots(result);
  return result.measurement === 'spinup' ? traces.map(spinPlot) : [];
}

function spinPlot(trace: SpinTrace): LinePlotProps {
  return {
    label: words.spinup(trace.file),
    x: trace.time_s,
    series: [
      { label: words.measured, axis: 'ink', values: trace.speed_rpm, dots: true },
      { label: words.fit, axis: 'accent', values: trace.fit_rpm, x: trace.fitTime_s },
    ],
    xLabel: words.time,
    xUnit: 's',
    yLabel: words.speed,
    yUnit: 'rev/min',
  };
}

function standPlots(stand: StandResult): LinePlotProps[] {
  const rows = stand.residuals
    .flatMap((row) => (row.thrust_N === null ? [] : [{ ...row, thrust_N: row.thrust_N }]))
    .sort((a, b) => a.speed_rpm - b.speed_rpm);
  if (rows.length < 2) return [];
  const used = rows.filter((row) => row.outlier === null);
  const out = rows.filter((row) => row.outlier !== null);
  const top = rows[rows.length - 1].speed_rpm;
  const speeds = Array.from({ length: FIT_POINTS }, (_, i) => (top * (i + 1)) / FIT_POINTS);
  const points = (some: typeof rows) => ({
    x: some.map((row) => row.speed_rpm),
    values: some.map((row) => row.thrust_N),
    dots: true,
  });
  return [
    {
      label: words.stand,
      x: speeds,
      series: [
        { label: words.used, axis: 'ink', ...points(used) },
        ...(out.length === 0 ? [] : [{ label: words.out, axis: 'accent' as const, ...points(out) }]),
        { label: words.fit, axis: 'faint', values: speeds.map((rpm) => fittedThrust_N(stand, rpm)) },
      ],
      xLabel: words.speed,
      xUnit: 'rev/min',
      yLabel: words.thrust,
      yUnit: 'N',
      // A word beside the point: colour alone would not tell it.
      markers: out.map((row) => ({ label: words.row(row.row), x: row.speed_rpm })),
    },
  ];
}

/** C_T ρ n² D⁴ with the coefficient of the table where there is one. */
function fittedThrust_N(stand: StandResult, rpm: number): number {
  const { diameter_m, thrustCoefficient, staticTable = [] } = stand.propeller;
  const ct = tableAt(staticTable, rpm) ?? thrustCoefficient;
  return ct * stand.air.density_kgpm3 * (rpm / 60) ** 2 * diameter_m ** 4;
}

function tableAt(
  table: readonly { readonly rpm: number; readonly ct: number }[],
  rpm: number,
): number | null {
  if (table.length === 0) return null;
  const above = table.findIndex((row) => row.rpm >= rpm);
  if (above === -1) return table[table.length - 1].ct;
  if (above === 0) return table[0].ct;
  const [low, high] = [table[above - 1], table[above]];
  return low.ct + ((high.ct - low.ct) * (rpm - low.rpm)) / (high.rpm - low.rpm);
}

function stillPlots(still: StillResult): LinePlotProps[] {
  const axes = AXES.flatMap((axis) => {
    const found = still.axes[axis];
    return found === undefined ? [] : [{ ...found, axis }];
  });
  if (axes.length === 0) return [];
  const [first] = axes;
  const plots: LinePlotProps[] = [
    {
      label: words.still,
      // From the second bin on: the first is 0 Hz and has no place on a logarithmic axis.
      x: first.spectrum.frequency_Hz.subarray(1),
      series: axes.map(({ axis, spectrum }) => ({
        label: axis,
        axis,
        // The spectrum is one of power, unit² per Hz.
        values: spectrum.density.subarray(1).map(Math.sqrt),
        x: spectrum.frequency_Hz.subarray(1),
      })),
      xLabel: words.frequency,
      xUnit: 'Hz',
      yLabel: words.density,
      yUnit: 'deg/s/√Hz',
      logX: true,
      logY: true,
      markers: orderMarkers(axes.flatMap(({ peaks }) => peaks)),
    },
  ];
  if (first.allan.tau_s.length > 1) {
    plots.push({
      label: words.allan,
      x: first.allan.tau_s,
      series: axes.map(({ axis, allan }) => ({ label: axis, axis, values: allan.deviation, x: allan.tau_s })),
      xLabel: words.averaging,
      xUnit: 's',
      yLabel: words.deviation,
      yUnit: 'deg/s',
      logX: true,
      logY: true,
    });
  }
  return plots;
}

/** One line an order, at the largest of the peaks that were matched to it. */
function orderMarkers(peaks: readonly VibrationPeak[]): PlotMarker[] {
  const strongest = new Map<number, (typeof peaks)[number]>();
  for (const peak of peaks) {
    if (peak.order === null) continue;
    const now = strongest.get(peak.order);
    if (now === undefined || peak.amplitude > now.amplitude) strongest.set(peak.order, peak);
  }
  return [...strongest].map(([order, { frequency_Hz }]) => ({ label: words.order(order), x: frequency_Hz }));
}
