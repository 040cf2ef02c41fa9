/**
 * Prove's work under way: one run at a time over all cores. It goes on while another place is open, and waits
 * while somebody flies, so that a flight has the machine to itself.
 */
import { effect, signal, type Signal } from '@preact/signals';
import { InputError } from '../../../craft/problem.ts';
import {
  runTasks,
  type PoolOutcome,
  type PoolRun,
  type PoolWork,
  type Progress,
} from '../../../trials/pool.ts';
import type { Sweep, Subject } from '../../../trials/sweep.ts';
import { runSweep, SweepCells } from '../../../trials/sweepResult.ts';
import type { Store } from '../../store/store.ts';
import { webWorker, workerCount } from './browserPool.ts';
import { SweepKeeper, type KeepTrouble } from './sweepKeeper.ts';
import { proveTexts as words } from './texts.ts';

export type WorkKind = 'trials' | 'sweep' | 'spread';

export interface Work {
  readonly kind: WorkKind;
  readonly progress: Progress | null;
  /** By the person, or because somebody flies. */
  readonly paused: false | 'asked' | 'flying';
}

/** The map is drawn anew this often at most. */
const DRAW_EVERY_MS = 120;

export class ProveRuns {
  /** What runs; null: nothing. */
  readonly work: Signal<Work | null> = signal(null);
  /** The craft's sweep, finished or not. */
  readonly cells: Signal<SweepCells | null> = signal(null);
  /** Goes up when cells came. */
  readonly version = signal(0);
  readonly trouble: Signal<KeepTrouble | null> = signal(null);
  private readonly keeper = new SweepKeeper((trouble) => {
    this.trouble.value = trouble;
  });
  private current: PoolRun | null = null;
  private drawn_ms = 0;

  constructor(private readonly store: Store) {
    let craftId = '';
    effect(() => {
      const { id } = store.craft.value;
      if (id === craftId) return;
      craftId = id;
      this.cancel();
      this.cells.value = null;
      void this.load(id);
    });
    effect(() => this.holdWhileFlying(store.place.value === 'fly'));
    window.addEventListener('pagehide', () => void this.keeper.flush());
  }

  /** Runs tasks; resolves with how they ended, null when something else is running. */
  run(kind: WorkKind, label: string, work: PoolWork): Promise<PoolOutcome | null> {
    return this.follow(kind, label, (progress) => runTasks(webWorker, workerCount(), { ...work, progress }));
  }

  /** A sweep in place of the craft's former one. */
  async startSweep(sweep: Sweep, subject: Subject): Promise<void> {
    if (this.work.value !== null) return;
    const cells = new SweepCells(sweep, subject);
    this.cells.value = cells;
    this.version.value++;
    void this.keeper.begin(this.store.craft.value.id, cells);
    await this.goOn();
  }

  /** Flies the cells that are missing. */
  async goOn(): Promise<void> {
    const cells = this.cells.value;
    if (cells === null || this.work.value !== null) return;
    await this.follow('sweep', words.sweepJob, (progress) =>
      runSweep(cells, webWorker, workerCount(), {
        cell: (cell) => {
          if (cells.at(cell.column, cell.row) !== null) this.keeper.add(cell);
          this.draw();
        },
        progress,
      }),
    );
    await this.keeper.flush();
  }

  cancel(): void {
    this.current?.cancel();
  }

  /** Holds the run, or lets it go on. */
  togglePause(): void {
    const work = this.work.value;
    if (work === null) return;
    if (work.paused === false) this.current?.pause();
    else this.current?.resume();
    this.work.value = { ...work, paused: work.paused === false ? 'asked' : false };
  }

  /** Somebody flies, here or in Fly. */
  holdWhileFlying(flying: boolean): void {
    const work = this.work.peek();
    if (work === null) return;
    if (flying && work.paused === false) {
      this.current?.pause();
      this.work.value = { ...work, paused: 'flying' };
    } else if (!flying && work.paused === 'flying') {
      this.current?.resume();
      this.work.value = { ...work, paused: false };
    }
  }

  private async load(craftId: string): Promise<void> {
    const cells = await this.keeper.load(craftId);
    if (cells === null || this.store.craft.value.id !== craftId || this.cells.value !== null) return;
    this.cells.value = cells;
    this.version.value++;
  }

  private async follow(
    kind: WorkKind,
    label: string,
    begin: (progress: (progress: Progress) => void) => PoolRun,
  ): Promise<PoolOutcome | null> {
    if (this.work.value !== null) return null;
    this.store.notices.settle('prove:deaths');
    const job = this.store.jobs.start(label, () => this.cancel());
    this.work.value = { kind, progress: null, paused: false };
    const run = begin((progress) => {
      job.progress(progress.done / progress.count);
      const work = this.work.value;
      if (work !== null) this.work.value = { ...work, progress };
    });
    this.current = run;
    try {
      const outcome = await run.done;
      this.tell(label, outcome);
      return outcome;
    } catch (error) {
      if (error instanceof InputError) this.store.tellInputError(error);
      else this.store.notices.tell('error', words.stopped(label, String(error)), { topic: 'prove:deaths' });
      return null;
    } finally {
      job.end();
      this.current = null;
      this.work.value = null;
      this.version.value++;
    }
  }

  /** Workers that died are said plainly; what is finished is kept either way. */
  private tell(label: string, { end, deaths, done }: PoolOutcome): void {
    if (deaths.length === 0) return;
    const text = end === 'crashed' ? words.crashed(label, done) : words.died(label, deaths.length);
    this.store.notices.tell(end === 'crashed' ? 'error' : 'warning', text, {
      details: [...new Set(deaths)].slice(0, 3),
      topic: 'prove:deaths',
    });
  }

  private draw(): void {
    const now_ms = performance.now();
    if (now_ms - this.drawn_ms < DRAW_EVERY_MS) return;
    this.drawn_ms = now_ms;
    this.version.value++;
  }
}
