import { useMemo, useState } from 'preact/hooks';
import type { AxisName } from '../../../craft/gains.ts';
import { LinePlot, type PlotSeries } from '../../plots/LinePlot.tsx';
import { useStore } from '../../store/context.ts';
import { Button } from '../../widgets/Button.tsx';
import { NumberField } from '../../widgets/NumberField.tsx';
import { Select } from '../../widgets/Select.tsx';
import type { ShownReplayAxis } from './messages.ts';
import type { Matched, MatchSession, Replayed } from './session.ts';
import { OverAndLeft } from './OverAndLeft.tsx';
import { matchTexts as words } from './texts.ts';

const DEFAULT_S = 20;
const SHORTEST_S = 2;
const LONGEST_S = 120;

/** The logged sticks through the full simulation: the log over it, what is left below. */
export function Replay(props: { axis: AxisName; session: MatchSession; matched: Matched }) {
  const { axis, session, matched } = props;
  const store = useStore();
  const { result } = matched;
  const [from_s, setFrom] = useState(result.replayFrom_s);
  const [to_s, setTo] = useState(Math.min(result.seconds, result.replayFrom_s + DEFAULT_S));
  const [gainsOf, setGainsOf] = useState<'log' | 'desk'>(result.flownGains === null ? 'desk' : 'log');
  if (!result.hasSetpoints || result.seconds < SHORTEST_S) {
    return (
      <section aria-label={words.replay}>
        <h2>{words.replay}</h2>
        <p>{words.noSetpoints}</p>
      </section>
    );
  }
  const fly = (): void => {
    const gains = gainsOf === 'log' && result.flownGains !== null ? result.flownGains : store.gains.value;
    const builds = result.corrected === null ? [matched.build] : [matched.build, result.corrected];
    session.replay(matched, { builds, gains, from_s, to_s });
  };
  const replayed = session.replayed.value;
  return (
    <section class="match-replay" aria-label={words.replay}>
      <h2>{words.replay}</h2>
      <p class="faint">{words.replayIntro}</p>
      <div class="match-replay-fields">
        <NumberField
          label={words.from}
          value={from_s}
          min={0}
          max={Math.max(0, result.seconds - SHORTEST_S)}
          step={1}
          unit="s"
          noSlider
          onChange={(value) => {
            setFrom(value);
            setTo(Math.min(result.seconds, value + LONGEST_S, Math.max(to_s, value + SHORTEST_S)));
          }}
        />
        <NumberField
          label={words.to}
          value={to_s}
          min={Math.min(result.seconds, from_s + SHORTEST_S)}
          max={Math.min(result.seconds, from_s + LONGEST_S)}
          step={1}
          unit="s"
          noSlider
          onChange={setTo}
        />
        <Select
          label={words.gainsUsed}
          value={gainsOf}
          options={(result.flownGains === null ? (['desk'] as const) : (['log', 'desk'] as const)).map(
            (value) => ({ value, label: words.gainsOf[value] }),
          )}
          onChange={setGainsOf}
        />
        <Button onClick={fly} disabled={session.busy.value !== null}>
          {words.fly}
        </Button>
      </div>
      {replayed !== null && <ReplayPlots axis={axis} replayed={replayed} />}
    </section>
  );
}

function ReplayPlots(props: { axis: AxisName; replayed: Replayed }) {
  const { axis, replayed } = props;
  const { replays } = replayed;
  const names = [words.flownBuild, words.flownCorrected];
  const shown = useMemo(
    () =>
      replays.flatMap((replay, i): { name: string; axis: ShownReplayAxis }[] => {
        const one = replay.axes[axis];
        return one === null ? [] : [{ name: names[i], axis: one }];
      }),
    [axis, replays],
  );
  // The build as it was is drawn thin, under the corrected one.
  const sideOf = (i: number) => (i < shown.length - 1 ? ('B' as const) : ('A' as const));
  const over = useMemo(
    (): PlotSeries[] => [
      ...(shown.length > 0
        ? [{ label: words.log, axis: 'ink' as const, values: shown[0].axis.measured_dps }]
        : []),
      ...shown.map(({ name, axis: one }, i) => ({
        label: name,
        axis: sideOf(i) === 'B' ? ('faint' as const) : axis,
        values: one.simulated_dps,
        side: sideOf(i),
      })),
    ],
    [shown, axis],
  );
  const left = useMemo(
    (): PlotSeries[] =>
      shown.map(({ name, axis: one }, i) => ({
        label: name,
        axis: sideOf(i) === 'B' ? ('faint' as const) : ('ink' as const),
        values: one.residual_dps,
        side: sideOf(i),
      })),
    [shown],
  );
  const last = shown[shown.length - 1];
  const f_Hz = useMemo(() => last?.axis.f_Hz.slice(1) ?? [], [last]);
  const spectra = useMemo(
    (): PlotSeries[] =>
      last === undefined
        ? []
        : [
            { label: words.log, axis: 'ink', values: last.axis.measuredDensity.slice(1).map(Math.sqrt) },
            {
              label: words.replayLeft(axis),
              axis,
              values: last.axis.residualDensity.slice(1).map(Math.sqrt),
            },
          ],
    [last, axis],
  );
  if (last === undefined) return null;
  const { t_s, remarks } = replays[replays.length - 1];
  return (
    <>
      <ul class="match-note">
        {shown.map(({ name, axis: one }) => (
          <li key={name}>
            <strong>{name}</strong>: {one.says}
          </li>
        ))}
      </ul>
      <OverAndLeft
        t_s={t_s}
        over={{ label: words.replayPlot(axis), series: over, height: 190 }}
        left={{ label: words.replayLeft(axis), series: left, height: 110 }}
      />
      <LinePlot
        label={words.replaySpectrum(axis)}
        x={f_Hz}
        series={spectra}
        xLabel={words.frequency}
        xUnit="Hz"
        yLabel={words.density}
        yUnit="deg/s/√Hz"
        logX
        logY
        height={130}
      />
      <p class="small faint">{remarks.join(' ')}</p>
    </>
  );
}
