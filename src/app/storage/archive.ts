/** Everything on the bench as one .zip file with a manifest, `gustbench.archive/1`, and back. */
import { strFromU8, strToU8, unzipSync, Unzip, UnzipInflate, zipSync } from 'fflate';
import { z } from 'zod';
import { formatTag, parseWith } from '../../craft/fields.ts';
import { refuse } from '../../craft/problem.ts';
import type { CraftWork, GainSet, WorkDocument } from '../store/document.ts';
import { parseGuardedJson } from './guardedJson.ts';
import { LAYOUT, readCraftRecord } from './records.ts';
import { plain } from './merge.ts';

const FORMAT = 'gustbench.archive/1';
const MANIFEST = 'manifest.json';
const LARGEST_ARCHIVE_BYTES = 50_000_000;
const LARGEST_ENTRY_BYTES = 4_000_000;
const LARGEST_TOTAL_BYTES = 100_000_000;
const MOST_ENTRIES = 2000;
/** JSON of ours shrinks to about a tenth; nothing honest shrinks to a three-hundredth. */
const MOST_SHRINKING = 300;
/** Input given to the inflater at once: at deflate's limit of 1032:1 it can make 4 MB of it, no more. */
const PIECE_BYTES = 4096;

const manifestSchema = z.strictObject({
  format: formatTag(FORMAT),
  createdAt: z.string().max(40),
  crafts: z
    .array(
      z.strictObject({ folder: z.string().regex(/^crafts\/\d{1,4}$/, { error: 'crafts/ and a number' }) }),
    )
    .max(500),
  /** CRC-32 of every other file, so that damage is found. */
  checksums: z.record(z.string(), z.number().int()),
});

/** The archive's bytes. Builds and gains lie in it as files of their own, ready for the command line. */
export function writeArchive(document: WorkDocument, createdAt: Date): Uint8Array<ArrayBuffer> {
  const files: Record<string, Uint8Array> = {};
  const put = (path: string, value: unknown): void => {
    files[path] = strToU8(JSON.stringify(value, null, 2));
  };
  document.crafts.forEach((craft, n) => {
    const folder = `crafts/${n}`;
    put(`${folder}/build.json`, craft.build);
    put(`${folder}/gains-A.json`, craft.gainsA.working);
    if (craft.gainsB !== null) put(`${folder}/gains-B.json`, craft.gainsB.working);
    put(`${folder}/kept.json`, {
      savedBuild: craft.savedBuild,
      gainsA: keptOf(craft.gainsA),
      gainsB: craft.gainsB === null ? null : keptOf(craft.gainsB),
      sheets: craft.sheets,
    });
  });
  put('wind.json', document.desk.wind);
  put('scene.json', document.desk.scene);
  const checksums = Object.fromEntries(Object.entries(files).map(([path, bytes]) => [path, crc32(bytes)]));
  put(MANIFEST, {
    format: FORMAT,
    createdAt: createdAt.toISOString(),
    crafts: document.crafts.map((_, n) => ({ folder: `crafts/${n}` })),
    checksums,
  });
  return new Uint8Array(zipSync(files, { level: 6 }));
}

function keptOf(set: GainSet) {
  return { saved: set.saved, history: set.history };
}

/**
 * The crafts of an archive, with new ids; nothing is changed anywhere by reading it.
 * @throws InputError that says what is wrong: truncated, another version, a path that leaves the archive, too
 * large, damaged, or a file inside that is refused.
 */
export function readArchive(bytes: Uint8Array, file: string): CraftWork[] {
  const entries = inflateAll(bytes, file);
  const json = (path: string): unknown => {
    const entry = entries.get(path);
    if (entry === undefined) throw refuse(file, path, undefined, 'a file of this name in the archive');
    return parseGuardedJson(strFromU8(entry), `${file}, ${path}`);
  };
  const manifest = parseWith(manifestSchema, json(MANIFEST), `${file}, ${MANIFEST}`);
  for (const [path, entry] of entries) {
    if (path !== MANIFEST && manifest.checksums[path] !== crc32(entry)) {
      throw refuse(file, path, 'other bytes than were written', 'an undamaged file named in the manifest');
    }
  }
  return manifest.crafts.map(({ folder }) => {
    const kept = json(`${folder}/kept.json`);
    if (typeof kept !== 'object' || kept === null)
      throw refuse(file, `${folder}/kept.json`, kept, 'an object');
    const { gainsA, gainsB, ...rest } = kept as Record<string, unknown>;
    const set = (side: 'A' | 'B', saved: unknown) => ({
      working: json(`${folder}/gains-${side}.json`),
      ...(typeof saved === 'object' ? saved : {}),
    });
    const record = {
      ...rest,
      layout: LAYOUT,
      revision: 0,
      id: crypto.randomUUID(),
      build: json(`${folder}/build.json`),
      gainsA: set('A', gainsA),
      gainsB: gainsB === null ? null : set('B', gainsB),
    };
    return plain(readCraftRecord(record, `${file}, ${folder}`));
  });
}

