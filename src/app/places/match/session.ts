/** One log on the bench: its worker, where the reading stands, and what came of it. It outlives a change of place. */
import { batch, signal, type Signal } from '@preact/signals';
import type { Build } from '../../../craft/build.ts';
import { describeProblem } from '../../../craft/problem.ts';
import { parseColumns, type ColumnChoice, type Columns } from '../../../matching/columns.ts';
import type { LogProposal } from '../../../matching/inspectLog.ts';
import type { Offer } from '../../../matching/suspicions.ts';
import type { JobHandle } from '../../store/jobs.ts';
import type { Store } from '../../store/store.ts';
import type {
  Doing,
  FromMatchWorker,
  LogChoice,
  ReplayRequest,
  ShownMatch,
  ShownReplay,
  ToMatchWorker,
} from './messages.ts';
import { matchTexts as words } from './texts.ts';

export interface Matched {
  readonly file: File;
  readonly proposal: LogProposal;
  readonly choice: LogChoice;
  readonly craftId: string;
  /** The build it was matched with. */
  readonly build: Build;
  readonly result: ShownMatch;
}

export type MatchState =
  | { readonly kind: 'empty' }
  | {
      readonly kind: 'confirm';
      readonly file: File;
      readonly proposal: LogProposal;
      readonly choice: LogChoice;
      /** The mapping was confirmed before for a file of this shape. */
      readonly remembered: boolean;
    }
  | ({ readonly kind: 'matched' } & Matched);

export interface Busy {
  readonly fileName: string;
  readonly doing: Doing;
  readonly share: number | null;
}

export interface Replayed {
  readonly request: ReplayRequest;
  readonly replays: readonly ShownReplay[];
}

/** Entry of the place's memory; the latest shapes first. */
const MEMORY = 'match columns';
const MOST_SHAPES = 24;

interface RememberedShape extends LogChoice {
  readonly shape: string;
}

export class MatchSession {
  readonly state: Signal<MatchState> = signal({ kind: 'empty' });
  readonly busy: Signal<Busy | null> = signal(null);
  /** Why the last file was refused, a sentence each. */
  readonly refused: Signal<readonly string[]> = signal([]);
  readonly replayed: Signal<Replayed | null> = signal(null);
  /** Has the log that is shown. */
  private keeper: Worker | null = null;
  /** At work; may be the keeper. */
  private worker: Worker | null = null;
  private job: JobHandle | null = null;

  constructor(private readonly store: Store) {}

  /** Looks at a file; a record of the bench is matched at once. What was there stays until it is known to be a log. */
  open(file: File): void {
    this.ask(file.name, 'looking', { kind: 'inspect', file }, (data) => {
      if (data.kind !== 'proposal') return;
      const { proposal } = data;
      const kept = proposal.ownRecord ? null : this.remembered(proposal);
      const choice = kept ?? { columns: proposal.columns, loop_Hz: null };
      if (proposal.ownRecord) this.match(file, proposal, choice);
      else this.state.value = { kind: 'confirm', file, proposal, choice, remembered: kept !== null };
    });
  }

  choose(choice: LogChoice): void {
    const { value } = this.state;
    if (value.kind === 'confirm') this.state.value = { ...value, choice };
  }

  /** Reads and matches with the build on the desk. */
  match(file: File, proposal: LogProposal, choice: LogChoice): void {
    const build = this.store.build.value;
    const craftId = this.store.craft.value.id;
    this.ask(file.name, 'reading', { kind: 'match', file, choice, build }, (data) => {
      if (data.kind !== 'matched') return;
      if (!proposal.ownRecord) this.remember(proposal, choice);
      batch(() => {
        const { result } = data;
        this.state.value = { kind: 'matched', file, proposal, choice, craftId, build, result };
        this.replayed.value = null;
      });
      if (this.store.place.value !== 'match') this.store.setWaiting('match', words.waiting(file.name));
    });
  }

