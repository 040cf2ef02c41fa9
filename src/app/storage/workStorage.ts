/** The work in IndexedDB: read once at the start, written in single transactions, shared by all windows. */
import { openDB, type DBSchema, type IDBPDatabase, type IDBPTransaction } from 'idb';
import { InputError } from '../../craft/problem.ts';
import type { CraftWork, Desk, Settings, WorkDocument } from '../store/document.ts';
import { mergeCrafts, plain, type Known, type Merge } from './merge.ts';
import { LAYOUT, readCraftRecord, readDesk, readSettings, type CraftRecord } from './records.ts';

const NAME = 'gustbench';
/** Version 1 had no `aside`. */
const VERSION = 2;

/** A record that could not be read, kept for the person to decide. */
export interface AsideRecord {
  readonly id: number;
  readonly name: string;
  readonly reason: string;
  readonly putAsideAt: string;
  readonly content: unknown;
}

interface Schema extends DBSchema {
  crafts: { key: string; value: unknown };
  desk: { key: string; value: unknown };
  aside: { key: number; value: Omit<AsideRecord, 'id'> & { id?: number } };
}
type Stores = ('crafts' | 'desk' | 'aside')[];
type Writing = IDBPTransaction<Schema, Stores, 'readwrite'>;

export interface LoadedWork {
  /** What could be read; a part is null when it was never written or is lost. */
  readonly crafts: readonly CraftWork[];
  readonly desk: Desk | null;
  readonly settings: Settings;
  /** What was put aside in this load, with the reason. */
  readonly aside: readonly { readonly name: string; readonly reason: string }[];
}

export interface SavedWork {
  readonly revision: number;
  readonly merge: Merge;
}

export interface StorageEvents {
  /** A later version of the program waits to change the store's form: this window has to let go. */
  readonly onClosedForUpdate: () => void;
}

/** The store was written by a later version of the program. */
export class LaterVersionError extends Error {}

export class WorkStorage {
  private known = new Map<string, Known>();
  private deskWritten: Desk | null = null;
  private settingsWritten: Settings | null = null;

  private constructor(private readonly db: IDBPDatabase<Schema>) {}

  /** @throws LaterVersionError, or what the browser says when it has no store for this page. */
  static async open(events: StorageEvents): Promise<WorkStorage> {
    try {
      const db = await openDB<Schema>(NAME, VERSION, {
        upgrade(database, oldVersion) {
          if (oldVersion < 1) {
            database.createObjectStore('crafts', { keyPath: 'id' });
            database.createObjectStore('desk', { keyPath: 'key' });
          }
          if (oldVersion < 2) database.createObjectStore('aside', { keyPath: 'id', autoIncrement: true });
        },
        blocking(_current, _wanted, event) {
          (event.target as IDBDatabase).close();
          events.onClosedForUpdate();
        },
      });
      return new WorkStorage(db);
    } catch (error) {
      if (error instanceof DOMException && error.name === 'VersionError') throw new LaterVersionError();
      throw error;
    }
  }

  /** Reads everything; what cannot be read is moved aside, in the same transaction. */
  async load(): Promise<LoadedWork> {
    const writing = this.write();
    const aside: { name: string; reason: string }[] = [];
    const putAside = async (name: string, error: unknown, content: unknown): Promise<void> => {
      if (!(error instanceof InputError)) throw error;
      aside.push({ name, reason: error.message });
      await writing
        .objectStore('aside')
        .add({ name, reason: error.message, putAsideAt: new Date().toISOString(), content });
    };
    const crafts: CraftWork[] = [];
    for (const key of await writing.objectStore('crafts').getAllKeys()) {
      const raw = await writing.objectStore('crafts').get(key);
      const name = nameIn(raw);
      try {
        const record = readCraftRecord(raw, name);
        const craft = plain(record);
        this.known.set(craft.id, { revision: record.revision, craft });
        crafts.push(craft);
      } catch (error) {
        await putAside(name, error, raw);
        await writing.objectStore('crafts').delete(key);
      }
    }
    // The store's own order is by random id; by name it is the same each time.
    crafts.sort((a, b) => a.build.name.localeCompare(b.build.name, 'en') || a.id.localeCompare(b.id, 'en'));
    let desk: Desk | null = null;
    const rawDesk = await writing.objectStore('desk').get('desk');
    if (rawDesk !== undefined) {
      try {
        desk = readDesk(rawDesk, 'desk');
        this.deskWritten = desk;
      } catch (error) {
        await putAside('desk', error, rawDesk);
        await writing.objectStore('desk').delete('desk');
      }
    }
    const settings = readSettings(await writing.objectStore('desk').get('settings'));
    this.settingsWritten = settings;
    await writing.done;
    return { crafts, desk, settings, aside };
  }

