/** Web Workers as the trials' pool; one core is left to the page. */
import type { TaskAnswer, TrialWorker } from '../../../trials/pool.ts';

export function workerCount(): number {
  return Math.max(1, Math.min(8, navigator.hardwareConcurrency));
}

export function webWorker(): TrialWorker {
  const worker = new Worker(new URL('./trials.worker.ts', import.meta.url), { type: 'module' });
  return {
    send: (message) => worker.postMessage(message),
    onAnswer: (hear) => {
      worker.onmessage = ({ data }: MessageEvent<TaskAnswer>) => hear(data);
    },
    onDeath: (hear) => {
      worker.onerror = (event) => hear(event.message || 'stopped');
    },
    end: () => worker.terminate(),
  };
}
