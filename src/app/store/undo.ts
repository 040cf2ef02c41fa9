/** Undo and redo of edits, as before-and-after pairs of what changed. Bounded; equal edits in a row join. */
import { signal, type ReadonlySignal } from '@preact/signals';

interface Step<Change> {
  readonly label: string;
  readonly change: Change;
  at_ms: number;
}

const MOST_STEPS = 200;
/** A slider drag is one edit: steps of one label join while they come this fast. */
const JOIN_WITHIN_MS = 800;

export class UndoHistory<Change> {
  private done: Step<Change>[] = [];
  private undone: Step<Change>[] = [];
  private sealed = false;
  private readonly labels = signal<{ undo: string | null; redo: string | null }>({ undo: null, redo: null });

  /** @param join makes one change of two that follow each other, or null when they do not belong together. */
  constructor(
    private readonly join: (first: Change, second: Change) => Change | null,
    private readonly now_ms: () => number = () => performance.now(),
  ) {}

  /** Labels of what undo and redo would do next; null when there is nothing. */
  get next(): ReadonlySignal<{ undo: string | null; redo: string | null }> {
    return this.labels;
  }

  record(label: string, change: Change): void {
    const at_ms = this.now_ms();
    const last = this.done.at(-1);
    const near = last !== undefined && last.label === label && at_ms - last.at_ms < JOIN_WITHIN_MS;
    const joined = near && !this.sealed && this.undone.length === 0 ? this.join(last.change, change) : null;
    if (joined !== null) this.done[this.done.length - 1] = { label, change: joined, at_ms };
    else this.done.push({ label, change, at_ms });
    if (this.done.length > MOST_STEPS) this.done.shift();
    this.undone = [];
    this.sealed = false;
    this.announce();
  }

  /** The next edit starts a step of its own, whatever its label. */
  seal(): void {
    this.sealed = true;
  }

  undo(): { label: string; change: Change } | null {
    return this.move(this.done, this.undone);
  }

  redo(): { label: string; change: Change } | null {
    return this.move(this.undone, this.done);
  }

  private move(from: Step<Change>[], to: Step<Change>[]): Step<Change> | null {
    const step = from.pop();
    if (step === undefined) return null;
    to.push(step);
    this.sealed = true;
    this.announce();
    return step;
  }

  private announce(): void {
    this.labels.value = { undo: this.done.at(-1)?.label ?? null, redo: this.undone.at(-1)?.label ?? null };
  }
}
