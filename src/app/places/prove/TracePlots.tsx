/** Flights over each other, one small plot a signal. */
import type { TraceAxis } from '../../plots/lineStyle.ts';
import { LinePlot } from '../../plots/LinePlot.tsx';
import type { TrialTask } from '../../../trials/runTrial.ts';
import { unitOfSignal, useTraces } from './shared.ts';
import { proveTexts as words } from './texts.ts';

export interface TracedFlight {
  readonly label: string;
  readonly task: TrialTask;
}

export function TracePlots(props: { flights: readonly TracedFlight[] }) {
  const state = useTraces(props.flights.map(({ task }) => task));
  if (state.kind === 'waiting') return <p class="faint">{words.tracesWait}</p>;
  if (state.kind === 'failed') return <p class="faint">{state.why}</p>;
  const [first, ...others] = state.traces;
  return (
    <div class="prove-traces">
      {first.signals.map(({ name, values }, i) => (
        <LinePlot
          key={name}
          label={name.replace(/_[a-z]+$/i, '').replace(/_/g, ' ')}
          x={first.t_s}
          series={[
            { label: props.flights[0].label, axis: axisOf(name), values, side: 'A' as const },
            ...others.map((one, k) => ({
              label: props.flights[k + 1]?.label ?? '',
              axis: axisOf(name),
              values: one.signals[i]?.values ?? [],
              x: one.t_s,
              side: 'B' as const,
            })),
          ]}
          xLabel="t"
          xUnit="s"
          yLabel=""
          yUnit={unitOfSignal(name)}
          height={130}
        />
      ))}
    </div>
  );
}

function axisOf(name: string): TraceAxis {
  return name.includes('roll')
    ? 'roll'
    : name.includes('pitch')
      ? 'pitch'
      : name.includes('yaw')
        ? 'yaw'
        : 'ink';
}
