/**
 * Commands on their way to the motors: each takes effect at its own time (compute delay, ESC frames), held
 * until the next. Over an integration step the queue gives the time-weighted mean command, so that a delay
 * that is no multiple of the step keeps its true length. Preallocated ring; nothing is allocated.
 */
import type { SnapshotReader, SnapshotWriter, Stateful } from '../math/snapshot.ts';

const CAPACITY = 1024;

export class CommandQueue implements Stateful {
  /** Command in effect at the end of the last step, µs, FL, FR, RL, RR. */
  readonly active_us = new Float64Array(4);
  /** Mean over the last step, µs. */
  readonly mean_us = new Float64Array(4);
  private readonly times_s = new Float64Array(CAPACITY);
  private readonly commands_us = new Float64Array(4 * CAPACITY);
  private head = 0;
  private count = 0;

  /** Sets the command at once, forgetting what was on its way. */
  force(command_us: ArrayLike<number>): void {
    for (let i = 0; i < 4; i++) this.active_us[i] = command_us[i];
    this.count = 0;
  }

  /** @param at_s time at which the command takes effect, not before those already waiting */
  push(at_s: number, command_us: Float64Array): void {
    if (this.count === CAPACITY) throw new RangeError(`more than ${CAPACITY} commands are waiting`);
    const slot = (this.head + this.count) % CAPACITY;
    this.times_s[slot] = at_s;
    for (let i = 0; i < 4; i++) this.commands_us[4 * slot + i] = command_us[i];
    this.count++;
  }

  /** Mean command over [from_s, from_s + step_s) into `mean_us`. */
  advance(from_s: number, step_s: number): void {
    const { active_us, mean_us } = this;
    // Times are sums of ticks and delays: a command due at the very end belongs to the next step.
    const end_s = from_s + step_s * (1 - 1e-9);
    let done = 0;
    for (let i = 0; i < 4; i++) mean_us[i] = 0;
    while (this.count > 0 && this.times_s[this.head] < end_s) {
      const until = Math.max(done, Math.min(1, (this.times_s[this.head] - from_s) / step_s));
      for (let i = 0; i < 4; i++) {
        mean_us[i] += (until - done) * active_us[i];
        active_us[i] = this.commands_us[4 * this.head + i];
      }
      done = until;
      this.head = (this.head + 1) % CAPACITY;
      this.count--;
    }
    for (let i = 0; i < 4; i++) mean_us[i] += (1 - done) * active_us[i];
  }

  save(out: SnapshotWriter): void {
    out.putAll(this.active_us);
    out.putAll(this.mean_us);
    out.put(this.count);
    for (let k = 0; k < this.count; k++) {
      const slot = (this.head + k) % CAPACITY;
      out.put(this.times_s[slot]);
      for (let i = 0; i < 4; i++) out.put(this.commands_us[4 * slot + i]);
    }
  }

  load(from: SnapshotReader): void {
    from.takeInto(this.active_us);
    from.takeInto(this.mean_us);
    this.head = 0;
    this.count = from.take();
    for (let slot = 0; slot < this.count; slot++) {
      this.times_s[slot] = from.take();
      for (let i = 0; i < 4; i++) this.commands_us[4 * slot + i] = from.take();
    }
  }
}
