/** A flight by hand for a rating: worker, seat, keys; what the ring holds of it as a record. */
import { signal } from '@preact/signals';
import { OPEN_FIELD } from '../../../craft/scene.ts';
import { describeProblem } from '../../../craft/problem.ts';
import type { Build } from '../../../craft/build.ts';
import type { Gains } from '../../../craft/gains.ts';
import type { Wind } from '../../../craft/wind.ts';
import { Recorder } from '../../../flight/record.ts';
import { SIGNAL_NAMES, signalIndex } from '../../../flight/signals.ts';
import { TRIAL_SIGNALS } from '../../../trials/measures.ts';
import { handActivity, handScores, type RatedFlight } from '../../../trials/rating.ts';
import type { KeyMap } from '../../input/keyMap.ts';
import { Seat } from '../../input/seat.ts';
import { oldestRow, type SignalRing } from '../../plots/ring.ts';
import { startFlightClient } from '../../worker/client.ts';

/** What is flown. */
export interface HandFlight {
  readonly build: Build;
  readonly gains: Gains;
  readonly wind: Wind;
  readonly seed: number;
  readonly duration_s: number;
}

export interface Flown extends Pick<RatedFlight, 'activity' | 'scores'> {
  /** Why it ended early; null when it did not. */
  readonly stopped: string | null;
}

const HEIGHT_M = 8;
/** Sticks are noted at this step of flight time, s. */
const STICK_STEP_S = 0.02;
const TOUCHING = signalIndex('touching');

/** A pilot at the sticks from the first tick to the last. */
export class HandPilot {
  readonly client = startFlightClient();
  readonly seat: Seat;
  readonly left_s = signal(0);
  private readonly roll: number[] = [];
  private readonly pitch: number[] = [];
  private over = false;

  constructor(
    private readonly flight: HandFlight,
    sticksKept: (id: string) => unknown,
    keys: KeyMap,
    private readonly onOver: (flown: Flown) => void,
    private readonly onLost: (why: string) => void,
  ) {
    this.seat = new Seat(sticksKept);
    this.seat.keys.bind(keys);
    this.left_s.value = flight.duration_s;
    this.client.onRefused = (file, problems) => this.lose(describeProblem(file, problems[0]));
    this.client.onStalled = () => this.lose('the page was away');
    this.client.onFailed = (what) => this.lose(what);
    this.seat.arm(true);
    this.seat.advance(0, false);
    this.client.setSticks(this.seat.sticks);
    const { build, gains, wind, seed } = flight;
    this.client.begin(
      { build, gains, wind, scene: OPEN_FIELD, seed, faults: [], noiseScale: 1, vibrationScale: 1 },
      { kind: 'hover', height_m: HEIGHT_M },
    );
  }

  /** Once a frame: inputs on, sticks out, the clock. */
  beat(dt_s: number): void {
    if (this.over) return;
    const { newest, state } = this.client;
    const time_s = newest[0] ?? 0;
    this.seat.advance(dt_s, newest[TOUCHING] > 0.5);
    this.client.setSticks(this.seat.sticks);
    while (this.roll.length * STICK_STEP_S <= time_s) {
      this.roll.push(this.seat.sticks.roll);
      this.pitch.push(this.seat.sticks.pitch);
    }
    this.left_s.value = Math.max(0, Math.ceil(this.flight.duration_s - time_s));
    const { stopped } = state.value;
    if (stopped !== null || time_s >= this.flight.duration_s) this.finish(stopped?.what ?? null);
  }

  end(): void {
    this.over = true;
    this.client.end();
  }

  private finish(stopped: string | null): void {
    this.over = true;
    this.client.setSpeed(0);
    this.onOver({
      activity: handActivity(this.roll, this.pitch, STICK_STEP_S),
      scores: handScores(recordOf(this.client.ring)),
      stopped,
    });
  }

  private lose(why: string): void {
    if (this.over) return;
    this.over = true;
    this.onLost(why);
  }
}

/** Rows of the ring as a record that the trials' measures read. */
function recordOf(ring: SignalRing): Recorder {
  const record = new Recorder(TRIAL_SIGNALS, ring.written);
  const row = new Float64Array(SIGNAL_NAMES.length);
  for (let n = oldestRow(ring); n < ring.written; n++) {
    const place = n % ring.capacity;
    for (let i = 0; i < row.length; i++) row[i] = ring.channels[i][place];
    row[0] = ring.time_s[place];
    record.take(row);
  }
  return record;
}
