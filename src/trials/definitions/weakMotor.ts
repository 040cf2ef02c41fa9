/** One rotor that gives less than the others. */
import { faulty } from './faulty.ts';

export const weakMotor = faulty({
  name: 'weak-motor',
  title: 'One weak motor',
  purpose: 'The front left rotor gives four fifths of its thrust at any command, in a gust.',
  parameters: { share: { value: 0.8, least: 0, most: 1, meaning: 'thrust left' } },
  faults: (_build, _gains, p) => [{ kind: 'weak-motor', corner: 'FL', share: p.share }],
});
