import { useEffect, useRef } from 'preact/hooks';

/** Starts a worker for as long as the component lives. */
export function useShapeWorker(): { current: Worker | null } {
  const worker = useRef<Worker | null>(null);
  useEffect(() => {
    const one = new Worker(new URL('./shape.worker.ts', import.meta.url), { type: 'module' });
    worker.current = one;
    return () => {
      worker.current = null;
      one.terminate();
    };
  }, []);
  return worker;
}
