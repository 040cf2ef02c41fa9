/**
 * Seeded random streams. Each source of randomness (each gyro axis, each gust component, …) owns one stream
 * named after it, so that switching one source off leaves the numbers of every other source as they were.
 */
import { xoroshiro128plusFromState } from 'pure-rand/generator/xoroshiro128plus';
import type { SnapshotReader, SnapshotWriter } from './snapshot.ts';

type Generator = ReturnType<typeof xoroshiro128plusFromState>;

/** FNV-1a over the UTF-16 code units of `text`, starting from `basis`: a 32-bit hash. */
function hash32(text: string, basis: number): number {
  let hash = basis;
  for (let i = 0; i < text.length; i++) hash = Math.imul(hash ^ text.charCodeAt(i), 0x01000193);
  return hash | 0;
}

/** The finaliser of MurmurHash3: spreads neighbouring seeds over the whole state. */
function mix32(value: number): number {
  let v = value;
  v = Math.imul(v ^ (v >>> 16), 0x85ebca6b);
  v = Math.imul(v ^ (v >>> 13), 0xc2b2ae35);
  return (v ^ (v >>> 16)) | 0;
}

/** One independent stream of random numbers, fixed by (`seed`, `name`). Drawing allocates nothing. */
export class RandomStream {
  private generator: Generator;
  private spare = 0;
  private hasSpare = false;

  constructor(seed: number, name: string) {
    const low = Math.floor(seed) | 0;
    const high = Math.floor(seed / 4294967296) | 0;
    const base = hash32(name, 0x811c9dc5);
    this.generator = xoroshiro128plusFromState([
      mix32(base ^ mix32(low)),
      mix32(base + Math.imul(low, 0x9e3779b9)),
      mix32(hash32(name, 0x9747b28c) ^ mix32(high + 1)),
      mix32(low ^ high ^ 0x5bd1e995) | 1,
    ]);
    for (let i = 0; i < 8; i++) this.generator.next();
  }

  /** Uniform on [0, 1), 32 bits of resolution. */
  uniform(): number {
    return (this.generator.next() >>> 0) * 2.3283064365386963e-10;
  }

  /** Standard normal, by the polar method of Marsaglia (1964). */
  gaussian(): number {
    if (this.hasSpare) {
      this.hasSpare = false;
      return this.spare;
    }
    let a = 0;
    let b = 0;
    let s = 0;
    do {
      a = 2 * this.uniform() - 1;
      b = 2 * this.uniform() - 1;
      s = a * a + b * b;
    } while (s >= 1 || s === 0);
    const scale = Math.sqrt((-2 * Math.log(s)) / s);
    this.spare = b * scale;
    this.hasSpare = true;
    return a * scale;
  }

  save(out: SnapshotWriter): void {
    for (const word of this.generator.getState()) out.put(word);
    out.put(this.spare);
    out.put(this.hasSpare ? 1 : 0);
  }

  load(from: SnapshotReader): void {
    this.generator = xoroshiro128plusFromState([from.take(), from.take(), from.take(), from.take()]);
    this.spare = from.take();
    this.hasSpare = from.take() === 1;
  }
}
