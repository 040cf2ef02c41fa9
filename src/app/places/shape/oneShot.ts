/** One question at a time to a worker of its own, with a line in the list of jobs; the answer ends both. */
import { useEffect, useRef, useState } from 'preact/hooks';
import { useStore } from '../../store/context.ts';
import type { FromShapeWorker, ToShapeWorker } from './shape.worker.ts';

type WithoutId<T> = T extends unknown ? Omit<T, 'id'> : never;
export type ShapeQuestion = WithoutId<ToShapeWorker>;

export interface OneShot {
  readonly busy: boolean;
  /** Asks; an earlier question that waits is given up. A refusal becomes a notice. */
  ask(question: ShapeQuestion, hear: (answer: FromShapeWorker) => void): void;
  /** Gives the question up. */
  stop(): void;
}

/** @param label of the job, @param topic under which a refusal is said */
export function useOneShot(label: string, topic: string): OneShot {
  const store = useStore();
  const [busy, setBusy] = useState(false);
  const end = useRef<(() => void) | null>(null);
  const stop = (): void => {
    end.current?.();
    end.current = null;
  };
  useEffect(() => stop, []);
  const ask = (question: ShapeQuestion, hear: (answer: FromShapeWorker) => void): void => {
    stop();
    const worker = new Worker(new URL('./shape.worker.ts', import.meta.url), { type: 'module' });
    const job = store.jobs.start(label, stop);
    end.current = () => {
      worker.terminate();
      job.end();
      setBusy(false);
    };
    worker.onmessage = ({ data }: MessageEvent<FromShapeWorker>) => {
      stop();
      if (data.kind === 'failed') store.notices.tell('error', data.reason, { topic });
      else hear(data);
    };
    worker.onerror = (event) => {
      stop();
      store.notices.tell('error', event.message, { topic });
    };
    worker.postMessage({ ...question, id: 0 });
    setBusy(true);
  };
  return { busy, ask, stop };
}
