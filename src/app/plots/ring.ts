/** A ring of signal rows that one side writes and the tape reads: typed arrays, nothing copied. */

export interface SignalRing {
  readonly capacity: number;
  readonly time_s: Float64Array;
  readonly channels: readonly Float32Array[];
  /** Rows written in all; row n stands at n % capacity. */
  written: number;
  /** Number of the oldest row still there. */
  first: number;
  /** Goes up when rows were taken back, so that readers draw anew. */
  epoch: number;
}

export function createRing(channelCount: number, capacity: number): SignalRing {
  return {
    capacity,
    time_s: new Float64Array(capacity),
    channels: Array.from({ length: channelCount }, () => new Float32Array(capacity)),
    written: 0,
    first: 0,
    epoch: 0,
  };
}

/** Appends one row; `row` holds a number for each channel, from `offset`. Time must not go back. */
export function pushRow(ring: SignalRing, time_s: number, row: ArrayLike<number>, offset = 0): void {
  const place = ring.written % ring.capacity;
  ring.time_s[place] = time_s;
  for (let c = 0; c < ring.channels.length; c++) ring.channels[c][place] = row[offset + c];
  ring.written++;
  if (ring.written - ring.capacity > ring.first) ring.first = ring.written - ring.capacity;
}

/** Takes back every row after `time_s` (rewind); −Infinity clears the ring. */
export function truncateRing(ring: SignalRing, time_s: number): void {
  ring.written = firstRowAfter(ring, time_s);
  if (ring.written === ring.first) {
    ring.written = 0;
    ring.first = 0;
  }
  ring.epoch++;
}

/** Number of the first row later than `time_s`; `ring.written` when there is none. */
export function firstRowAfter(ring: SignalRing, time_s: number): number {
  let low = ring.first;
  let high = ring.written;
  while (low < high) {
    const middle = Math.floor((low + high) / 2);
    if (ring.time_s[middle % ring.capacity] > time_s) high = middle;
    else low = middle + 1;
  }
  return low;
}

/** Number of the oldest row still there. */
export function oldestRow(ring: SignalRing): number {
  return ring.first;
}

/** Time of the newest row, or null. */
export function newestTime_s(ring: SignalRing): number | null {
  return ring.written === 0 ? null : ring.time_s[(ring.written - 1) % ring.capacity];
}

/** Time of the oldest row still there, or null. */
export function oldestTime_s(ring: SignalRing): number | null {
  return ring.written === 0 ? null : ring.time_s[ring.first % ring.capacity];
}
