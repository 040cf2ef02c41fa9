/** The manual way: P, then I, then D, each step flown by the whole craft and drawn; one click takes one and goes on. */
import type { ComponentChildren } from 'preact';
import { useEffect, useMemo, useState } from 'preact/hooks';
import type { AxisName, Gains } from '../../../craft/gains.ts';
import { WALK_STAGES, type WalkStage } from '../../../shaping/walk.ts';
import { LinePlot, type PlotSeries } from '../../plots/LinePlot.tsx';
import { useStore } from '../../store/context.ts';
import { Button } from '../../widgets/Button.tsx';
import { useOneShot } from './oneShot.ts';
import type { WalkTrial } from './shape.worker.ts';
import { shapeTexts } from './texts.ts';

const words = shapeTexts.walk;

export function Walk(props: { axis: AxisName }) {
  const { axis } = props;
  const store = useStore();
  const [stage, setStage] = useState<WalkStage>('p');
  const [trials, setTrials] = useState<readonly WalkTrial[] | null>(null);
  const flight = useOneShot(words.job, 'shape:walk');
  const { busy } = flight;
  useEffect(() => {
    flight.stop();
    setTrials(null);
    setStage('p');
  }, [axis, store.craft.value.id]);

  const fly = (at: WalkStage, gains: Gains): void => {
    setStage(at);
    setTrials(null);
    flight.ask({ kind: 'walk', build: store.build.value, gains, axis, stage: at }, (answer) => {
      if (answer.kind === 'walked') setTrials(answer.trials);
    });
  };
  /** The gains that were flown become the working ones; undo takes them back. */
  const take = (trial: WalkTrial, go: WalkStage): void => {
    const problems = store.setGains(
      { ...trial.gains, name: store.gains.value.name },
      `${axis} ${trial.label}`,
    );
    if (problems.length === 0) fly(go, trial.gains);
  };
  const next = WALK_STAGES[WALK_STAGES.indexOf(stage) + 1] ?? null;
  return (
    <details class="panel shape-wide">
      <summary>{words.title}</summary>
      <p class="small">{words.what}</p>
      <div class="row">
        {WALK_STAGES.map((one) => (
          <Button
            key={one}
            primary={trials === null && one === 'p'}
            pressed={trials !== null && one === stage}
            disabled={busy}
            onClick={() => fly(one, store.gains.value)}
          >
            {words.stages[one]}
          </Button>
        ))}
        <span role="status" class="faint">
          {busy ? words.flying : trials === null ? '' : words.goal[stage]}
        </span>
      </div>
      {trials !== null && (
        <Trials axis={axis} trials={trials}>
          {(trial) => (
            <>
              <Button quiet onClick={() => take(trial, stage)}>
                {words.again}
              </Button>
              {next !== null && (
                <Button quiet onClick={() => take(trial, next)}>
                  {words.takeTo(next.toUpperCase())}
                </Button>
              )}
            </>
          )}
        </Trials>
      )}
    </details>
  );
}

const TONES = ['faint', 'ink', 'accent', 'yaw'] as const;

function Trials(props: {
  axis: AxisName;
  trials: readonly WalkTrial[];
  children: (trial: WalkTrial) => ComponentChildren;
}) {
  const { axis, trials } = props;
  const plot = useMemo(() => {
    const first = trials[0].response;
    const series: PlotSeries[] = trials.map((trial, i) => ({
      label: trial.label,
      axis: TONES[i % TONES.length],
      values: trial.response.rate_dps,
      x: trial.response.t_s,
    }));
    return {
      x: first.t_s,
      series: [
        { label: words.setpoint, axis: 'faint' as const, values: first.setpoint_dps, side: 'B' as const },
        ...series,
      ],
    };
  }, [trials]);
  return (
    <div class="shape-walk">
      <LinePlot
        label={words.plot(axis)}
        x={plot.x}
        series={plot.series}
        xLabel={words.time}
        xUnit="s"
        yLabel={words.rate}
        yUnit="deg/s"
        height={220}
      />
      <table class="small">
        <thead>
          <tr>
            <th scope="col">{words.tried}</th>
            <th scope="col">{words.rise}</th>
            <th scope="col">{words.overshoot}</th>
            <th scope="col">{words.restless}</th>
            <th scope="col">{words.asks}</th>
            <th scope="col" />
          </tr>
        </thead>
        <tbody>
          {trials.map((trial) => (
            <tr key={trial.label}>
              <th scope="row">{trial.label}</th>
              <td>{ms(trial.response.step.rise_s)}</td>
              <td>{percent(trial.response.step.overshoot_pct)}</td>
              <td>{trial.response.restless_us.toFixed(1)}</td>
              <td>{trial.advice}</td>
              <td>
                <span class="row">{props.children(trial)}</span>
              </td>
            </tr>
          ))}
        </tbody>
      </table>
    </div>
  );
}

const ms = (value_s: number | null) => (value_s === null ? '—' : `${(value_s * 1000).toFixed(0)} ms`);
const percent = (value: number | null) => (value === null ? '—' : `${value.toFixed(0)} %`);
