import 'fake-indexeddb/auto';
import { IDBFactory } from 'fake-indexeddb';
import { openDB } from 'idb';
import { beforeEach, describe, expect, test } from 'vitest';
import { firstDocument } from '../../src/app/store/demos.ts';
import type { CraftWork, WorkDocument } from '../../src/app/store/document.ts';
import { withMerge } from '../../src/app/storage/merge.ts';
import { openWork } from '../../src/app/storage/start.ts';
import { LaterVersionError, WorkStorage } from '../../src/app/storage/workStorage.ts';

const events = { onClosedForUpdate: () => undefined };

beforeEach(() => {
  globalThis.indexedDB = new IDBFactory();
});

async function opened(): Promise<{ storage: WorkStorage; document: WorkDocument }> {
  const work = await openWork(events);
  if (work.storage === null) throw new Error(work.reason);
  return { storage: work.storage, document: work.document };
}

function renamed(craft: CraftWork, name: string): CraftWork {
  return { ...craft, build: { ...craft.build, name } };
}

function withCrafts(document: WorkDocument, crafts: readonly CraftWork[]): WorkDocument {
  return { ...document, crafts };
}

const namesOf = (crafts: readonly CraftWork[]) => crafts.map((craft) => craft.build.name).sort();

describe('kept work', () => {
  test('a first start finds the demos and nothing in the store', async () => {
    const { document, storage } = await opened();
    expect(namesOf(document.crafts)).toEqual(['Sandpiper', 'Wren']);
    expect(storage.hasUnwritten(document)).toBe(true);
  });

  test('what was saved comes back as it was', async () => {
    const { storage, document } = await opened();
    const first = document.crafts[0];
    const changed: WorkDocument = {
      crafts: [
        {
          ...renamed(first, 'Heron'),
          gainsB: {
            ...first.gainsA,
            history: [{ savedAt: '2024-05-01T10:00:00.000Z', note: 'softer', gains: first.gainsA.saved }],
          },
          sheets: { swing: { period_s: [1.2, 1.21] } },
        },
      ],
      desk: {
        ...document.desk,
        currentId: first.id,
        side: 'B',
        place: 'prove',
        wind: { ...document.desk.wind, mean_mps: 6 },
      },
      settings: { ...document.settings, theme: 'dark', sticks: { pad: { mode: 2 } } },
    };
    await storage.save(changed);
    expect(storage.hasUnwritten(changed)).toBe(false);
    storage.close();
    const again = await opened();
    expect(again.document).toEqual(changed);
    expect(again.storage.hasUnwritten(again.document)).toBe(false);
  });

  test('an unreadable record is put aside under its name and the rest is there', async () => {
    const { storage, document } = await opened();
    await storage.save(document);
    storage.close();
    const raw = await openDB('gustbench');
    const half = { id: 'x', layout: 2, revision: 1, build: { name: 'Half written', airframe: {} } };
    await raw.put('crafts', half);
    await raw.put('desk', { key: 'desk', currentId: 5 });
    raw.close();
    const work = await openWork(events);
    expect(namesOf(work.document.crafts)).toEqual(['Sandpiper', 'Wren']);
    expect(work.aside.map(({ name }) => name).sort()).toEqual(['Half written', 'desk']);
    const kept = await work.storage?.listAside();
    expect(kept?.find(({ name }) => name === 'Half written')?.content).toEqual(half);
    // Once aside, the next start does not complain again.
    work.storage?.close();
    expect((await openWork(events)).aside).toEqual([]);
  });

  test('records of layout 1, without history and sheets, and a store of version 1 are brought up', async () => {
    const [craft] = firstDocument().crafts;
    const old = await openDB('gustbench', 1, {
      upgrade(db) {
        db.createObjectStore('crafts', { keyPath: 'id' });
        db.createObjectStore('desk', { keyPath: 'key' });
      },
    });
    await old.put('crafts', {
      id: 'old',
      layout: 1,
      revision: 7,
      build: craft.build,
      gainsA: craft.gainsA.working,
      gainsB: null,
    });
    old.close();
    const { document, storage } = await opened();
    expect(document.crafts).toEqual([
      {
        id: 'old',
        build: craft.build,
        savedBuild: craft.build,
        gainsA: { working: craft.gainsA.working, saved: craft.gainsA.working, history: [] },
        gainsB: null,
        sheets: {},
      },
    ]);
    expect(await storage.listAside()).toEqual([]);
  });

  test('a record of a later layout is put aside, a store of a later version is left alone', async () => {
    const { storage, document } = await opened();
    await storage.save(document);
    storage.close();
    const raw = await openDB('gustbench');
    await raw.put('crafts', { id: 'later', layout: 3, build: { name: 'From next year' } });
    raw.close();
    const work = await openWork(events);
    expect(work.aside).toHaveLength(1);
    expect(work.aside[0].reason).toContain('layout: 3');
    work.storage?.close();
    (await openDB('gustbench', 99)).close();
    await expect(WorkStorage.open(events)).rejects.toBeInstanceOf(LaterVersionError);
    const without = await openWork(events);
    expect(without.storage).toBeNull();
    expect(without.reason).toContain('later version');
  });

  test('a save that fails leaves what was stored before', async () => {
    const { storage, document } = await opened();
    await storage.save(document);
    const bad = { ...document.crafts[0], sheets: { broken: () => 0 } } as CraftWork;
    await expect(
      storage.save(withCrafts(document, [bad, renamed(document.crafts[1], 'Changed too')])),
    ).rejects.toThrow();
    storage.close();
    expect(namesOf((await opened()).document.crafts)).toEqual(['Sandpiper', 'Wren']);
  });

  test('an update in another window makes this one let go', async () => {
    let told = 0;
    await WorkStorage.open({ onClosedForUpdate: () => told++ });
    (await openDB('gustbench', 3)).close();
    expect(told).toBe(1);
  });
});