  /** Anything in `document` that is not written yet? */
  hasUnwritten(document: WorkDocument): boolean {
    return (
      document.desk !== this.deskWritten ||
      document.settings !== this.settingsWritten ||
      document.crafts.length !== this.known.size ||
      document.crafts.some((craft) => this.known.get(craft.id)?.craft !== craft)
    );
  }

  /**
   * Writes what changed and takes over what other windows wrote, in one transaction; resolves when it is
   * completed and on the disk. @throws what the browser says (no room left, …): then nothing was written.
   */
  async save(document: WorkDocument): Promise<SavedWork> {
    const writing = this.write();
    try {
      const merge = mergeCrafts(document.crafts, this.known, await this.storedIn(writing));
      const revision = (await readHead(writing)) + 1;
      for (const craft of merge.write) {
        await writing.objectStore('crafts').put({ ...craft, layout: LAYOUT, revision } satisfies CraftRecord);
      }
      for (const id of merge.remove) await writing.objectStore('crafts').delete(id);
      const desk = writing.objectStore('desk');
      await desk.put({ key: 'head', revision });
      if (document.desk !== this.deskWritten) await desk.put({ key: 'desk', ...document.desk });
      if (document.settings !== this.settingsWritten)
        await desk.put({ key: 'settings', ...document.settings });
      const stored = await this.storedIn(writing);
      await writing.done;
      this.remember(merge.crafts, stored);
      this.deskWritten = document.desk;
      this.settingsWritten = document.settings;
      return { revision, merge };
    } catch (error) {
      // The transaction ends with the first failure; its own report would only repeat it.
      await writing.done.catch(() => undefined);
      throw error;
    }
  }

  /** Takes over what another window wrote, writing nothing; crafts changed here stay for the next save. */
  async pull(document: WorkDocument): Promise<Merge> {
    const reading = this.write();
    const stored = await this.storedIn(reading);
    await reading.done;
    const merge = mergeCrafts(document.crafts, this.known, stored);
    const taken = new Set(merge.write.map((craft) => craft.id));
    const still = stored.filter((record) => !taken.has(record.id));
    // Copies for both-changed crafts belong to the save that writes them.
    const ids = new Set([...document.crafts.map((craft) => craft.id), ...stored.map((record) => record.id)]);
    const crafts = merge.crafts.filter((craft) => ids.has(craft.id));
    this.remember(crafts, still);
    return { ...merge, crafts, both: [] };
  }

  async listAside(): Promise<AsideRecord[]> {
    const rows = await this.db.getAll('aside');
    return rows.map((row) => ({ ...row, id: row.id ?? 0 }));
  }

  async removeAside(id: number): Promise<void> {
    await this.db.delete('aside', id);
  }

  close(): void {
    this.db.close();
  }

  private write(): Writing {
    const stores: Stores = ['crafts', 'desk', 'aside'];
    return this.db.transaction(stores, 'readwrite', { durability: 'strict' });
  }

  /** Readable crafts in the store; unreadable ones are left alone here (the next load puts them aside). */
  private async storedIn(writing: Writing): Promise<CraftRecord[]> {
    const rows = await writing.objectStore('crafts').getAll();
    return rows.flatMap((raw) => {
      const fresh = this.unchanged(raw);
      if (fresh !== null) return [fresh];
      try {
        return [readCraftRecord(raw, nameIn(raw))];
      } catch (error) {
        if (error instanceof InputError) return [];
        throw error;
      }
    });
  }

  /** The record without a parse, when it is the one this window knows. */
  private unchanged(raw: unknown): CraftRecord | null {
    const { id, revision, layout } = raw as Partial<CraftRecord>;
    const known = id === undefined ? undefined : this.known.get(id);
    return known !== undefined && known.revision === revision && layout === LAYOUT
      ? { ...known.craft, layout: LAYOUT, revision }
      : null;
  }

  private remember(crafts: readonly CraftWork[], stored: readonly CraftRecord[]): void {
    const revisions = new Map(stored.map((record) => [record.id, record.revision]));
    const next = new Map<string, Known>();
    for (const craft of crafts) {
      const revision = revisions.get(craft.id);
      if (revision !== undefined) next.set(craft.id, { revision, craft });
      else {
        const before = this.known.get(craft.id);
        if (before !== undefined) next.set(craft.id, before);
      }
    }
    this.known = next;
  }
}

async function readHead(writing: Writing): Promise<number> {
  const head = (await writing.objectStore('desk').get('head')) as { revision?: unknown } | undefined;
  return typeof head?.revision === 'number' ? head.revision : 0;
}

function nameIn(raw: unknown): string {
  const build = (raw as { build?: { name?: unknown } } | null | undefined)?.build;
  return typeof build?.name === 'string' ? build.name.slice(0, 120) : 'craft without a name';
}
