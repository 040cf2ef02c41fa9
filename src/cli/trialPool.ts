/** Trials over node's worker threads: each runs this program's own bundle as a worker. */
import { isMainThread, parentPort, Worker } from 'node:worker_threads';
import type { TrialWorker } from '../trials/pool.ts';
import { serveTrials, type TaskAnswer, type TaskMessage } from '../trials/protocol.ts';

/** In a worker thread: serves trials and returns true; the command line must then do nothing else. */
export function serveTrialsIfWorker(): boolean {
  if (isMainThread || parentPort === null) return false;
  const port = parentPort;
  serveTrials({
    post: (answer) => port.postMessage(answer),
    listen: (hear) => void port.on('message', (message: TaskMessage) => hear(message)),
  });
  return true;
}

/** A worker thread of the program at `entry` (its own bundle). */
export function threadWorker(entry: URL): TrialWorker {
  const worker = new Worker(entry);
  let over = false;
  let dead: (reason: string) => void = () => undefined;
  const die = (reason: string): void => {
    if (over) return;
    over = true;
    dead(reason);
  };
  worker.on('error', (error) => die(error instanceof Error ? error.message : String(error)));
  // A thread that leaves by itself, well or not, answers no more.
  worker.on('exit', (code) => die(`the thread ended with code ${code}`));
  return {
    send: (message) => worker.postMessage(message),
    onAnswer: (hear) => void worker.on('message', (answer: TaskAnswer) => hear(answer)),
    onDeath: (hear) => {
      dead = hear;
    },
    end: () => {
      over = true;
      void worker.terminate();
    },
  };
}
