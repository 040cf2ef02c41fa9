/**
 * Snapshots of mutable state: every stateful part writes its numbers in a fixed order and reads them back in
 * the same order. Rewind, replay and the determinism tests stand on this.
 */
export class SnapshotWriter {
  private readonly numbers: number[] = [];

  put(value: number): void {
    this.numbers.push(value);
  }

  putAll(values: ArrayLike<number>): void {
    for (let i = 0; i < values.length; i++) this.numbers.push(values[i]);
  }

  finish(): Float64Array {
    return Float64Array.from(this.numbers);
  }
}

export class SnapshotReader {
  private position = 0;

  constructor(private readonly numbers: Float64Array) {}

  take(): number {
    if (this.position >= this.numbers.length) {
      throw new RangeError(`snapshot holds ${this.numbers.length} numbers; one more was asked for`);
    }
    return this.numbers[this.position++];
  }

  takeInto(target: Float64Array | Float32Array): void {
    for (let i = 0; i < target.length; i++) target[i] = this.take();
  }

  /** @throws RangeError when numbers are left over: writer and reader disagree. */
  finish(): void {
    if (this.position !== this.numbers.length) {
      throw new RangeError(`snapshot holds ${this.numbers.length} numbers; ${this.position} were read`);
    }
  }
}

/** A part with mutable state that can be saved and restored. */
export interface Stateful {
  save(out: SnapshotWriter): void;
  load(from: SnapshotReader): void;
}
