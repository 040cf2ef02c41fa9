/** Trials over node's worker threads: each runs this program's own bundle as a worker. */
import { isMainThread, parentPort, Worker } from 'node:worker_threads';
import { answerTask, type TaskAnswer, type TaskMessage, type TrialWorker } from '../trials/pool.ts';

/** In a worker thread: serves trials and returns true; the command line must then do nothing else. */
export function serveTrialsIfWorker(): boolean {
  if (isMainThread || parentPort === null) return false;
  const port = parentPort;
  port.on('message', (message: TaskMessage) => port.postMessage(answerTask(message)));
  return true;
}

/** A worker thread of the program at `entry` (its own bundle). */
export function threadWorker(entry: URL): TrialWorker {
  const worker = new Worker(entry);
  let dead: (reason: string) => void = () => undefined;
  worker.on('error', (error) => dead(error instanceof Error ? error.message : String(error)));
  worker.on('exit', (code) => {
    if (code !== 0) dead(`exit code ${code}`);
  });
  return {
    send: (message) => worker.postMessage(message),
    onAnswer: (hear) => void worker.on('message', (answer: TaskAnswer) => hear(answer)),
    onDeath: (hear) => {
      let told = false;
      dead = (reason) => {
        if (!told) hear(reason);
        told = true;
      };
    },
    end: () => void worker.terminate(),
  };
}