describe('two windows', () => {
  async function two() {
    const a = await opened();
    await a.storage.save(a.document);
    const b = await opened();
    return { a, b };
  }

  test('a craft changed in one window is taken over by the other', async () => {
    const { a, b } = await two();
    await a.storage.save(
      withCrafts(a.document, [renamed(a.document.crafts[0], 'Heron'), a.document.crafts[1]]),
    );
    const merge = await b.storage.pull(b.document);
    expect(namesOf(merge.crafts)).toEqual(['Heron', 'Wren']);
    expect(merge.taken).toEqual(['Heron']);
    expect(b.storage.hasUnwritten({ ...b.document, crafts: merge.crafts })).toBe(false);
  });

  test('a craft changed in both: the later save stays, the other is kept as a copy with a name', async () => {
    const { a, b } = await two();
    await a.storage.save(
      withCrafts(a.document, [renamed(a.document.crafts[0], 'Heron'), a.document.crafts[1]]),
    );
    const mine = withCrafts(b.document, [renamed(b.document.crafts[0], 'Plover'), b.document.crafts[1]]);
    // Hearing of it first changes nothing: the craft was edited here as well.
    const heard = await b.storage.pull(mine);
    expect(namesOf(heard.crafts)).toEqual(['Plover', 'Wren']);
    const { merge } = await b.storage.save(mine);
    expect(merge.both).toEqual(['Plover']);
    expect(namesOf(merge.crafts)).toEqual(['Heron (other window)', 'Plover', 'Wren']);
    expect(b.storage.hasUnwritten(withCrafts(mine, merge.crafts))).toBe(false);
    a.storage.close();
    b.storage.close();
    expect(namesOf((await opened()).document.crafts)).toEqual(['Heron (other window)', 'Plover', 'Wren']);
  });

  test('different crafts changed in the two windows both stay', async () => {
    const { a, b } = await two();
    await a.storage.save(
      withCrafts(a.document, [renamed(a.document.crafts[0], 'Heron'), a.document.crafts[1]]),
    );
    const { merge } = await b.storage.save(
      withCrafts(b.document, [b.document.crafts[0], renamed(b.document.crafts[1], 'Plover')]),
    );
    expect(namesOf(merge.crafts)).toEqual(['Heron', 'Plover']);
  });

  test('a removed craft goes in both windows; one changed meanwhile stays', async () => {
    const { a, b } = await two();
    await a.storage.save(withCrafts(a.document, [a.document.crafts[0]]));
    expect(namesOf((await b.storage.pull(b.document)).crafts)).toEqual(['Sandpiper']);
    const c = await two();
    await c.a.storage.save(withCrafts(c.a.document, [c.a.document.crafts[0]]));
    const changed = withCrafts(c.b.document, [
      c.b.document.crafts[0],
      ...c.b.document.crafts.slice(1).map((w) => renamed(w, 'Plover')),
    ]);
    const { merge } = await c.b.storage.save(changed);
    expect(namesOf(merge.crafts)).toEqual(namesOf(changed.crafts));
  });

  test('an edit made while a save ran is not overwritten by its result', () => {
    const { crafts } = firstDocument();
    const newer = renamed(crafts[0], 'Edited meanwhile');
    const merged = [renamed(crafts[0], 'From the other window'), crafts[1]];
    expect(namesOf(withMerge([newer, crafts[1]], crafts, merged))).toEqual(['Edited meanwhile', 'Wren']);
    expect(namesOf(withMerge(crafts, crafts, merged))).toEqual(['From the other window', 'Wren']);
  });
});
