/** Background work as the page shows it: label, share done, time left, a stop. */
import { signal, type ReadonlySignal, type Signal } from '@preact/signals';

export interface Job {
  readonly id: number;
  readonly label: string;
  /** 0 … 1; null while it cannot be said. */
  readonly share: ReadonlySignal<number | null>;
  /** Seconds left by the pace so far; null while it cannot be said. */
  readonly left_s: ReadonlySignal<number | null>;
  /** Null when it cannot be stopped. */
  readonly stop: (() => void) | null;
}

/** What the one who does the work holds. */
export interface JobHandle {
  progress(share: number): void;
  /** Takes the job off the list; call it once, also after a failure or a stop. */
  end(): void;
}

/** Shares below this say nothing about the pace yet. */
const LEAST_SHARE = 0.02;

export class JobList {
  private readonly list: Signal<readonly Job[]> = signal([]);
  private nextId = 1;

  constructor(private readonly now_ms: () => number = () => performance.now()) {}

  get current(): ReadonlySignal<readonly Job[]> {
    return this.list;
  }

  start(label: string, stop: (() => void) | null = null): JobHandle {
    const share = signal<number | null>(null);
    const left_s = signal<number | null>(null);
    const begun_ms = this.now_ms();
    const job: Job = { id: this.nextId++, label, share, left_s, stop };
    this.list.value = [...this.list.value, job];
    return {
      progress: (done) => {
        const held = Math.min(1, Math.max(0, done));
        share.value = held;
        const spent_s = (this.now_ms() - begun_ms) / 1000;
        left_s.value = held < LEAST_SHARE ? null : (spent_s * (1 - held)) / held;
      },
      end: () => {
        this.list.value = this.list.value.filter((other) => other !== job);
      },
    };
  }
}
