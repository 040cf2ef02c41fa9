import fc from 'fast-check';
import { strToU8, unzipSync, zipSync } from 'fflate';
import { describe, expect, test } from 'vitest';
import { InputError } from '../../src/craft/problem.ts';
import { readArchive, writeArchive } from '../../src/app/storage/archive.ts';
import { parseGuardedJson } from '../../src/app/storage/guardedJson.ts';
import { firstDocument } from '../../src/app/store/demos.ts';
import type { CraftWork } from '../../src/app/store/document.ts';

const start = firstDocument();
const [sandpiper] = start.crafts;
const full = {
  ...start,
  crafts: [
    {
      ...sandpiper,
      gainsB: {
        working: { ...sandpiper.gainsA.working, loop_Hz: 500 },
        saved: sandpiper.gainsA.saved,
        history: [
          { savedAt: '2024-05-01T10:00:00.000Z', note: 'täglich „weicher“', gains: sandpiper.gainsA.saved },
        ],
      },
      sheets: { swing: [1, 2, { deep: true }] },
    },
    start.crafts[1],
  ] satisfies CraftWork[],
};
const good = writeArchive(full, new Date(0));

const withoutIds = (crafts: readonly CraftWork[]) => crafts.map((craft) => ({ ...craft, id: '' }));

function refusal(bytes: Uint8Array): string {
  try {
    readArchive(bytes, 'a.zip');
  } catch (error) {
    expect(error).toBeInstanceOf(InputError);
    return (error as Error).message;
  }
  throw new Error('the archive was taken');
}

/** The good archive with some files replaced. */
function forged(change: Record<string, string>, keepChecksums = false): Uint8Array {
  const files = unzipSync(good);
  for (const [path, text] of Object.entries(change)) files[path] = strToU8(text);
  if (!keepChecksums) {
    const manifest = JSON.parse(new TextDecoder().decode(files['manifest.json'])) as {
      checksums: Record<string, number>;
    };
    for (const path of Object.keys(change)) {
      if (path !== 'manifest.json') manifest.checksums[path] = crc32OfZip(path, files[path]);
    }
    if (!('manifest.json' in change)) files['manifest.json'] = strToU8(JSON.stringify(manifest));
  }
  return zipSync(files);
}

/** CRC-32 as the zip writer itself put it into the local header (offset 14): fflate, not our own function. */
function crc32OfZip(path: string, bytes: Uint8Array): number {
  const zip = zipSync({ [path]: bytes });
  return new DataView(zip.buffer, zip.byteOffset).getUint32(14, true);
}

