/** How many of the last minute's ticks were on time, in bins of one second of the clock. */

const BINS = 60;

export class Punctuality {
  private readonly ticks = new Uint32Array(BINS);
  private readonly late = new Uint32Array(BINS);
  private second = -1;

  /** Counts ticks that ran at `now_ms`. */
  count(now_ms: number, ticks: number, late: number): void {
    const second = Math.floor(now_ms / 1000);
    const gone = this.second < 0 ? 0 : Math.min(BINS, second - this.second);
    for (let k = 0; k < gone; k++) {
      const bin = (second - k) % BINS;
      this.ticks[bin] = 0;
      this.late[bin] = 0;
    }
    this.second = second;
    this.ticks[second % BINS] += ticks;
    this.late[second % BINS] += late;
  }

  /** Share of the last minute's ticks that were on time; 1 when there were none. */
  get share(): number {
    let ticks = 0;
    let late = 0;
    for (let k = 0; k < BINS; k++) {
      ticks += this.ticks[k];
      late += this.late[k];
    }
    return ticks === 0 ? 1 : 1 - late / ticks;
  }
}
