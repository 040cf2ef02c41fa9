/** English texts of the guide for a newcomer: from the demo to an own build, a step at a time. */
import type { PlaceName } from '../store/document.ts';

export interface GuideStep {
  readonly place: PlaceName;
  readonly text: string;
  /** The step offers to start an own craft. */
  readonly own?: true;
}

export const guideTexts = {
  label: 'Guide',
  count: (step: number, all: number) => `Guide ${step} of ${all}`,
  back: 'Step back',
  next: 'Next step',
  goTo: (place: string) => `Go to ${place}`,
  done: 'Guide done',
  hide: 'Hide guide',
  hideHint: 'Help (Alt+H) brings it back',
  own: 'Start my craft',
  ownName: 'My craft',
  ownEdit: 'start an own craft',
} as const;

export const GUIDE_STEPS: readonly GuideStep[] = [
  {
    place: 'fly',
    text: 'Space arms the motors; then hold the climb key named under the view. Let go: the demo craft holds height and place.',
  },
  {
    place: 'fly',
    text: 'Bring wind in from the panel, watch it on the tape. Drag the tape back and fly the moment again with other gains.',
  },
  {
    place: 'shape',
    text: 'Change one gain: the sentence on top names the smallest margin. Ctrl+Z takes it back.',
  },
  {
    place: 'prove',
    text: 'Run one gust trial. Each score stands beside the band that it must keep.',
  },
  {
    place: 'measure',
    text: 'Now your own: start it as a copy of this craft and give it your numbers. The demo stays as it is.',
    own: true,
  },
  {
    place: 'measure',
    text: 'Type what you know: all-up mass, propeller, motor, cells, ESC. A swing test gives the inertia; each worksheet says how.',
  },
  { place: 'shape', text: 'Ask for starting gains for your craft and take them.' },
  { place: 'fly', text: 'Fly it in the wind you expect, then run all trials in Prove.' },
  {
    place: 'carry',
    text: 'Run the sheet’s trials, prove the wind limit, print. Then to the bench, propellers off.',
  },
];
