/** Map of two gains: Ms over both, unstable hatched, filling in while one looks; a click flies the point. */
import { useEffect, useMemo, useRef, useState } from 'preact/hooks';
import type { Build } from '../../../craft/build.ts';
import type { AxisName, Gains } from '../../../craft/gains.ts';
import type { TrimChoice } from '../../../shaping/axisModel.ts';
import { cellCentre, createMapGrid, setMapCell } from '../../plots/mapGrid.ts';
import { MapPlot, type MapPoint } from '../../plots/MapPlot.tsx';
import { useStore } from '../../store/context.ts';
import { Select } from '../../widgets/Select.tsx';
import type { FromShapeWorker, MapKind, ToShapeWorker } from './shape.worker.ts';
import { shapeTexts as words } from './texts.ts';
import { useShapeWorker } from './useShapeWorker.ts';

const CELLS = 32;
const LEVELS = [
  { at: 1.3, label: '1.3' },
  { at: 1.6, label: '1.6', strong: true },
  { at: 2, label: '2' },
  { at: 3, label: '3' },
];
const WAIT_MS = 250;

interface Axes {
  readonly x: { low: number; high: number; log?: boolean; label: string; unit: string };
  readonly y: { low: number; high: number; log?: boolean; label: string; unit: string };
}

/** Ranges by the saved gains, so that dragging the point does not move the map under it. */
function axesOf(kind: MapKind, gains: Gains, axis: AxisName): Axes {
  const own = gains.axes[axis];
  const p = Math.max(1e-4, own.p_us_per_dps);
  const d = Math.max(p * 0.008, own.d_us_per_dps2);
  const pAxis = { low: 0, high: 4 * p, label: 'P', unit: 'µs/(deg/s)' };
  const dAxis = { low: 0, high: 4 * d, label: 'D', unit: 'µs/(deg/s²)' };
  if (kind === 'p-d') return { x: pAxis, y: dAxis };
  if (kind === 'd-cutoff') {
    return {
      x: dAxis,
      y: { low: 10, high: Math.max(40, 0.45 * gains.loop_Hz), log: true, label: words.dCut, unit: 'Hz' },
    };
  }
  return { x: pAxis, y: { low: 100, high: 4000, log: true, label: words.loop, unit: 'Hz' } };
}

function pointOf(kind: MapKind, gains: Gains, axis: AxisName): MapPoint {
  const own = gains.axes[axis];
  if (kind === 'p-d') return { x: own.p_us_per_dps, y: own.d_us_per_dps2 };
  if (kind === 'd-cutoff') return { x: own.d_us_per_dps2, y: Math.max(10, gains.derivativeLowPass_Hz) };
  return { x: own.p_us_per_dps, y: gains.loop_Hz };
}

export function GainMap(props: {
  build: Build;
  gains: Gains;
  other: Gains | null;
  axis: AxisName;
  trim: TrimChoice;
}) {
  const { build, gains, axis, trim } = props;
  const store = useStore();
  const worker = useShapeWorker();
  const [kind, setKind] = useState<MapKind>('p-d');
  const [version, setVersion] = useState(0);
  const grid = useRef(createMapGrid(CELLS, CELLS));
  const id = useRef(0);
  const saved = store.savedGains.value;
  const axes = useMemo(() => axesOf(kind, saved, axis), [kind, saved, axis]);
  // What the map depends on besides its own two values.
  const held = JSON.stringify([kind, axis, trim, store.craft.value.id, heldFields(kind, gains, axis)]);
  useEffect(() => {
    const timer = setTimeout(() => {
      const one = worker.current;
      if (one === null) return;
      grid.current = createMapGrid(CELLS, CELLS);
      setVersion((v) => v + 1);
      const own = ++id.current;
      const centres = (range: Axes['x']) =>
        Float64Array.from({ length: CELLS }, (_, i) => cellCentre(range, i, CELLS));
      one.onmessage = ({ data }: MessageEvent<FromShapeWorker>) => {
        if (data.kind !== 'cells' || data.id !== own) return;
        for (const cell of data.cells)
          setMapCell(grid.current, cell.column, cell.row, Math.min(cell.ms, 6), !cell.stable, cell.block);
        setVersion((v) => v + 1);
      };
      one.postMessage({
        kind: 'map',
        id: own,
        build,
        gains,
        trim,
        task: { kind, axis, columns: CELLS, rows: CELLS, xs: centres(axes.x), ys: centres(axes.y) },
      } satisfies ToShapeWorker);
    }, WAIT_MS);
    return () => clearTimeout(timer);
  }, [held, build, axes]);
  const move = (point: MapPoint) =>
    store.setGains((now): Gains => {
      const own = now.axes[axis];
      const withOwn = (change: Partial<typeof own>): Gains => ({
        ...now,
        axes: { ...now.axes, [axis]: { ...own, ...change } },
      });
      const tidy = (value: number) => Number(value.toPrecision(3));
      if (kind === 'p-d') return withOwn({ p_us_per_dps: tidy(point.x), d_us_per_dps2: tidy(point.y) });
      if (kind === 'd-cutoff')
        return { ...withOwn({ d_us_per_dps2: tidy(point.x) }), derivativeLowPass_Hz: Math.round(point.y) };
      return { ...withOwn({ p_us_per_dps: tidy(point.x) }), loop_Hz: Math.round(point.y) };
    }, words.map);
  const fly = (point: MapPoint) => {
    if (move(point).length === 0) location.hash = '#/fly';
  };
  return (
    <div class="shape-map">
      <Select
        label={words.map}
        value={kind}
        options={(Object.keys(words.maps) as MapKind[]).map((value) => ({ value, label: words.maps[value] }))}
        onChange={setKind}
      />
      <MapPlot
        label={`${words.map}: ${words.maps[kind]}`}
        x={axes.x}
        y={axes.y}
        grid={grid.current}
        version={version}
        levels={LEVELS}
        valueLabel={words.mapValue}
        valueUnit=""
        point={pointOf(kind, gains, axis)}
        {...(props.other === null ? {} : { pointB: pointOf(kind, props.other, axis) })}
        onMove={move}
        onPick={fly}
        height={230}
      />
    </div>
  );
}

/** Everything of the gains but the two that the map itself sweeps. */
function heldFields(kind: MapKind, gains: Gains, axis: AxisName): unknown {
  const own = gains.axes[axis];
  const swept = {
    ...own,
    p_us_per_dps: kind === 'd-cutoff' ? own.p_us_per_dps : 0,
    d_us_per_dps2: kind === 'p-loop' ? own.d_us_per_dps2 : 0,
  };
  return [
    swept,
    kind === 'd-cutoff' ? 0 : gains.derivativeLowPass_Hz,
    kind === 'p-loop' ? 0 : gains.loop_Hz,
    gains.gyroLowPass_Hz,
    gains.computeDelay_s,
    gains.notches,
    gains.derivativeLowPassKind,
    gains.gyroLowPassKind,
  ];
}
