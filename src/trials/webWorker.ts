/** Trials over a worker of the browser, as the pool sees it. The worker itself runs `serveTrials`. */
import type { TaskAnswer } from './protocol.ts';
import type { TrialWorker } from './pool.ts';

/** What this needs of a Worker; a test may give its own. */
export type WorkerLike = Pick<
  Worker,
  'postMessage' | 'terminate' | 'onmessage' | 'onerror' | 'onmessageerror'
>;

export function webTrialWorker(worker: WorkerLike): TrialWorker {
  let told = false;
  let dead: (reason: string) => void = () => undefined;
  const die = (reason: string): void => {
    if (told) return;
    told = true;
    worker.terminate();
    dead(reason);
  };
  worker.onerror = (event) =>
    die(event.message === '' || event.message === undefined ? 'the worker could not run' : event.message);
  worker.onmessageerror = () => die('an answer could not be read');
  return {
    send: (message) => worker.postMessage(message),
    onAnswer: (hear) => {
      worker.onmessage = (event: MessageEvent<TaskAnswer>) => hear(event.data);
    },
    onDeath: (hear) => {
      dead = hear;
    },
    end: () => {
      told = true;
      worker.terminate();
    },
  };
}
