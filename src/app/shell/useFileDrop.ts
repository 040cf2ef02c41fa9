import { useEffect, useState } from 'preact/hooks';
import { openFile } from '../storage/openFile.ts';
import { useStore } from '../store/context.ts';

/** Files dropped anywhere on the page are opened. Returns whether a file hangs over the page now. */
export function useFileDrop(): boolean {
  const store = useStore();
  const [over, setOver] = useState(false);
  useEffect(() => {
    const hangs = (event: DragEvent): void => {
      if (event.dataTransfer?.types.includes('Files') !== true) return;
      event.preventDefault();
      setOver(true);
    };
    const leaves = (event: DragEvent): void => {
      if (event.relatedTarget === null) setOver(false);
    };
    const drops = (event: DragEvent): void => {
      setOver(false);
      // A drop field inside the page has taken it.
      if (event.defaultPrevented) return;
      event.preventDefault();
      void openAll([...(event.dataTransfer?.files ?? [])]);
    };
    const openAll = async (files: readonly File[]): Promise<void> => {
      for (const file of files) await openFile(store, file);
    };
    window.addEventListener('dragover', hangs);
    window.addEventListener('dragleave', leaves);
    window.addEventListener('drop', drops);
    return () => {
      window.removeEventListener('dragover', hangs);
      window.removeEventListener('dragleave', leaves);
      window.removeEventListener('drop', drops);
    };
  }, [store]);
  return over;
}
