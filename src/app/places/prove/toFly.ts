/** From a result to the flight: a cell of a sweep or a sample of a spread, laid on the desk so that undo takes it back. */
import { resolve } from '../../../trials/overrides.ts';
import { trialByName } from '../../../trials/registry.ts';
import type { TrialTask } from '../../../trials/runTrial.ts';
import { cellTask } from '../../../trials/sweep.ts';
import type { SweepCells } from '../../../trials/sweepResult.ts';
import { useRunning, useStore } from '../../store/context.ts';
import { lasting } from './shared.ts';
import type { Place } from './sweepView.ts';
import { proveTexts as words } from './texts.ts';

/** Brings what a task flies to Fly: its gains as B, or a craft of its own where its build is another. */
export function useFlyTask(): (task: TrialTask, name: string) => void {
  const store = useStore();
  const running = useRunning();
  return (task, name) => {
    store.attempt({}, () => {
      const { build, gains, wind } = resolve(trialByName(task.trial), task, task.overrides ?? {});
      const touched = Object.keys(task.overrides ?? {}).some((path) => path.startsWith('wind.'));
      // A single gust early in a trial would be over before the craft has left the ground.
      const taken = touched || task.wind != null || lasting(wind) ? wind : null;
      if (store.bringToDesk({ build, gains, wind: taken, name }, words.edits.toDesk).length > 0) return;
      running.set('flight.seed', task.seed);
      location.hash = '#/fly';
    });
  };
}

export function useFlyCell(cells: SweepCells): (place: Place) => void {
  const fly = useFlyTask();
  const { sweep, subject } = cells;
  return (place) => fly(cellTask(sweep, subject, place), words.cellName(subject.build.name));
}