interface Entry {
  readonly name: string;
  readonly size: number;
}

function inflateAll(bytes: Uint8Array, file: string): Map<string, Uint8Array> {
  if (bytes.length > LARGEST_ARCHIVE_BYTES) {
    throw refuse(file, '', `${bytes.length} bytes`, `at most ${LARGEST_ARCHIVE_BYTES} bytes`);
  }
  const listed = listEntries(bytes, file);
  const inflated = new Map<string, Uint8Array>();
  let failure: unknown = null;
  const unzip = new Unzip((entry) => {
    const size = listed.get(entry.name)?.size;
    if (size === undefined || inflated.has(entry.name)) {
      failure ??= refuse(
        file,
        entry.name,
        'a file outside the list',
        'only files in the archive’s own list, once each',
      );
      return;
    }
    const whole = new Uint8Array(size);
    let filled = 0;
    entry.ondata = (error, piece, final) => {
      if (error !== null) failure ??= refuse(file, entry.name, error.message, 'an undamaged file');
      if (failure !== null) return;
      if (filled + piece.length > size) {
        failure = refuse(file, entry.name, 'more bytes than announced', `${size} bytes`);
        entry.terminate();
        return;
      }
      whole.set(piece, filled);
      filled += piece.length;
      if (!final) return;
      if (filled === size) inflated.set(entry.name, whole);
      else failure ??= refuse(file, entry.name, `${filled} bytes`, `${size} bytes, as announced`);
    };
    entry.start();
  });
  unzip.register(UnzipInflate);
  try {
    for (let at = 0; at < bytes.length && failure === null; at += PIECE_BYTES) {
      unzip.push(bytes.subarray(at, at + PIECE_BYTES), at + PIECE_BYTES >= bytes.length);
    }
  } catch (error) {
    failure ??= refuse(
      file,
      '',
      error instanceof Error ? error.message : String(error),
      'a complete zip archive',
    );
  }
  if (failure !== null) throw failure;
  for (const name of listed.keys()) {
    if (!inflated.has(name)) throw refuse(file, name, 'cut off', 'a complete file');
  }
  return inflated;
}

/** Names and sizes from the archive's own list at its end, checked before anything is inflated. */
function listEntries(bytes: Uint8Array, file: string): Map<string, Entry> {
  const listed = new Map<string, Entry>();
  let total = 0;
  const bad = (path: string, value: string, allowed: string): never => {
    throw refuse(file, path, value, allowed);
  };
  const check = ({
    name,
    size,
    originalSize,
  }: {
    name: string;
    size: number;
    originalSize: number;
  }): false => {
    if (!/^[A-Za-z0-9._-]+(\/[A-Za-z0-9._-]+)*$/.test(name) || name.split('/').includes('..')) {
      bad('', name, 'file names inside the archive: plain, relative, without ".."');
    }
    if (listed.has(name)) bad(name, 'listed twice', 'each file once');
    if (originalSize > LARGEST_ENTRY_BYTES)
      bad(name, `${originalSize} bytes`, `at most ${LARGEST_ENTRY_BYTES} bytes a file`);
    if (originalSize > MOST_SHRINKING * Math.max(size, 100)) {
      bad(
        name,
        `${size} bytes that become ${originalSize}`,
        `at most ${MOST_SHRINKING} times its packed size`,
      );
    }
    total += originalSize;
    if (total > LARGEST_TOTAL_BYTES)
      bad('', `over ${LARGEST_TOTAL_BYTES} bytes in all`, `at most ${LARGEST_TOTAL_BYTES} bytes`);
    listed.set(name, { name, size: originalSize });
    if (listed.size > MOST_ENTRIES) bad('', `over ${MOST_ENTRIES} files`, `at most ${MOST_ENTRIES} files`);
    return false;
  };
  try {
    unzipSync(bytes, { filter: check });
  } catch (error) {
    if (error instanceof Error && error.name === 'InputError') throw error;
    throw refuse(file, '', 'cut off or not a zip archive', 'a complete zip archive written by Gustbench');
  }
  return listed;
}

const CRC_TABLE = Uint32Array.from({ length: 256 }, (_, n) => {
  let c = n;
  for (let k = 0; k < 8; k++) c = c & 1 ? 0xedb88320 ^ (c >>> 1) : c >>> 1;
  return c;
});

/** CRC-32 of ISO 3309, as in zip files. */
function crc32(bytes: Uint8Array): number {
  let crc = 0xffffffff;
  for (const byte of bytes) crc = CRC_TABLE[(crc ^ byte) & 0xff] ^ (crc >>> 8);
  return (crc ^ 0xffffffff) >>> 0;
}
