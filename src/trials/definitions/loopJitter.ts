/** A controller that is late at random and sometimes misses a tick. */
import { faulty } from './faulty.ts';

export const loopJitter = faulty({
  name: 'loop-jitter',
  title: 'Late and jittering loop',
  purpose: 'Commands up to half a tick late at random and one tick in fifty missed, in a gust.',
  parameters: {
    jitter: { value: 0.5, least: 0, most: 5, meaning: 'greatest lateness as a share of the loop period' },
    missed: { value: 0.02, least: 0, most: 0.5, meaning: 'share of ticks missed' },
  },
  faults: (_build, gains, p) => [
    { kind: 'late-loop', delay_s: 0, jitter_s: p.jitter / gains.loop_Hz, missedTickShare: p.missed },
  ],
});
