/** Lanes of the flight tape: the three rates, the terms of one axis, the four commands, the battery. */
import { CORNERS } from '../../../craft/build.ts';
import type { AxisName } from '../../../craft/gains.ts';
import { signalIndex } from '../../../flight/signals.ts';
import type { TapeLane } from '../../plots/tapePainter.ts';
import { flyTexts } from './texts.ts';

const words = flyTexts.lanes;

function rateLane(axis: AxisName): TapeLane {
  return {
    label: words[axis],
    unit: 'deg/s',
    leastScale: 5,
    traces: [
      { label: words.gyro, channel: signalIndex(`gyro_${axis}_dps`), axis: 'faint', behind: true },
      { label: words.setpoint, channel: signalIndex(`sp_${axis}_dps`), axis: 'ink' },
      { label: words.rate, channel: signalIndex(`rate_${axis}_dps`), axis },
    ],
  };
}

/** All lanes, with the terms of `axis`. */
export function flightLanes(
  axis: AxisName,
  escRange: readonly [number, number],
  volts: readonly [number, number],
): TapeLane[] {
  return [
    rateLane('roll'),
    rateLane('pitch'),
    rateLane('yaw'),
    {
      label: `${words.terms}${axis}`,
      unit: 'µs',
      leastScale: 10,
      traces: [
        { label: words.p, channel: signalIndex(`p_${axis}_us`), axis: 'roll' },
        { label: words.i, channel: signalIndex(`i_${axis}_us`), axis: 'pitch' },
        { label: words.d, channel: signalIndex(`d_${axis}_us`), axis: 'yaw' },
      ],
    },
    {
      label: words.commands,
      unit: 'µs',
      range: escRange,
      weight: 1.3,
      saturation: CORNERS.map((corner) => signalIndex(`saturated_${corner}`)),
      traces: CORNERS.map((corner, i) => ({
        label: corner,
        channel: signalIndex(`cmd_${corner}_us`),
        axis: (['roll', 'pitch', 'yaw', 'ink'] as const)[i],
      })),
    },
    {
      label: words.battery,
      unit: 'V',
      range: volts,
      weight: 0.6,
      traces: [{ label: words.battery, channel: signalIndex('battery_V'), axis: 'ink' }],
    },
  ];
}
