/** The page's start from what was kept: within a moment, whatever the browser's storage does. */
import { DEFAULT_SETTINGS, type WorkDocument } from '../store/document.ts';
import { firstDocument } from '../store/demos.ts';
import { en } from '../texts/en.ts';
import { LaterVersionError, WorkStorage, type LoadedWork, type StorageEvents } from './workStorage.ts';

/** A store that does not answer by then is left alone; the page starts without it. */
const PATIENCE_MS = 3000;

export interface OpenedWork {
  readonly document: WorkDocument;
  readonly storage: WorkStorage | null;
  /** Why there is no storage; empty when there is. */
  readonly reason: string;
  readonly aside: LoadedWork['aside'];
}

export async function openWork(events: StorageEvents): Promise<OpenedWork> {
  const patience = new Promise<never>((_, reject) => {
    setTimeout(() => reject(new Error(en.save.silent)), PATIENCE_MS);
  });
  try {
    const opened = WorkStorage.open(events).then(async (storage) => ({
      storage,
      loaded: await storage.load(),
    }));
    const { storage, loaded } = await Promise.race([opened, patience]);
    return { storage, document: documentFrom(loaded), reason: '', aside: loaded.aside };
  } catch (error) {
    const reason =
      error instanceof LaterVersionError
        ? en.save.later
        : error instanceof Error
          ? error.message
          : String(error);
    return { storage: null, document: firstDocument(), reason, aside: [] };
  }
}

/** What was kept, with the demos in place of what is not there. */
function documentFrom(loaded: LoadedWork): WorkDocument {
  const first = firstDocument();
  if (loaded.crafts.length === 0) {
    return {
      ...first,
      desk: { ...first.desk, ...withoutId(loaded.desk) },
      settings: loaded.settings ?? DEFAULT_SETTINGS,
    };
  }
  const desk = loaded.desk ?? { ...first.desk, currentId: loaded.crafts[0].id };
  return { crafts: loaded.crafts, desk, settings: loaded.settings };
}

function withoutId(desk: LoadedWork['desk']): Partial<WorkDocument['desk']> {
  return desk === null ? {} : { side: desk.side, place: desk.place, wind: desk.wind, scene: desk.scene };
}
