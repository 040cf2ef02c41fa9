/** Keeps the work written down while the person goes on: soon after each change, one save at a time. */
import { effect } from '@preact/signals';
import type { SaveState, Store } from '../store/store.ts';
import { withMerge, type Merge } from './merge.ts';
import type { WorkStorage } from './workStorage.ts';

/** A change is on its way to the disk this soon; edits meanwhile go with it. */
const SAVE_AFTER_MS = 120;
const RETRY_AFTER_MS = 5000;
const CHANNEL = 'gustbench';

export interface Autosave {
  /** Writes what is unwritten; resolves when it is on the disk or has failed (see the store's saveState). */
  flush(): Promise<void>;
  /** No more saves from here; `reason` is shown. */
  stop(reason: string): void;
}

/** Starts saving `store` to `storage`, and following what other windows save. */
export function startAutosave(store: Store, storage: WorkStorage, onQuota: () => void): Autosave {
  const words = store.texts.save;
  const channel = typeof BroadcastChannel === 'undefined' ? null : new BroadcastChannel(CHANNEL);
  let timer: ReturnType<typeof setTimeout> | null = null;
  let chain: Promise<void> = Promise.resolve();
  let stopped = false;

  const state = (next: SaveState): void => {
    store.saveState.value = next;
  };
  const take = (snapshot: ReturnType<Store['document']>, merge: Merge): void => {
    store.adoptCrafts(withMerge(store.crafts.value, snapshot.crafts, merge.crafts));
    for (const name of merge.taken) store.notices.tell('info', words.taken(name), { topic: `taken:${name}` });
    for (const name of merge.both)
      store.notices.tell('warning', words.otherNewer(name), { topic: `both:${name}` });
  };
  const saveOnce = async (): Promise<void> => {
    const snapshot = store.document();
    if (stopped || !storage.hasUnwritten(snapshot)) return;
    try {
      const { revision, merge } = await storage.save(snapshot);
      take(snapshot, merge);
      store.notices.settle('save');
      channel?.postMessage({ revision });
      if (storage.hasUnwritten(store.document())) schedule(SAVE_AFTER_MS);
      else state({ kind: 'saved', revision });
    } catch (error) {
      if (stopped) return;
      fail(error);
    }
  };
  const fail = (error: unknown): void => {
    const full = error instanceof DOMException && error.name === 'QuotaExceededError';
    const reason = full ? words.quota : error instanceof Error ? error.message : String(error);
    state({ kind: 'failed', reason });
    store.notices.tell('error', words.failedLong(reason), {
      topic: 'save',
      action: { label: words.exportNow, run: onQuota },
    });
    schedule(RETRY_AFTER_MS);
  };
  const enqueue = (work: () => Promise<void>): Promise<void> => {
    chain = chain.then(work, work);
    return chain;
  };
  const schedule = (after_ms: number): void => {
    if (stopped || timer !== null) return;
    timer = setTimeout(() => {
      timer = null;
      void enqueue(saveOnce);
    }, after_ms);
  };
  const flush = (): Promise<void> => {
    if (timer !== null) clearTimeout(timer);
    timer = null;
    return enqueue(saveOnce);
  };

  const endEffect = effect(() => {
    const document = { crafts: store.crafts.value, desk: store.desk.value, settings: store.settings.value };
    if (stopped) return;
    if (!storage.hasUnwritten(document)) {
      if (store.saveState.peek().kind === 'off') state({ kind: 'saved', revision: null });
      return;
    }
    if (store.saveState.peek().kind !== 'failed') state({ kind: 'pending' });
    schedule(SAVE_AFTER_MS);
  });
  const follow = (): void => {
    void enqueue(async () => {
      if (stopped) return;
      const snapshot = store.document();
      take(snapshot, await storage.pull(snapshot));
    });
  };
  channel?.addEventListener('message', follow);
  return {
    flush,
    stop: (reason) => {
      stopped = true;
      if (timer !== null) clearTimeout(timer);
      endEffect();
      channel?.close();
      state({ kind: 'off', reason });
    },
  };
}
