/** Which of several devices flies: the one that was moved last. */

/** What this code needs of a Gamepad. */
interface Pad {
  readonly index: number;
  readonly connected: boolean;
  readonly axes: readonly number[];
}

/** Sum of axis travel since the last look that counts as moved. */
const MOVED = 0.25;
/** Sticks have two axes each; less is no flight control. */
const LEAST_AXES = 2;

export class PadChoice {
  private chosen = -1;
  /** Axes as they stood when the device was last seen to move, by device index. */
  private readonly stood = new Map<number, readonly number[]>();

  /** The device to fly with; null when none is plugged in. */
  of<T extends Pad>(pads: readonly (T | null)[]): T | null {
    const there = pads.filter(
      (pad): pad is T => pad !== null && pad.connected && pad.axes.length >= LEAST_AXES,
    );
    for (const pad of there) {
      const before = this.stood.get(pad.index);
      if (before?.length === pad.axes.length) {
        const travel = pad.axes.reduce((sum, value, i) => sum + Math.abs(value - before[i]), 0);
        // Written so that a reading that is not a number moves nothing.
        if (!(travel > MOVED)) continue;
        this.chosen = pad.index;
      }
      this.stood.set(pad.index, [...pad.axes]);
    }
    return there.find((pad) => pad.index === this.chosen) ?? there[0] ?? null;
  }
}
