/** Centre of mass off its place, as after a badly stowed battery. */
import { faulty } from './faulty.ts';

export const shiftedCentre = faulty({
  name: 'shifted-centre',
  title: 'Shifted centre of mass',
  purpose:
    'Centre of mass a tenth of the rotors’ reach ahead and to the right of where it was measured, in a gust.',
  parameters: {
    share: { value: 0.1, least: 0, most: 0.5, meaning: 'shift as a share of the rotors’ reach' },
  },
  faults: (build, _gains, p) => {
    const reach_m = Math.max(...build.rotors.map(({ position_m: [x, y] }) => Math.hypot(x, y)));
    const shift_m = p.share * reach_m * Math.SQRT1_2;
    return [{ kind: 'shifted-payload', shift_m: [shift_m, shift_m, 0] }];
  },
});