describe('an archive', () => {
  test('brings back every craft, both gain sets, history and sheets, with new ids', () => {
    const back = readArchive(good, 'a.zip');
    expect(withoutIds(back)).toEqual(withoutIds(full.crafts));
    expect(new Set([...back, ...full.crafts].map(({ id }) => id)).size).toBe(4);
  });

  test('checksums in the manifest are those of the zip format', () => {
    const manifest = JSON.parse(new TextDecoder().decode(unzipSync(good)['manifest.json'])) as {
      checksums: Record<string, number>;
    };
    const files = unzipSync(good);
    for (const [path, sum] of Object.entries(manifest.checksums))
      expect(sum).toBe(crc32OfZip(path, files[path]));
  });

  test('that is cut off anywhere is refused', () => {
    for (let share = 0; share < 1; share += 0.07) {
      expect(refusal(good.slice(0, Math.floor(good.length * share)))).toMatch(/a\.zip/);
    }
    expect(refusal(good.slice(0, -1))).toMatch(/complete zip/);
  });

  test('with a byte changed never yields other content than was written', () => {
    fc.assert(
      fc.property(fc.nat(good.length - 1), fc.integer({ min: 1, max: 255 }), (at, flip) => {
        const bytes = good.slice();
        bytes[at] ^= flip;
        try {
          expect(withoutIds(readArchive(bytes, 'a.zip'))).toEqual(withoutIds(full.crafts));
        } catch (error) {
          if (!(error instanceof InputError)) throw error;
        }
      }),
      { numRuns: 150 },
    );
  });

  test('of random bytes is refused, never a crash', () => {
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 400 }), (bytes) => {
        refusal(bytes);
        refusal(new Uint8Array([0x50, 0x4b, 3, 4, ...bytes]));
      }),
      { numRuns: 200 },
    );
  });

  test('of a later version is refused by name', () => {
    const manifest = '{"format":"gustbench.archive/2","createdAt":"","crafts":[],"checksums":{}}';
    expect(refusal(forged({ 'manifest.json': manifest }))).toMatch(
      /gustbench\.archive\/2.*gustbench\.archive\/1/,
    );
  });

  test.each(['../evil.json', 'crafts/../../evil.json', '/etc/evil.json', 'C:\\evil.json', 'a//b.json', ''])(
    'with a path that leaves it is refused: %s',
    (path) => {
      expect(refusal(forged({ [path]: '{}' }))).toMatch(/plain, relative/);
    },
  );

  test.each(['__proto__', 'constructor', 'prototype'])(
    'with the key %s is refused, and nothing is polluted',
    (key) => {
      const kept = new TextDecoder().decode(unzipSync(good)['crafts/0/kept.json']);
      const text = kept.replace('"sheets": {', `"sheets": { "${key}": { "polluted": true },`);
      expect(text).not.toBe(kept);
      expect(refusal(forged({ 'crafts/0/kept.json': text }))).toContain(key);
      expect(({} as { polluted?: boolean }).polluted).toBeUndefined();
    },
  );

  test.each(['1e308', '1e999', '-1e999'])('with the number %s for a mass is refused', (number) => {
    const build = new TextDecoder().decode(unzipSync(good)['crafts/0/build.json']);
    const text = build.replace(/"mass_kg": [\d.]+/, `"mass_kg": ${number}`);
    expect(text).not.toBe(build);
    expect(refusal(forged({ 'crafts/0/build.json': text }))).toMatch(/airframe\.mass_kg/);
  });

  test('nested beyond reason is refused', () => {
    expect(refusal(forged({ 'crafts/0/kept.json': '['.repeat(20_000) }))).toMatch(/nesting/);
  });

  test('with another file than the manifest says is refused as damaged', () => {
    const build = new TextDecoder().decode(unzipSync(good)['crafts/0/build.json']);
    const other = build.replace(/"mass_kg": [\d.]+/, '"mass_kg": 1.36');
    expect(refusal(forged({ 'crafts/0/build.json': other }, true))).toMatch(/undamaged/);
    expect(refusal(forged({ 'more.json': '{}' }, true))).toMatch(/more\.json/);
  });

  test('that is a bomb is refused before it is inflated', () => {
    const before = performance.now();
    expect(refusal(zipSync({ 'bomb.json': new Uint8Array(3_900_000) }))).toMatch(/packed size/);
    expect(refusal(zipSync({ 'bomb.json': new Uint8Array(60_000_000) }, { level: 9 }))).toMatch(
      /bytes a file/,
    );
    const many = Object.fromEntries(Array.from({ length: 2100 }, (_, n) => [`f${n}.json`, strToU8('{}')]));
    expect(refusal(zipSync(many, { level: 0 }))).toMatch(/files/);
    expect(performance.now() - before).toBeLessThan(20_000);
  });

  test('that announces less than it holds is refused without holding it', () => {
    const zip = zipSync({ 'bomb.json': new Uint8Array(30_000_000) }, { level: 9 });
    const view = new DataView(zip.buffer, zip.byteOffset);
    // Size as unpacked: offset 22 of the local header, 24 of the entry in the list at the end.
    const entry = zip.length - 22 - (46 + 'bomb.json'.length);
    expect(view.getUint32(entry, true)).toBe(0x02014b50);
    view.setUint32(22, 100_000, true);
    view.setUint32(entry + 24, 100_000, true);
    expect(refusal(zip)).toMatch(/announced|packed size/);
  });
});

describe('JSON from outside', () => {
  test('any plain value that we would write ourselves is read as it is', () => {
    fc.assert(
      fc.property(fc.jsonValue({ depthSize: 'small', maxDepth: 8, noUnicodeString: false }), (value) => {
        const text = JSON.stringify(value);
        if (/"(__proto__|constructor|prototype)"/.test(text)) return;
        expect(parseGuardedJson(text, 'x')).toEqual(JSON.parse(text));
      }),
      { numRuns: 200 },
    );
  });

  test('brackets inside texts are not nesting', () => {
    const text = JSON.stringify({ a: '[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[\\"[[[' });
    expect(parseGuardedJson(text, 'x')).toEqual(JSON.parse(text));
  });
});
