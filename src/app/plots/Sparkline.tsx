import { colourOfVariable, type TraceAxis } from './lineStyle.ts';

/** A trace in the size of a word; decoration beside numbers, unseen by screen readers. */
export function Sparkline(props: {
  values: ArrayLike<number>;
  axis?: TraceAxis;
  width?: number;
  height?: number;
}) {
  const { values, axis = 'ink', width = 90, height = 20 } = props;
  let low = Infinity;
  let high = -Infinity;
  for (let i = 0; i < values.length; i++) {
    if (values[i] < low) low = values[i];
    if (values[i] > high) high = values[i];
  }
  const tall = high > low ? high - low : 1;
  const points: string[] = [];
  // No more points than half pixels: the rest could not be seen.
  const stride = Math.max(1, Math.floor(values.length / (2 * width)));
  for (let i = 0; i < values.length; i += stride) {
    const x = (i / Math.max(1, values.length - 1)) * width;
    const y = height - 1 - ((values[i] - low) / tall) * (height - 2);
    if (Number.isFinite(y)) points.push(`${x.toFixed(1)},${y.toFixed(1)}`);
  }
  return (
    <svg class="sparkline" width={width} height={height} aria-hidden="true">
      <polyline points={points.join(' ')} fill="none" stroke={colourOfVariable(axis)} stroke-width="1.2" />
    </svg>
  );
}
