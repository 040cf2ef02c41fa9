/** A propeller that lost a piece: less thrust and much vibration. */
import { faulty } from './faulty.ts';

export const chippedPropeller = faulty({
  name: 'chipped-propeller',
  title: 'Chipped propeller',
  purpose:
    'The rear right propeller lost a piece: a tenth less thrust and six times the vibration, in a gust.',
  parameters: {
    share: { value: 0.9, least: 0.2, most: 1, meaning: 'thrust left' },
    imbalance: { value: 6, least: 1, most: 100, meaning: 'vibration over that of a sound propeller' },
  },
  faults: (_build, _gains, p) => [
    { kind: 'chipped-propeller', corner: 'RR', share: p.share, imbalance: p.imbalance },
  ],
});
