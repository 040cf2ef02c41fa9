/** Web Workers as the trials' pool. */
import type { TrialWorker } from '../../../trials/pool.ts';
import { webTrialWorker } from '../../../trials/webWorker.ts';

/** Every core: while somebody flies, the pool waits (see runs.ts). */
export function workerCount(): number {
  return Math.max(1, Math.min(16, navigator.hardwareConcurrency));
}

export function webWorker(): TrialWorker {
  return webTrialWorker(new Worker(new URL('./trials.worker.ts', import.meta.url), { type: 'module' }));
}
