/** Maps: the one-click map of D and its cutoff, sweeps over any numbers, cells flown or put side by side. */
import { useMemo, useState } from 'preact/hooks';
import { RUN_FORMAT } from '../../../trials/runDescription.ts';
import { derivativeMap, parseSweep, type Subject, type Sweep } from '../../../trials/sweep.ts';
import { mapOf, type SweepCells, type SweepMap } from '../../../trials/sweepResult.ts';
import { trialByName } from '../../../trials/registry.ts';
import { LinePlot } from '../../plots/LinePlot.tsx';
import { MapPlot, type MapPoint } from '../../plots/MapPlot.tsx';
import { fileStem, saveJson } from '../../storage/saveFile.ts';
import { useStore } from '../../store/context.ts';
import { sameJson } from '../../store/document.ts';
import { Button } from '../../widgets/Button.tsx';
import { NoticeBox } from '../../widgets/Notice.tsx';
import { Select } from '../../widgets/Select.tsx';
import { CellCompare } from './CellCompare.tsx';
import { three, useDesk } from './shared.ts';
import { SweepForm } from './SweepForm.tsx';
import { cellAt, curvesOf, layerGrid, levelsOf, plotAxis, pointOf, type Place } from './sweepView.ts';
import { proveTexts as words } from './texts.ts';
import { useFlyCell } from './toFly.ts';
import { WorkLine } from './WorkLine.tsx';

const MAP_CELLS = 24;
const MAP_PX = 380;
type Click = 'fly' | 'pick';

export function MapsPanel() {
  const store = useStore();
  const { runs, kept, now } = useDesk();
  const cells = runs.cells.value;
  const [picks, setPicks] = useState<readonly Place[]>([]);
  const subject: Subject = { build: now.build, gains: store.gains.value, wind: now.wind };
  const busy = runs.work.value !== null;
  const start = (sweep: Sweep): void => {
    setPicks([]);
    void runs.startSweep(sweep, subject);
  };
  const startMap = (): void => {
    const raw = derivativeMap(subject, MAP_CELLS);
    store.attempt({}, () =>
      start(parseSweep({ ...raw, bands: kept.bands[raw.trial] ?? {}, seed: kept.seed }, subject)),
    );
  };
  return (
    <section class="prove-part prove-maps" aria-label={words.tab.maps}>
      <div class="prove-map-side">
        <div class="row">
          <Button
            primary={!busy}
            disabled={busy}
            title={busy ? words.busy : words.mapHint}
            onClick={startMap}
          >
            {words.mapRun}
          </Button>
          <span class="faint small">{words.mapHint}</span>
        </div>
        <SweepForm subject={subject} busy={busy} onStart={start} />
        {cells !== null && picks.length > 0 && <PickButtons cells={cells} picks={picks} />}
      </div>
      <div class="prove-map-main">
        <WorkLine kind="sweep" label={words.sweepJob} />
        <Trouble />
        {cells === null ? (
          <p class="faint">{words.noSweep}</p>
        ) : (
          <SweepView
            key={cells.sweep.trial}
            cells={cells}
            stale={
              !sameJson(
                [cells.subject.build, cells.subject.gains, cells.subject.wind ?? null],
                [subject.build, subject.gains, subject.wind ?? null],
              )
            }
            picks={picks}
            onPick={(place) => setPicks([...picks.slice(-1), place])}
          />
        )}
      </div>
      {cells !== null && picks.length > 0 && <CellCompare cells={cells} picks={picks} />}
    </section>
  );
}

/** Why finished cells are not written down. */
function Trouble() {
  const trouble = useDesk().runs.trouble.value;
  if (trouble === null) return null;
  const text =
    trouble.kind === 'full'
      ? words.trouble.full
      : trouble.kind === 'other-window'
        ? words.trouble.otherWindow
        : words.trouble.failed(trouble.reason);
  return <NoticeBox kind="warning">{text}</NoticeBox>;
}

function PickButtons(props: { cells: SweepCells; picks: readonly Place[] }) {
  const fly = useFlyCell(props.cells);
  return (
    <div class="row">
      {props.picks.map((place, i) => (
        <Button key={i} title={words.cellFlyHint} onClick={() => fly(place)}>
          {words.cellFly(i + 1)}
        </Button>
      ))}
    </div>
  );
}

interface SweepViewProps {
  readonly cells: SweepCells;
  readonly stale: boolean;
  readonly picks: readonly Place[];
  readonly onPick: (place: Place) => void;
}

