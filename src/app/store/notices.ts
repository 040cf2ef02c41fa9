/** Short messages to the person: what went wrong or changed, what to do; they stay until dismissed or outdated. */
import { signal, type ReadonlySignal, type Signal } from '@preact/signals';

export type NoticeKind = 'info' | 'warning' | 'error';

export interface NoticeAction {
  readonly label: string;
  readonly run: () => void;
}

export interface Notice {
  readonly id: number;
  readonly kind: NoticeKind;
  readonly text: string;
  /** One line each, under the text: problems with path, value, allowed. */
  readonly details: readonly string[];
  readonly action: NoticeAction | null;
  /** A later notice of the same topic replaces this one. */
  readonly topic: string | null;
}

const MOST_NOTICES = 5;

export class NoticeList {
  private readonly list: Signal<readonly Notice[]> = signal([]);
  private nextId = 1;

  get current(): ReadonlySignal<readonly Notice[]> {
    return this.list;
  }

  tell(
    kind: NoticeKind,
    text: string,
    options: { details?: readonly string[]; action?: NoticeAction; topic?: string } = {},
  ): number {
    const { details = [], action = null, topic = null } = options;
    const notice: Notice = { id: this.nextId++, kind, text, details, action, topic };
    const others = this.list.value.filter((other) => topic === null || other.topic !== topic);
    this.list.value = [...others, notice].slice(-MOST_NOTICES);
    return notice.id;
  }

  dismiss(id: number): void {
    this.list.value = this.list.value.filter((notice) => notice.id !== id);
  }

  /** Takes back what was said about `topic`: it no longer holds. */
  settle(topic: string): void {
    this.list.value = this.list.value.filter((notice) => notice.topic !== topic);
  }
}
