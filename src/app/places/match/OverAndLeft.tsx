import { signal } from '@preact/signals';
import { useMemo } from 'preact/hooks';
import { LinePlot, type PlotMarker, type PlotSeries } from '../../plots/LinePlot.tsx';
import { matchTexts as words } from './texts.ts';

const ZERO: readonly PlotMarker[] = [{ label: '', y: 0 }];

/** Rates of the log and of a model over time, and what is left between them, under one cursor. */
export function OverAndLeft(props: {
  readonly t_s: Float64Array;
  readonly over: { readonly label: string; readonly series: readonly PlotSeries[]; readonly height: number };
  readonly left: { readonly label: string; readonly series: readonly PlotSeries[]; readonly height: number };
}) {
  const { t_s, over, left } = props;
  const cursor = useMemo(() => signal<number | null>(null), []);
  return (
    <>
      <LinePlot
        {...over}
        x={t_s}
        xLabel={words.time}
        xUnit="s"
        yLabel={words.rate}
        yUnit="deg/s"
        cursor={cursor}
      />
      <LinePlot
        {...left}
        x={t_s}
        xLabel={words.time}
        xUnit="s"
        yLabel={words.difference}
        yUnit="deg/s"
        markers={ZERO}
        cursor={cursor}
      />
    </>
  );
}
