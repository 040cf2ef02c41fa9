/** The check by simulation: asks the worker to fly the sweep; what it said is of one build, gain set and axis. */
import { useEffect, useState } from 'preact/hooks';
import type { Build } from '../../../craft/build.ts';
import type { AxisName, Gains } from '../../../craft/gains.ts';
import type { SweepCheck, SweepOptions } from '../../../shaping/sweepCheck.ts';
import { useOneShot } from './oneShot.ts';
import { shapeTexts } from './texts.ts';

export interface FlightCheck {
  readonly check: SweepCheck | null;
  readonly busy: boolean;
  run(): void;
}

/** @param options null: the flight is a hover, and the model on the page is of another trim */
export function useFlightCheck(
  build: Build,
  gains: Gains,
  axis: AxisName,
  options: SweepOptions | null,
): FlightCheck {
  const [check, setCheck] = useState<SweepCheck | null>(null);
  const flight = useOneShot(shapeTexts.flown.job, 'shape:sweep');
  // Another loop's measurement must not stand beside this one's curves.
  useEffect(() => {
    setCheck(null);
    return flight.stop;
  }, [build, gains, axis, options]);
  const run = (): void => {
    if (options === null) return;
    flight.ask({ kind: 'sweep', build, gains, axis, options }, (answer) => {
      if (answer.kind === 'swept') setCheck(answer.check);
    });
  };
  return { check, busy: flight.busy, run };
}
