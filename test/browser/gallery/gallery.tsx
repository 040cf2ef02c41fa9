/** Every widget and plot on one page, for the browser tests; not part of the program. */
import { signal } from '@preact/signals';
import { render } from 'preact';
import { useMemo, useState } from 'preact/hooks';
import '../../../src/app/styles/tokens.css';
import '../../../src/app/styles/base.css';
import '../../../src/app/styles/widgets.css';
import '../../../src/app/styles/plots.css';
import { LinePlot } from '../../../src/app/plots/LinePlot.tsx';
import { cellCentre, createMapGrid, setMapCell } from '../../../src/app/plots/mapGrid.ts';
import { MapPlot } from '../../../src/app/plots/MapPlot.tsx';
import { createRing, pushRow } from '../../../src/app/plots/ring.ts';
import { Sparkline } from '../../../src/app/plots/Sparkline.tsx';
import { Tape } from '../../../src/app/plots/Tape.tsx';
import { TapePainter, type TapeLane } from '../../../src/app/plots/tapePainter.ts';
import { XyPlot } from '../../../src/app/plots/XyPlot.tsx';
import { BenchContext, useStore } from '../../../src/app/store/context.ts';
import { firstDocument } from '../../../src/app/store/demos.ts';
import { Store } from '../../../src/app/store/store.ts';
import { startTheme } from '../../../src/app/store/theme.ts';
import { Button } from '../../../src/app/widgets/Button.tsx';
import { CornerPlan, type CornerReading } from '../../../src/app/widgets/CornerPlan.tsx';
import { DataTable } from '../../../src/app/widgets/DataTable.tsx';
import { FileDrop } from '../../../src/app/widgets/FileDrop.tsx';
import { NoticeBox } from '../../../src/app/widgets/Notice.tsx';
import { NumberField } from '../../../src/app/widgets/NumberField.tsx';
import { ProgressLine } from '../../../src/app/widgets/ProgressLine.tsx';
import { Select } from '../../../src/app/widgets/Select.tsx';
import { EmptyState, FailedState, Stale } from '../../../src/app/widgets/states.tsx';
import { Tabs } from '../../../src/app/widgets/Tabs.tsx';
import { Toggle } from '../../../src/app/widgets/Toggle.tsx';

const ROWS_PER_S = 1000;
const LANES: readonly TapeLane[] = [
  ...(['roll', 'pitch', 'yaw'] as const).map((axis, i): TapeLane => ({
    label: axis,
    unit: 'deg/s',
    traces: [
      { label: 'setpoint', channel: 3 * i, axis: 'ink', behind: true },
      { label: 'gyro', channel: 3 * i + 1, axis: 'faint', behind: true },
      { label: 'rate', channel: 3 * i + 2, axis },
    ],
  })),
  {
    label: 'commands',
    unit: 'µs',
    range: [1000, 2000],
    saturation: [13],
    traces: ['FL', 'FR', 'RL', 'RR'].map((label, i) => ({
      label,
      channel: 9 + i,
      axis: (['ink', 'roll', 'pitch', 'yaw'] as const)[i],
    })),
  },
];
const SATURATED = 13;
const GUST = 14;

function invented(time_s: number, row: Float64Array): void {
  for (let i = 0; i < 3; i++) {
    const wanted = 80 * Math.sign(Math.sin(time_s * (0.9 + 0.3 * i)));
    const rate = wanted * (1 - 0.4 * Math.exp(-((time_s * 3) % 2))) + 8 * Math.sin(40 * time_s + i);
    row[3 * i] = wanted;
    row[3 * i + 1] = rate + 12 * Math.sin(977 * time_s);
    row[3 * i + 2] = rate;
  }
  for (let c = 0; c < 4; c++)
    row[9 + c] = 1500 + 300 * Math.sin(time_s * 1.7 + c) + 90 * Math.sin(31 * time_s);
  row[SATURATED] = row[9] > 1850 ? 1 : 0;
  row[GUST] = time_s % 5 > 3.4 && time_s % 5 < 4.4 ? 1 : 0;
}

