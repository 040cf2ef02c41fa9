import { colourOfVariable, dashOf, type TraceAxis } from './lineStyle.ts';

/** A short piece of a trace's line, for legends. */
export function LineSample(props: { axis: TraceAxis; faded?: boolean; thin?: boolean }) {
  return (
    <svg class="line-sample" width="24" height="8" aria-hidden="true">
      <line
        x1="0"
        y1="4"
        x2="24"
        y2="4"
        stroke={colourOfVariable(props.axis)}
        stroke-width={props.thin ? 1 : 2}
        stroke-dasharray={dashOf(props.axis).join(' ')}
        opacity={props.faded ? 0.6 : 1}
      />
    </svg>
  );
}
