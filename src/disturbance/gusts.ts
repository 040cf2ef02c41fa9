/**
 * Discrete gusts of the shape ½(1 − cos πx/d), MIL-F-8785C 3.7: a rise over a length met at the airspeed,
 * or over a time; held; and down again by the same shape. Without a hold it goes up and down at once, the shape
 * of CS 25.341(a)(2) with H = d.
 */
import type { Gust, Wind } from '../craft/wind.ts';
import { RAD_PER_DEG } from '../math/angles.ts';
import type { SnapshotReader, SnapshotWriter, Stateful } from '../math/snapshot.ts';

/** Airspeed below which a craft is taken to meet air at this speed: keeps a hover in light air defined, m/s. */
export const LEAST_AIRSPEED_MPS = 1;

/** Share of the peak at `phase`: 0…1 the rise, 1…2 the fall, else 0. */
export function gustShape(phase: number): number {
  return phase > 0 && phase < 2 ? 0.5 * (1 - Math.cos(Math.PI * phase)) : 0;
}

/** Start and end of each gust of `wind` for a craft at `airspeed_mps`, s. */
export function gustSpans(wind: Wind, airspeed_mps: number): [start_s: number, end_s: number][] {
  const airspeed = Math.max(airspeed_mps, LEAST_AIRSPEED_MPS);
  return wind.gusts.map((gust) => [
    gust.start_s,
    gust.start_s + 2 / risePerSecond(gust, airspeed) + (gust.hold_s ?? 0),
  ]);
}

function risePerSecond(gust: Gust, airspeed_mps: number): number {
  return gust.length_m === undefined ? 1 / (gust.rise_s ?? 1) : airspeed_mps / gust.length_m;
}

function sameRun(a: Gust, b: Gust): boolean {
  return a.start_s === b.start_s && a.length_m === b.length_m && a.rise_s === b.rise_s;
}

/** Offsets in a gust train's `air`: when, at which airspeed (set by the caller), and the sum of the gusts. */
export const GUST_TIME = 0;
export const GUST_AIRSPEED = 1;
export const GUST_NORTH = 2;
export const GUST_EAST = 3;
export const GUST_DOWN = 4;
/** Until this time every gust is over or has not begun; follows from the rest. */
const QUIET_UNTIL = 5;
const AIR_SIZE = 6;

/** All gusts of a wind, each with how far it has run. */
export class GustTrain implements Stateful {
  /** Time s, airspeed m/s, and the sum of the gusts in world axes, m/s. */
  readonly air = new Float64Array(AIR_SIZE);
  private gusts: readonly Gust[] = [];
  private phase = new Float64Array(0);
  private held_s = new Float64Array(0);

  constructor(private readonly step_s: number) {
    this.air[GUST_AIRSPEED] = LEAST_AIRSPEED_MPS;
  }

  /**
   * Takes up another list. A gust that is in both lists (same start and rise) goes on where it is; a new one
   * whose start has passed stands where the present airspeed would have brought it.
   */
  setGusts(gusts: readonly Gust[]): void {
    const { gusts: before, phase, held_s } = this;
    const taken = new Set<number>();
    const newPhase = new Float64Array(gusts.length);
    const newHeld = new Float64Array(gusts.length);
    const fresh: number[] = [];
    gusts.forEach((gust, i) => {
      const match = before.findIndex((other, j) => !taken.has(j) && sameRun(gust, other));
      if (match < 0) fresh.push(i);
      else {
        taken.add(match);
        newPhase[i] = phase[match];
        newHeld[i] = held_s[match];
      }
    });
    this.gusts = gusts;
    this.phase = newPhase;
    this.held_s = newHeld;
    this.air[QUIET_UNTIL] = -Infinity;
    for (const i of fresh) this.run(i, this.air[GUST_TIME] - gusts[i].start_s);
  }

  /** To the time and at the airspeed (relative to the mean wind) in `air`, one step after the last call. */
  advance(): void {
    const { air } = this;
    if (air[GUST_TIME] > air[QUIET_UNTIL]) this.sum();
  }

  private sum(): void {
    const { air, phase, gusts, step_s } = this;
    const time_s = air[GUST_TIME];
    let north = 0;
    let east = 0;
    let down = 0;
    let quietUntil = Infinity;
    for (let i = 0; i < gusts.length; i++) {
      const gust = gusts[i];
      if (phase[i] >= 2) continue;
      if (time_s <= gust.start_s) {
        quietUntil = Math.min(quietUntil, gust.start_s);
        continue;
      }
      this.run(i, Math.min(step_s, time_s - gust.start_s));
      const share = gustShape(phase[i]);
      const from = gust.from_deg * RAD_PER_DEG;
      north -= share * gust.peak_mps * Math.cos(from);
      east -= share * gust.peak_mps * Math.sin(from);
      down -= share * (gust.up_mps ?? 0);
      if (phase[i] < 2) quietUntil = -Infinity;
    }
    air[GUST_NORTH] = north;
    air[GUST_EAST] = east;
    air[GUST_DOWN] = down;
    air[QUIET_UNTIL] = quietUntil;
  }

  /** Runs gust `i` on by `time_s` through rise, hold and fall. */
  private run(i: number, time_s: number): void {
    const gust = this.gusts[i];
    const { phase, held_s } = this;
    const rate = risePerSecond(gust, this.air[GUST_AIRSPEED]);
    let left = time_s;
    if (left <= 0) return;
    if (phase[i] < 1) {
      const toPeak = (1 - phase[i]) / rate;
      if (left < toPeak) {
        phase[i] += left * rate;
        return;
      }
      phase[i] = 1;
      left -= toPeak;
    }
    const toHold = (gust.hold_s ?? 0) - held_s[i];
    if (left < toHold) {
      held_s[i] += left;
      return;
    }
    held_s[i] += toHold;
    phase[i] = Math.min(2, phase[i] + (left - toHold) * rate);
  }

  save(out: SnapshotWriter): void {
    out.putAll(this.air);
    out.put(this.gusts.length);
    out.putAll(this.phase);
    out.putAll(this.held_s);
  }

  /**
   * Restores the run of each gust. If the list has changed length since the snapshot, the gusts of the present
   * list stand where the airspeed then would have brought them.
   */
  load(from: SnapshotReader): void {
    from.takeInto(this.air);
    const phase = new Float64Array(from.take());
    const held_s = new Float64Array(phase.length);
    from.takeInto(phase);
    from.takeInto(held_s);
    this.air[QUIET_UNTIL] = -Infinity;
    if (phase.length === this.gusts.length) {
      this.phase = phase;
      this.held_s = held_s;
      return;
    }
    this.phase.fill(0);
    this.held_s.fill(0);
    this.gusts.forEach((gust, i) => this.run(i, this.air[GUST_TIME] - gust.start_s));
  }
}