function filledRing(seconds: number) {
  const ring = createRing(15, 60 * ROWS_PER_S);
  const row = new Float64Array(15);
  for (let n = 0; n < seconds * ROWS_PER_S; n++) {
    invented(n / ROWS_PER_S, row);
    pushRow(ring, n / ROWS_PER_S, row);
  }
  return ring;
}

/** Milliseconds a frame while the tape flows at 60 frames/s: median and worst of `frames`. */
function measureTape(
  width: number,
  frames: number,
): { median_ms: number; worst_ms: number; first_ms: number } {
  const canvas = document.createElement('canvas');
  document.body.append(canvas);
  const palette = theme.palette.value;
  const painter = new TapePainter(canvas, LANES, GUST, palette);
  painter.configure(LANES, GUST, palette, width, 320, 1);
  const ring = filledRing(20);
  const row = new Float64Array(15);
  const times: number[] = [];
  const pixel = canvas.getContext('2d');
  for (let frame = 0; frame <= frames; frame++) {
    for (let n = 0; n < 16; n++) {
      const time_s = ring.written / ROWS_PER_S;
      invented(time_s, row);
      pushRow(ring, time_s, row);
    }
    const before = performance.now();
    painter.draw(ring, { end_s: (ring.written - 1) / ROWS_PER_S, span_s: 8 }, null);
    // Reading a pixel makes the drawing happen now rather than later.
    pixel?.getImageData(0, 0, 1, 1);
    times.push(performance.now() - before);
  }
  canvas.remove();
  const flowing = times.slice(1).sort((a, b) => a - b);
  return {
    median_ms: flowing[flowing.length >> 1],
    worst_ms: flowing[flowing.length - 1],
    first_ms: times[0],
  };
}

function Gains() {
  const store = useStore();
  const { gains, savedGains } = store;
  const [side, setSide] = useState<'one' | 'two'>('one');
  const [on, setOn] = useState(true);
  return (
    <section class="panel" style={{ width: '420px' }}>
      <h2>Gains</h2>
      <NumberField
        label="Roll P"
        unit="µs per deg/s"
        min={0}
        max={10}
        value={gains.value.axes.roll.p_us_per_dps}
        saved={savedGains.value.axes.roll.p_us_per_dps}
        onChange={(p_us_per_dps) => {
          store.setGains(
            (g) => ({ ...g, axes: { ...g.axes, roll: { ...g.axes.roll, p_us_per_dps } } }),
            'roll P',
          );
        }}
      />
      <NumberField
        label="D low-pass"
        unit="Hz"
        min={1}
        max={2000}
        logarithmic
        value={gains.value.derivativeLowPass_Hz}
        saved={savedGains.value.derivativeLowPass_Hz}
        onChange={(derivativeLowPass_Hz) => {
          store.setGains((g) => ({ ...g, derivativeLowPass_Hz }), 'D low-pass');
        }}
      />
      <NumberField
        label="Mean wind"
        unit="m/s"
        min={0}
        max={20}
        value={7}
        onChange={() => 'refused on purpose'}
      />
      <NumberField
        label="Loop"
        unit="Hz"
        min={50}
        max={8000}
        value={400}
        noSlider
        onChange={() => undefined}
      />
      <Select
        label="D acts on"
        value={side}
        options={[
          { value: 'one', label: 'measurement' },
          { value: 'two', label: 'error' },
        ]}
        onChange={setSide}
      />
      <div class="row">
        <Toggle label="gusts" on={on} onChange={setOn} />
        <Button primary onClick={() => undefined}>
          Compute
        </Button>
        <Button onClick={() => undefined}>Save</Button>
        <Button disabled onClick={() => undefined}>
          Cannot
        </Button>
        <Button pressed onClick={() => undefined}>
          On
        </Button>
      </div>
      <ProgressLine share={0.4} label="map" />
    </section>
  );
}

