/**
 * The pilot's own judgement: blind order of two gain sets, the Cooper–Harper scale (NASA TN D-5153) with its
 * three decisions put in our words, and how busy the hands were.
 */
import type { Recorder } from '../flight/record.ts';
import { RandomStream } from '../math/random.ts';
import { motorActivity_us, peakDrift_m, peakTilt_deg, rateError_dps, saturation_pct } from './measures.ts';

export type GainSide = 'A' | 'B';

/** Order in which A and B are flown, `rounds` of each, fixed by the seed; as a rule no three of one in a row. */
export function blindOrder(rounds: number, seed: number): GainSide[] {
  const stream = new RandomStream(seed, 'rating.order');
  const order: GainSide[] = [];
  const left = { A: rounds, B: rounds };
  while (left.A + left.B > 0) {
    const last = order.at(-1);
    const twice = last !== undefined && order.at(-2) === last;
    let pick: GainSide = stream.uniform() < left.A / (left.A + left.B) ? 'A' : 'B';
    if (twice && pick === last) pick = last === 'A' ? 'B' : 'A';
    // The rule gives way to the count: what is left is flown.
    if (left[pick] === 0) pick = pick === 'A' ? 'B' : 'A';
    left[pick]--;
    order.push(pick);
  }
  return order;
}

export interface RatingQuestion {
  readonly question: string;
  /** Ratings that a "no" leads to. */
  readonly ifNo: readonly number[];
}

/** Asked in this order; three times yes leads to 1, 2 or 3. */
export const RATING_QUESTIONS: readonly RatingQuestion[] = [
  { question: 'Could you keep control of it throughout?', ifNo: [10] },
  { question: 'Was the performance you need within reach, with work you could bear?', ifNo: [7, 8, 9] },
  { question: 'Was it good enough as it is, with nothing that asks for a change?', ifNo: [4, 5, 6] },
];

export const RATING_WORDS: Readonly<Record<number, string>> = {
  1: 'Nothing to wish for; no thought given to control',
  2: 'Good; hardly any compensation',
  3: 'Fair; small compensation now and then',
  4: 'Small but annoying faults; moderate compensation',
  5: 'Moderate faults; considerable compensation',
  6: 'Very tiring faults; all the compensation one can give',
  7: 'Performance out of reach, control not in question',
  8: 'Control takes considerable work',
  9: 'Control takes all one has',
  10: 'Control is lost at some point',
};

/** Ratings still open after the answers so far. */
export function ratingsOpen(answers: readonly boolean[]): readonly number[] {
  for (let k = 0; k < answers.length; k++) if (!answers[k]) return RATING_QUESTIONS[k].ifNo;
  return answers.length === RATING_QUESTIONS.length ? [1, 2, 3] : Object.keys(RATING_WORDS).map(Number);
}

export interface StickActivity {
  /** Root mean square of deflection about its mean, share of full stick. */
  readonly rmsDeflection: number;
  /** Root mean square of the stick's speed, full sticks a second. */
  readonly rmsSpeed_per_s: number;
  /** Changes of direction a second, counted when the stick came back by more than REVERSAL. */
  readonly reversals_per_s: number;
}

/** Movement that counts as one, share of full stick; common practice, no source. */
const REVERSAL = 0.02;

/** How busy one stick was. @param stick −1…1 (or 0…1) at equal steps of `dt_s` */
export function stickActivity(stick: ArrayLike<number>, dt_s: number): StickActivity {
  const count = stick.length;
  if (count < 2) return { rmsDeflection: 0, rmsSpeed_per_s: 0, reversals_per_s: 0 };
  let sum = 0;
  for (let k = 0; k < count; k++) sum += stick[k];
  const mean = sum / count;
  let square = 0;
  let speed = 0;
  for (let k = 0; k < count; k++) {
    square += (stick[k] - mean) ** 2;
    if (k > 0) speed += ((stick[k] - stick[k - 1]) / dt_s) ** 2;
  }
  return {
    rmsDeflection: Math.sqrt(square / count),
    rmsSpeed_per_s: Math.sqrt(speed / (count - 1)),
    reversals_per_s: reversals(stick) / ((count - 1) * dt_s),
  };
}

/** Roll and pitch stick of one hand together: rms of both, reversals of both. @param dt_s between samples */
export function handActivity(roll: ArrayLike<number>, pitch: ArrayLike<number>, dt_s: number): StickActivity {
  const [a, b] = [stickActivity(roll, dt_s), stickActivity(pitch, dt_s)];
  return {
    rmsDeflection: Math.hypot(a.rmsDeflection, b.rmsDeflection),
    rmsSpeed_per_s: Math.hypot(a.rmsSpeed_per_s, b.rmsSpeed_per_s),
    reversals_per_s: a.reversals_per_s + b.reversals_per_s,
  };
}

function reversals(stick: ArrayLike<number>): number {
  let turns = 0;
  let direction = 0;
  let extreme = stick[0];
  for (let k = 1; k < stick.length; k++) {
    const moved = stick[k] - extreme;
    if (direction === 0 ? Math.abs(moved) > REVERSAL : moved * direction < -REVERSAL) {
      if (direction !== 0) turns++;
      direction = Math.sign(moved);
      extreme = stick[k];
    } else if (moved * direction > 0) {
      extreme = stick[k];
    }
  }
  return turns;
}

/** One flight by hand with what the pilot said of it: plain data, to be kept and put side by side. */
export interface RatedFlight {
  /** Which set it was; shown only when all flights are rated. */
  readonly set: GainSide;
  readonly seed: number;
  readonly rating: number;
  readonly note: string;
  readonly activity: StickActivity;
  readonly scores: readonly { readonly name: string; readonly unit: string; readonly value: number }[];
}

/** Scores of a flight by hand, from a record with TRIAL_SIGNALS, rows [from, to). */
export function handScores(record: Recorder, from = 0, to = record.length): RatedFlight['scores'] {
  return [
    { name: 'peak tilt', unit: 'deg', value: peakTilt_deg(record, from, to) },
    { name: 'peak drift', unit: 'm', value: peakDrift_m(record, from, to) },
    { name: 'rms rate error', unit: 'deg/s', value: rateError_dps(record, from, to) },
    { name: 'motor activity', unit: 'µs rms', value: motorActivity_us(record, from, to) },
    { name: 'saturation', unit: '%', value: saturation_pct(record, from, to) },
  ];
}