function SweepView(props: SweepViewProps) {
  const { runs } = useDesk();
  const { cells } = props;
  const version = runs.version.value;
  const [layerName, setLayerName] = useState('');
  const [click, setClick] = useState<Click>('fly');
  const fly = useFlyCell(cells);
  const map = useMemo(() => mapOf(cells), [cells, version]);
  const layer = map.layers.find(({ name }) => name === layerName) ?? map.layers[0];
  const act = (place: Place): void => (click === 'fly' ? fly(place) : props.onPick(place));
  const { sweep } = cells;
  const missing = cells.count - cells.done;
  return (
    <>
      <div class="row">
        <strong>{words.sweepOf(trialByName(sweep.trial).title, cells.done, cells.count)}</strong>
        {props.stale && <em class="warn">{words.sweepStale}</em>}
        {runs.work.value === null && missing > 0 && (
          <Button primary onClick={() => void runs.goOn()}>
            {words.sweepGoOn}
          </Button>
        )}
        <Button quiet title={words.descriptionHint} onClick={() => saveSweep(cells)}>
          {words.download}
        </Button>
      </div>
      <div class="row">
        <Select
          label={words.layer}
          value={layer.name}
          options={map.layers.map(({ name, unit }) => ({ value: name, label: `${name}, ${unit}` }))}
          onChange={setLayerName}
        />
        <Select
          label={words.click}
          value={click}
          options={[
            { value: 'fly', label: words.clickFlies },
            { value: 'pick', label: words.clickPicks },
          ]}
          onChange={setClick}
        />
      </div>
      {sweep.y === undefined ? (
        <Line {...props} map={map} layerIndex={map.layers.indexOf(layer)} act={act} />
      ) : (
        <Map {...props} map={map} layerIndex={map.layers.indexOf(layer)} act={act} version={version} />
      )}
    </>
  );
}

type DrawnProps = SweepViewProps & {
  map: SweepMap;
  layerIndex: number;
  act: (place: Place) => void;
};

function Map(props: DrawnProps & { version: number }) {
  const { cells, map, picks, act, version } = props;
  const layer = map.layers[props.layerIndex];
  const { sweep } = cells;
  const x = useMemo(() => plotAxis(sweep.x), [sweep]);
  const y = useMemo(() => plotAxis(sweep.y ?? sweep.x), [sweep]);
  const [cursor, setCursor] = useState<MapPoint | null>(null);
  const grid = useMemo(() => layerGrid(cells, map, layer), [map, layer]);
  const levels = useMemo(() => levelsOf(layer), [layer]);
  const curves = useMemo(() => curvesOf(cells, map), [map]);
  const at =
    cursor ?? pointOf(cells, { column: Math.floor(cells.columns / 2), row: Math.floor(cells.rows / 2) });
  return (
    <>
      <MapPlot
        label={layer.name}
        x={x}
        y={y}
        grid={grid}
        version={version}
        levels={levels}
        valueLabel={layer.name}
        valueUnit={layer.unit}
        curves={curves}
        regions={picks.map((place, i) => ({ ...pointOf(cells, place), label: String(i + 1) }))}
        point={at}
        pointName=""
        picksPoint
        onMove={setCursor}
        onPick={(point) => {
          setCursor(point);
          act(cellAt(cells, point));
        }}
        height={MAP_PX}
      />
      <p class="faint small">
        {words.mapLegend} {words.sweepBands}
      </p>
    </>
  );
}

/** A sweep over one number: its curve, and its cells as a table. */
function Line(props: DrawnProps) {
  const { cells, map, picks } = props;
  const layer = map.layers[props.layerIndex];
  const axis = plotAxis(cells.sweep.x);
  const limits = [layer.band.least, layer.band.most].filter((one) => one !== undefined);
  const rising = cells.sweep.x.from <= cells.sweep.x.to;
  const ascending = <T,>(values: readonly T[]): readonly T[] => (rising ? values : [...values].reverse());
  return (
    <>
      <LinePlot
        label={layer.name}
        x={ascending(Array.from(map.x))}
        series={[{ label: layer.name, axis: 'ink', values: ascending(Array.from(layer.values)) }]}
        xLabel={axis.label}
        xUnit={axis.unit}
        yLabel={layer.name}
        yUnit={layer.unit}
        markers={limits.map((limit) => ({
          label: `${words.band} ${limit}`,
          y: limit,
          axis: 'accent' as const,
        }))}
        height={MAP_PX - 140}
      />
      <div class="prove-cells">
        <table class="table" aria-label={words.cellsTable}>
          <tbody>
            {Array.from(map.x, (value, column) => {
              const cell = cells.at(column, 0);
              const pick = picks.findIndex((one) => one.column === column);
              const told = pick < 0 ? words.pick : words.picked(pick + 1);
              return (
                <tr key={column}>
                  <td class="numeric">
                    {three(value)} <span class="unit">{axis.unit}</span>
                  </td>
                  <td class="numeric">
                    {three(layer.values[column])} <span class="unit">{layer.unit}</span>
                  </td>
                  <td>
                    {cell === null ? (
                      <span class="faint">{words.notFlown}</span>
                    ) : cell.pass ? (
                      words.within
                    ) : (
                      <span class="bad">{cell.reason ?? words.outside}</span>
                    )}
                  </td>
                  <td>
                    <Button
                      quiet
                      name={`${told} ${three(value)}`}
                      onClick={() => props.act({ column, row: 0 })}
                    >
                      {told}
                    </Button>
                  </td>
                </tr>
              );
            })}
          </tbody>
        </table>
      </div>
    </>
  );
}

/** The sweep with all it hangs on, as a file for `prove --run`. */
function saveSweep({ sweep, subject }: SweepCells): void {
  const { build, gains, wind } = subject;
  saveJson(`${fileStem(build.name)}-sweep.run.json`, {
    format: RUN_FORMAT,
    trials: [],
    seed: sweep.seed,
    ...(wind === undefined || wind === null ? {} : { wind }),
    build,
    gains,
    sweep,
  });
}