const N = 400;
const t = Float64Array.from({ length: N }, (_, i) => i / 200);
const step = (k: number) => Float64Array.from(t, (x) => 1 - Math.exp(-k * x) * Math.cos(9 * x));
const f_Hz = Float64Array.from({ length: N }, (_, i) => 0.1 * 10 ** ((3 * i) / N));
const gain_dB = Float64Array.from(f_Hz, (f) => 20 * Math.log10(12 / f / Math.hypot(1, f / 9)));
const shared = signal<number | null>(null);
const loop = (k: number) => {
  const re = Float64Array.from(f_Hz, (f) => (-k * 0.9) / (1 + (f / 5) ** 2));
  const im = Float64Array.from(f_Hz, (f) => (-k * 2) / f / (1 + (f / 5) ** 2));
  return { x: re, y: im };
};

function Plots() {
  const series = useMemo(
    () => [
      { label: 'roll', axis: 'roll' as const, values: step(3) },
      { label: 'pitch', axis: 'pitch' as const, values: step(2.4) },
      { label: 'yaw', axis: 'yaw' as const, values: step(1.5) },
      { label: 'roll B', axis: 'roll' as const, side: 'B' as const, values: step(6) },
    ],
    [],
  );
  const bode = useMemo(() => [{ label: 'roll', axis: 'roll' as const, values: gain_dB }], []);
  const spans = useMemo(
    () => [
      { from: 0.4, to: 0.7, kind: 'gust' as const, label: 'gust' },
      { from: 1.1, to: 1.25, kind: 'saturated' as const },
      { from: 0.1, to: 1.6, kind: 'used' as const },
    ],
    [],
  );
  const grid = useMemo(() => {
    const map = createMapGrid(24, 24);
    for (let r = 0; r < 24; r++) {
      for (let c = 0; c < 24; c++) {
        const x = cellCentre({ low: 0, high: 0.05 }, c, 24);
        const y = cellCentre({ low: 10, high: 200, log: true }, r, 24);
        const coarse = r >= 16;
        if (coarse && (c % 4 !== 0 || r % 4 !== 0)) continue;
        const value = 20 * Math.hypot((x - 0.02) / 0.02, Math.log(y / 50));
        setMapCell(map, c, r, value, x > 0.038 && y < 60, coarse ? 4 : 1);
      }
    }
    return map;
  }, []);
  const [point, setPoint] = useState({ x: 0.016, y: 45 });
  const axes = useMemo(
    () => ({
      x: { label: 'roll D', unit: 'µs per deg/s²', low: 0, high: 0.05 },
      y: { label: 'D low-pass', unit: 'Hz', low: 10, high: 200, log: true },
      re: { label: 'Re L', unit: '', low: -2, high: 1 },
      im: { label: 'Im L', unit: '', low: -2, high: 1 },
    }),
    [],
  );
  const levels = useMemo(
    () => [
      { at: 8, label: '8', strong: true },
      { at: 16, label: '16' },
      { at: 24, label: '24' },
    ],
    [],
  );
  const curves = useMemo(
    () => [
      { label: 'roll', axis: 'roll' as const, ...loop(1) },
      { label: 'pitch', axis: 'pitch' as const, ...loop(1.3) },
      { label: 'roll B', axis: 'roll' as const, side: 'B' as const, ...loop(0.6) },
    ],
    [],
  );
  return (
    <div style={{ display: 'grid', gridTemplateColumns: '1fr 1fr', gap: '16px' }}>
      <LinePlot
        label="Step"
        x={t}
        series={series}
        xLabel="time"
        xUnit="s"
        yLabel="rate"
        yUnit="deg/s"
        spans={spans}
        markers={[
          { x: 0.9, label: 'settled' },
          { y: 1, label: 'setpoint' },
        ]}
        cursor={shared}
        height={220}
      />
      <LinePlot
        label="Open loop"
        x={f_Hz}
        series={bode}
        logX
        xLabel="frequency"
        xUnit="Hz"
        yLabel="gain"
        yUnit="dB"
        markers={[{ x: 8.4, label: 'crossover', axis: 'roll' }]}
        height={220}
      />
      <XyPlot
        label="Nyquist"
        curves={curves}
        x={axes.re}
        y={axes.im}
        equalScales
        circles={[
          { x: 0, y: 0, radius: 1 },
          { x: -1, y: 0, radius: 0.5, label: 'Ms 2' },
        ]}
        points={[{ x: -1, y: 0, label: '−1' }]}
      />
      <MapPlot
        label="Map of two gains"
        x={axes.x}
        y={axes.y}
        grid={grid}
        version={1}
        levels={levels}
        valueLabel="noise"
        valueUnit="µs"
        regions={[{ x: 0.02, y: 50, label: 'good' }]}
        point={point}
        pointB={{ x: 0.03, y: 90 }}
        onMove={setPoint}
      />
      <LinePlot label="Empty" x={[]} series={[]} xLabel="time" xUnit="s" yLabel="rate" yUnit="deg/s" />
    </div>
  );
}

