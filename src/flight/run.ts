/** Runs a flight from start to end as fast as it goes, recording every tick. */
import { Flight, type FlightSetup, type Stopped } from './flight.ts';
import type { Sticks } from './pilot.ts';
import { Recorder } from './record.ts';

export interface FlightResult {
  readonly flight: Flight;
  readonly record: Recorder;
  readonly stopped: Stopped | null;
}

/**
 * Flies `duration_s` with sticks from `sticksAt`, which fills and returns one object of its own.
 * @param names signals to record (RECORD_SIGNALS when absent)
 * @param onTick called after each tick; returning false ends the flight
 */
export function runFlight(
  setup: FlightSetup,
  duration_s: number,
  sticksAt: (time_s: number, flight: Flight) => Sticks,
  names?: readonly string[],
  onTick?: (flight: Flight) => boolean | void,
): FlightResult {
  const flight = new Flight(setup);
  const ticks = Math.round(duration_s * setup.gains.loop_Hz);
  const record = new Recorder(names, Math.max(16, Math.min(ticks, 1 << 20)));
  for (let k = 0; k < ticks && flight.stopped === null; k++) {
    flight.tick(sticksAt(flight.time_s, flight));
    record.take(flight.signals);
    if (onTick?.(flight) === false) break;
  }
  return { flight, record, stopped: flight.stopped };
}