  /** Takes an offer: the same file again with a unit or a sign changed. */
  take(matched: Matched, offers: readonly Offer[]): void {
    const columns: Record<string, ColumnChoice | undefined> = { ...matched.choice.columns };
    for (const { signals, unit, sign } of offers) {
      for (const name of signals) {
        const now = columns[name];
        if (now === undefined) continue;
        const turned = now.sign === -1 ? 1 : -1;
        columns[name] = { ...now, unit: unit ?? now.unit, sign: sign === undefined ? now.sign : turned };
      }
    }
    this.match(matched.file, matched.proposal, { ...matched.choice, columns });
  }

  /** Back to the columns of the log that was matched. */
  columnsAgain({ file, proposal, choice }: Matched): void {
    this.state.value = { kind: 'confirm', file, proposal, choice, remembered: true };
  }

  /** Flies the logged setpoints. */
  replay({ file, choice }: Matched, request: ReplayRequest): void {
    this.ask(file.name, 'flying', { kind: 'replay', file, choice, ...request }, (data) => {
      if (data.kind === 'replayed') this.replayed.value = { request, replays: data.replays };
    });
  }

  /** Nothing on the bench. */
  clear(): void {
    this.stop();
    this.keeper?.terminate();
    this.keeper = null;
    batch(() => {
      this.state.value = { kind: 'empty' };
      this.replayed.value = null;
      this.refused.value = [];
    });
  }

  /** Ends what is under way; what was shown stays. */
  stop(): void {
    this.endWorker();
    this.finish();
  }

  private ask(fileName: string, doing: Doing, message: ToMatchWorker, hear: (data: FromMatchWorker) => void) {
    this.stop();
    const ready = message.kind === 'replay' ? this.keeper : null;
    const worker = ready ?? new Worker(new URL('./match.worker.ts', import.meta.url), { type: 'module' });
    this.worker = worker;
    this.job = this.store.jobs.start(words.job(fileName), () => this.stop());
    this.busy.value = { fileName, doing, share: null };
    this.refused.value = [];
    const refuse = (sentences: readonly string[]): void => {
      this.stop();
      this.refused.value = sentences;
    };
    worker.onerror = (event) => refuse([words.broken(fileName, event.message)]);
    worker.onmessage = ({ data }: MessageEvent<FromMatchWorker>) => {
      if (data.kind === 'progress') {
        this.job?.progress(data.share);
        this.busy.value = { fileName, doing: data.doing, share: data.share };
      } else if (data.kind === 'refused') {
        refuse(data.problems.map((problem) => describeProblem(data.file, problem)));
      } else if (data.kind === 'broken') refuse([words.broken(fileName, data.text)]);
      else {
        if (data.kind === 'proposal') this.endWorker();
        else this.keep(worker);
        this.finish();
        hear(data);
      }
    };
    worker.postMessage(message);
  }

  private keep(worker: Worker): void {
    if (this.keeper !== worker) this.keeper?.terminate();
    this.keeper = worker;
    this.worker = null;
  }

  private finish(): void {
    this.job?.end();
    this.job = null;
    this.busy.value = null;
  }

  private endWorker(): void {
    this.worker?.terminate();
    if (this.worker === this.keeper) this.keeper = null;
    this.worker = null;
  }

  // --- Column mapping, kept per file shape ------------------------------------------------------------------

  private shapes(): readonly RememberedShape[] {
    const kept = this.store.settings.value.places[MEMORY];
    return Array.isArray(kept) ? (kept as RememberedShape[]) : [];
  }

  private remembered(proposal: LogProposal): LogChoice | null {
    const found = this.shapes().find((one) => one.shape === shapeOf(proposal));
    if (found === undefined) return null;
    try {
      const columns: Columns = parseColumns(found.columns);
      const { loop_Hz } = found;
      return { columns, loop_Hz: typeof loop_Hz === 'number' && loop_Hz > 0 ? loop_Hz : null };
    } catch {
      // Kept by another version: the proposal stands.
      return null;
    }
  }

  private remember(proposal: LogProposal, choice: LogChoice): void {
    const shape = shapeOf(proposal);
    const others = this.shapes().filter((one) => one.shape !== shape);
    this.store.setPlaceMemory(MEMORY, [{ shape, ...choice }, ...others].slice(0, MOST_SHAPES));
  }
}

/** Files with the same heads in the same order have one shape. */
function shapeOf(proposal: LogProposal): string {
  return `${proposal.form.kind} ${proposal.form.heads.join('|')}`;
}