const reading = signal<CornerReading>({ command: [0.42, 0.97, 0.5, 0.55], saturated: [0, 1, 0, 0] });

function Others() {
  const store = useStore();
  const [tab, setTab] = useState<'a' | 'b'>('a');
  const [opened, setOpened] = useState<string | null>('gust');
  return (
    <section class="panel" style={{ flex: 1 }}>
      <h2>Others</h2>
      <div class="row">
        <CornerPlan build={store.build.value} reading={reading} />
        <div style={{ flex: 1, display: 'grid', gap: '8px' }}>
          <NoticeBox kind="info">Another window changed “Wren”; taken over here.</NoticeBox>
          <NoticeBox kind="warning">Propellers off on the bench.</NoticeBox>
          <NoticeBox
            kind="error"
            details={['craft.json: airframe.mass_kg: −3; allowed: a number from 0.01 to 150 kg']}
            onDismiss={() => undefined}
          >
            craft.json was not taken; what was there stays.
          </NoticeBox>
        </div>
      </div>
      <Tabs
        label="Sheets"
        value={tab}
        tabs={[
          { value: 'a', label: 'Trials' },
          { value: 'b', label: 'States' },
        ]}
        onChange={setTab}
      >
        {tab === 'a' ? (
          <DataTable
            label="Trials"
            rows={['step', 'gust', 'noise']}
            rowKey={(row) => row}
            opened={opened}
            chosen="gust"
            inside={(row) => <span>Traces of {row}</span>}
            columns={[
              {
                key: 'name',
                label: 'Trial',
                show: (row) => (
                  <Button quiet onClick={() => setOpened(opened === row ? null : row)}>
                    {row}
                  </Button>
                ),
                sortBy: (row) => row,
              },
              {
                key: 'score',
                label: 'Score',
                unit: 'deg',
                numeric: true,
                show: (row) => row.length * 1.25,
                sortBy: (row) => row.length,
              },
              { key: 'line', label: 'Trace', show: () => <Sparkline values={series} axis="roll" /> },
            ]}
          />
        ) : (
          <>
            <EmptyState title="No log yet">Drop a log of the real craft here.</EmptyState>
            <FailedState title="Map stopped working" text="The rest goes on." error={new Error('made up')} />
            <Stale stale onRecompute={() => undefined}>
              <p>42 deg</p>
            </Stale>
          </>
        )}
      </Tabs>
      <FileDrop label="Drop a thrust-stand CSV here" onFiles={() => undefined} />
    </section>
  );
}
const series = step(2);

function TapeDemo() {
  const ring = useMemo(() => filledRing(12), []);
  const [at_s, setAt] = useState<number | null>(null);
  return (
    <div style={{ height: '320px' }}>
      <Tape
        label="Flight tape"
        ring={ring}
        lanes={LANES}
        span_s={8}
        shadeChannel={GUST}
        at_s={at_s}
        onSeek={setAt}
      />
    </div>
  );
}

const store = new Store(firstDocument());
const theme = startTheme(store.settings);
Object.assign(window, { measureTape, store });
const root = document.getElementById('app');
if (root !== null) {
  render(
    <BenchContext.Provider value={{ store, theme, storage: null, running: new Map() }}>
      <main class="frame-free" style={{ padding: '16px', display: 'grid', gap: '16px' }}>
        <h1>Gallery</h1>
        <div style={{ display: 'flex', gap: '16px', alignItems: 'start' }}>
          <Gains />
          <Others />
        </div>
        <TapeDemo />
        <Plots />
      </main>
    </BenchContext.Provider>,
    root,
  );
}
