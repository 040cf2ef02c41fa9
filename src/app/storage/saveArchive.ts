import type { Store } from '../store/store.ts';
import { saveFile } from './saveFile.ts';

/** Everything on the bench as one file for the person to keep. */
export async function saveArchive(store: Store): Promise<void> {
  const { writeArchive } = await import('./archive.ts');
  const now = new Date();
  saveFile(
    `gustbench-${now.toISOString().slice(0, 10)}.zip`,
    writeArchive(store.document(), now),
    'application/zip',
  );
}
