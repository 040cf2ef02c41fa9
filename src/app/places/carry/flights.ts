/** Flies tasks for the sheet over the browser's workers, with the job's progress and a stop. */
import { runTasks, type PoolRun } from '../../../trials/pool.ts';
import type { TrialTask } from '../../../trials/runTrial.ts';
import type { TrialResult } from '../../../trials/trial.ts';
import type { JobList } from '../../store/jobs.ts';
import { webWorker, workerCount } from '../prove/browserPool.ts';

export interface SheetFlights {
  /** Results in the order of the tasks, null where there is none; null as a whole when stopped. */
  readonly done: Promise<readonly (TrialResult | null)[] | null>;
  cancel(): void;
}

/** @param label of the job in the top line */
export function flyForSheet(tasks: readonly TrialTask[], jobs: JobList, label: string): SheetFlights {
  const found = new Array<TrialResult | null>(tasks.length).fill(null);
  const run: PoolRun = runTasks(webWorker, workerCount(), {
    count: tasks.length,
    taskAt: (index) => tasks[index],
    hear: (index, answer) => {
      if (answer.kind === 'done') found[index] = answer.result;
    },
    progress: ({ done, count }) => job.progress(done / count),
  });
  const job = jobs.start(label, () => run.cancel());
  const done = run.done.then(({ end }) => (end === 'cancelled' ? null : found)).finally(() => job.end());
  return { done, cancel: () => run.cancel() };
}
