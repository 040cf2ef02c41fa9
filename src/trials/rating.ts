/**
 * The pilot's own judgement: blind order of two gain sets, and the Cooper–Harper scale (NASA TN D-5153) with
 * its three decisions put in our words.
 */
import { RandomStream } from '../math/random.ts';

/** Order in which A and B are flown, `rounds` of each, fixed by the seed; never three of one in a row. */
export function blindOrder(rounds: number, seed: number): ('A' | 'B')[] {
  const stream = new RandomStream(seed, 'rating.order');
  const order: ('A' | 'B')[] = [];
  const left = { A: rounds, B: rounds };
  while (left.A + left.B > 0) {
    const last = order.at(-1);
    const twice = last !== undefined && order.at(-2) === last;
    let pick: 'A' | 'B' = stream.uniform() < left.A / (left.A + left.B) ? 'A' : 'B';
    if (twice && pick === last) pick = last === 'A' ? 'B' : 'A';
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
