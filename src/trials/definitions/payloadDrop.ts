/** The payload is let go in hover: mass, balance and trim change at once. */
import { CALM } from '../../craft/wind.ts';
import { defineTrial } from '../trial.ts';
import { heldScores, MOORED_SIGNALS, moor } from './moored.ts';

const DURATION_S = 6;

export const payloadDrop = defineTrial({
  name: 'payload-drop',
  title: 'Payload drop',
  purpose: 'The payload is let go in hover: mass, balance and trim change at once.',
  parameters: { drop_s: { value: 1.5, least: 0.5, most: 5, meaning: 'when it is let go' } },
  scores: heldScores(12, 1, DURATION_S),
  traceSignals: MOORED_SIGNALS,
  duration_s: () => DURATION_S,
  start: () => ({ kind: 'hover', height_m: 8 }),
  wind: () => CALM,
  scored: (p) => [p.drop_s - 0.1, DURATION_S],
  inapplicable: (build) => (build.payload === undefined ? 'the build has no payload' : null),
  sticks: (time_s, sticks, flight, p) => {
    moor(time_s, sticks);
    if (time_s >= p.drop_s && !flight.payloadDropped) flight.dropPayload();
  },
});
