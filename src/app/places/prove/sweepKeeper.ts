/**
 * The cells of each craft's sweep in IndexedDB, written as they come, so that a reload or a closed tab costs the
 * cells under way alone. What cannot be written is said once; the page goes on with what it has in memory.
 */
import { openDB, type DBSchema, type IDBPDatabase } from 'idb';
import { SweepCells, type CellResult } from '../../../trials/sweepResult.ts';

const NAME = 'gustbench-sweeps';
const WRITE_AFTER_MS = 300;
/** Sweeps kept at most; the oldest goes. */
const MOST_SWEEPS = 30;

interface Head {
  readonly craftId: string;
  readonly sweepId: string;
  readonly begunAt: string;
  readonly head: Record<string, unknown>;
}

interface Schema extends DBSchema {
  heads: { key: string; value: Head };
  cells: { key: [string, number, number]; value: CellResult & { readonly sweepId: string } };
}

/** Why a sweep is not kept. */
export type KeepTrouble =
  | { readonly kind: 'full' }
  | { readonly kind: 'other-window' }
  | { readonly kind: 'failed'; readonly reason: string };

export class SweepKeeper {
  private base: Promise<IDBPDatabase<Schema>> | null = null;
  private current: { craftId: string; sweepId: string } | null = null;
  private waiting: CellResult[] = [];
  private timer: ReturnType<typeof setTimeout> | null = null;
  private chain: Promise<void> = Promise.resolve();

  /** @param onTrouble told when cells can no longer be written; null once they are again */
  constructor(private readonly onTrouble: (trouble: KeepTrouble | null) => void) {}

  /** A new sweep takes the place of the craft's former one. */
  begin(craftId: string, cells: SweepCells): Promise<void> {
    const sweepId = crypto.randomUUID();
    this.current = { craftId, sweepId };
    this.waiting = cells.cells();
    const head = JSON.parse(JSON.stringify({ ...(cells.toJSON() as object), cells: [] })) as Head['head'];
    return this.enqueue(async () => {
      const base = await this.open();
      const writing = base.transaction(['heads', 'cells'], 'readwrite');
      const heads = writing.objectStore('heads');
      const old = await heads.getAll();
      const gone = old
        .filter((one) => one.craftId !== craftId)
        .sort((a, b) => a.begunAt.localeCompare(b.begunAt))
        .slice(0, Math.max(0, old.length - MOST_SWEEPS));
      for (const one of [...gone, ...old.filter((other) => other.craftId === craftId)]) {
        await heads.delete(one.craftId);
        await writing.objectStore('cells').delete(cellsOf(one.sweepId));
      }
      await heads.put({ craftId, sweepId, begunAt: new Date().toISOString(), head });
      await writing.done;
    });
  }

  /** Keeps a finished cell, soon. */
  add(cell: CellResult): void {
    this.waiting.push(cell);
    this.timer ??= setTimeout(() => void this.flush(), WRITE_AFTER_MS);
  }

  /** Writes what waits; resolves when it is written or has failed. */
  flush(): Promise<void> {
    if (this.timer !== null) clearTimeout(this.timer);
    this.timer = null;
    const { current, waiting } = this;
    if (current === null || waiting.length === 0) return this.chain;
    this.waiting = [];
    return this.enqueue(async () => {
      const base = await this.open();
      const writing = base.transaction(['heads', 'cells'], 'readwrite');
      const head = await writing.objectStore('heads').get(current.craftId);
      if (head?.sweepId !== current.sweepId) {
        this.onTrouble({ kind: 'other-window' });
        return;
      }
      for (const cell of waiting)
        await writing.objectStore('cells').put({ ...cell, sweepId: current.sweepId });
      await writing.done;
      this.onTrouble(null);
    }, waiting);
  }

  /** The craft's sweep with the cells finished so far; null when there is none that can be read. */
  async load(craftId: string): Promise<SweepCells | null> {
    let found: SweepCells | null = null;
    const before = this.current;
    await this.enqueue(async () => {
      const base = await this.open();
      const head = await base.get('heads', craftId);
      if (head === undefined) return;
      const rows = await base.getAll('cells', cellsOf(head.sweepId));
      const cells = rows.map(({ sweepId: _sweepId, ...cell }) => cell);
      found = SweepCells.parse({ ...head.head, cells }, 'kept sweep');
      // A sweep that was begun meanwhile stays the one that is written.
      if (this.current !== before) return;
      this.current = { craftId, sweepId: head.sweepId };
      this.waiting = [];
    });
    return found;
  }

  private open(): Promise<IDBPDatabase<Schema>> {
    this.base ??= openDB<Schema>(NAME, 1, {
      upgrade(database) {
        database.createObjectStore('heads', { keyPath: 'craftId' });
        database.createObjectStore('cells', { keyPath: ['sweepId', 'row', 'column'] });
      },
    });
    return this.base;
  }

  /** One transaction at a time; a failure is told, and what it held waits for the next try. */
  private enqueue(work: () => Promise<void>, held: readonly CellResult[] = []): Promise<void> {
    this.chain = this.chain.then(work).catch((error: unknown) => {
      this.waiting = [...held, ...this.waiting];
      const full = error instanceof DOMException && error.name === 'QuotaExceededError';
      const reason = error instanceof Error ? error.message : String(error);
      this.onTrouble(full ? { kind: 'full' } : { kind: 'failed', reason });
    });
    return this.chain;
  }
}

function cellsOf(sweepId: string): IDBKeyRange {
  return IDBKeyRange.bound([sweepId, 0, 0], [sweepId, Infinity, Infinity]);
}
