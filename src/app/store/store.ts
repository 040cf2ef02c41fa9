/**
 * The page's one store: signals to read, actions to write. Every edit of a build, gains, wind or scene goes
 * through the parsers of craft/: what they refuse leaves the old value in place and is told in a notice.
 * Every such edit can be undone.
 */
import { batch, computed, signal, type ReadonlySignal, type Signal } from '@preact/signals';
import { parseBuild, type Build } from '../../craft/build.ts';
import { parseGains, type Gains } from '../../craft/gains.ts';
import { describeProblem, InputError, type Problem } from '../../craft/problem.ts';
import { parseScene, type Scene } from '../../craft/scene.ts';
import { parseWind, type Wind } from '../../craft/wind.ts';
import { en, type Texts } from '../texts/en.ts';
import { changedCrafts, joined, reversed, type Change, type SlotChange } from './changes.ts';
import { demoScenes } from './demos.ts';
import {
  freeName,
  newCraft,
  newGainSet,
  sameJson,
  type CraftWork,
  type Desk,
  type GainSet,
  type PlaceName,
  type Settings,
  type Side,
  type WorkDocument,
} from './document.ts';
import { JobList } from './jobs.ts';
import { NoticeList } from './notices.ts';
import { UndoHistory } from './undo.ts';

/** Problems of a file shown at once. */
const MOST_PROBLEMS = 5;

/** Saved gain sets kept a craft and side. */
const MOST_VERSIONS = 100;

/** Where the work stands: written down, on its way, or not written (with the reason). */
export type SaveState =
  | { readonly kind: 'off'; readonly reason: string }
  | { readonly kind: 'pending' }
  /** Revision of the last save; null: nothing had to be saved since the page was opened. */
  | { readonly kind: 'saved'; readonly revision: number | null }
  | { readonly kind: 'failed'; readonly reason: string };

type Edit<T> = T | ((now: T) => T);

interface EditOptions {
  /** Say nothing in a notice; the caller shows the returned problems beside the field. */
  readonly quiet?: boolean;
}

export class Store {
  readonly notices = new NoticeList();
  readonly jobs = new JobList();
  readonly saveState: Signal<SaveState> = signal({ kind: 'off', reason: '' });
  /** Places where something waits for the person, with what it is. */
  readonly waiting: Signal<Readonly<Partial<Record<PlaceName, string>>>> = signal({});

  /** A file that came in by drop and belongs to a place; the place takes it with `takeOffered`. */
  readonly offered: Signal<{ readonly place: PlaceName; readonly file: File } | null> = signal(null);

  private readonly craftList: Signal<readonly CraftWork[]>;
  private readonly deskNow: Signal<Desk>;
  private readonly settingsNow: Signal<Settings>;
  private readonly history = new UndoHistory<Change>(joined);

  /** Every craft on the bench. */
  readonly crafts: ReadonlySignal<readonly CraftWork[]>;
  readonly desk: ReadonlySignal<Desk>;
  readonly settings: ReadonlySignal<Settings>;
  /** The craft on the desk, and what follows from it. */
  readonly craft: ReadonlySignal<CraftWork>;
  readonly build: ReadonlySignal<Build>;
  readonly buildChanged: ReadonlySignal<boolean>;
  readonly side: ReadonlySignal<Side>;
  readonly gainSet: ReadonlySignal<GainSet>;
  /** The working gains of the side that is being edited. */
  readonly gains: ReadonlySignal<Gains>;
  readonly savedGains: ReadonlySignal<Gains>;
  readonly gainsChanged: ReadonlySignal<boolean>;
  readonly gainsA: ReadonlySignal<Gains>;
  readonly gainsB: ReadonlySignal<Gains | null>;
  readonly wind: ReadonlySignal<Wind>;
  readonly scene: ReadonlySignal<Scene>;
  readonly place: ReadonlySignal<PlaceName>;
  /** Scenes to choose from: the program's own, and the one on the desk when it came from a file. */
  readonly scenes: ReadonlySignal<readonly Scene[]>;

  constructor(
    start: WorkDocument,
    readonly texts: Texts = en,
  ) {
    this.craftList = signal(start.crafts);
    this.deskNow = signal(start.desk);
    this.settingsNow = signal(start.settings);
    this.crafts = this.craftList;
    this.desk = this.deskNow;
    this.settings = this.settingsNow;
    this.craft = computed(() => {
      const crafts = this.craftList.value;
      return crafts.find((craft) => craft.id === this.deskNow.value.currentId) ?? crafts[0];
    });
    this.build = computed(() => this.craft.value.build);
    this.buildChanged = computed(() => !sameJson(this.craft.value.build, this.craft.value.savedBuild));
    this.side = computed(() => (this.craft.value.gainsB === null ? 'A' : this.deskNow.value.side));
    this.gainSet = computed(() => sideOrA(this.craft.value, this.side.value));
    this.gains = computed(() => this.gainSet.value.working);
    this.savedGains = computed(() => this.gainSet.value.saved);
    this.gainsChanged = computed(() => !sameJson(this.gainSet.value.working, this.gainSet.value.saved));
    this.gainsA = computed(() => this.craft.value.gainsA.working);
    this.gainsB = computed(() => this.craft.value.gainsB?.working ?? null);
    this.wind = computed(() => this.deskNow.value.wind);
    this.scene = computed(() => this.deskNow.value.scene);
    this.place = computed(() => this.deskNow.value.place);
    const own = demoScenes();
    this.scenes = computed(() => {
      const now = this.scene.value;
      return own.some((scene) => scene.name === now.name) ? own : [...own, now];
    });
  }

  /** Everything that is kept, as one immutable value. */
  document(): WorkDocument {
    return { crafts: this.craftList.value, desk: this.deskNow.value, settings: this.settingsNow.value };
  }

  // ── Edits that can be undone ───────────────────────────────────────────────────────────────────────────

  /** The craft's build. Returns what is wrong with it; nothing: it was taken. */
  setBuild(edit: Edit<Build>, label: string, options: EditOptions = {}): readonly Problem[] {
    return this.attempt(options, () => {
      const build = parseBuild(applied(edit, this.build.value), label);
      this.editCraft(label, (craft) => ({ ...craft, build }));
    });
  }

  /** The working gains of `side` (default: the side being edited). An absent B comes into being. */
  setGains(
    edit: Edit<Gains>,
    label: string,
    options: EditOptions & { readonly side?: Side } = {},
  ): readonly Problem[] {
    return this.attempt(options, () => {
      const side = options.side ?? this.side.value;
      const before = sideOrA(this.craft.value, side);
      const working = parseGains(applied(edit, before.working), label);
      this.editCraft(label, (craft) => withSet(craft, side, { ...before, working }));
    });
  }

  setWind(edit: Edit<Wind>, label: string, options: EditOptions = {}): readonly Problem[] {
    return this.attempt(options, () => {
      const before = this.wind.value;
      const after = parseWind(applied(edit, before), label);
      this.commit(label, [{ slot: 'wind', before, after }]);
    });
  }

  /** A flying site; its own wind comes with it unless `keepWind`. */
  setScene(
    edit: Edit<Scene>,
    label: string,
    options: EditOptions & { readonly keepWind?: boolean } = {},
  ): readonly Problem[] {
    return this.attempt(options, () => {
      const before = this.scene.value;
      const after = parseScene(applied(edit, before), label);
      const change: SlotChange[] = [{ slot: 'scene', before, after }];
      if (options.keepWind !== true)
        change.push({ slot: 'wind', before: this.wind.value, after: after.wind });
      this.commit(label, change);
    });
  }

  /** What a place keeps about this craft, as JSON-ready data. */
  setSheet(name: string, value: unknown, label: string): void {
    this.editCraft(label, (craft) => ({ ...craft, sheets: { ...craft.sheets, [name]: value } }));
  }

  /** New crafts, the first of them on the desk; a name that is taken gets a number. */
  addCrafts(crafts: readonly CraftWork[], label: string): void {
    if (crafts.length === 0) return;
    const names = this.crafts.value.map((craft) => craft.build.name);
    const added = crafts.map((craft): SlotChange => {
      const name = freeName(craft.build.name, names);
      names.push(name);
      const after = {
        ...craft,
        build: { ...craft.build, name },
        savedBuild: { ...craft.savedBuild, name },
      };
      return { slot: 'craft', id: craft.id, before: null, after };
    });
    this.commit(label, [...added, { slot: 'current', before: this.craft.value.id, after: crafts[0].id }]);
  }

  /**
   * Lays what a trial flew on the desk, as one step that undo takes back: another build comes as a craft of its
   * own called `name`, other gains as B of this craft; without a wind the one on the desk stays.
   */
  bringToDesk(
    flown: {
      readonly build: Build;
      readonly gains: Gains;
      readonly wind: Wind | null;
      readonly name: string;
    },
    label: string,
  ): readonly Problem[] {
    return this.attempt({}, () => {
      const craft = this.craft.value;
      const gains = parseGains(flown.gains, label);
      const same = sameJson(flown.build, craft.build);
      const change: SlotChange[] = same
        ? [{ slot: 'craft', id: craft.id, before: craft, after: withB(craft, gains) }]
        : this.newOnDesk(parseBuild(flown.build, label), gains, flown.name);
      if (flown.wind !== null)
        change.push({ slot: 'wind', before: this.wind.value, after: parseWind(flown.wind, label) });
      this.history.seal();
      this.commit(label, change);
      this.chooseSide(same ? 'B' : 'A');
    });
  }

  private newOnDesk(build: Build, gains: Gains, wanted: string): SlotChange[] {
    const names = this.crafts.value.map((craft) => craft.build.name);
    const after = newCraft({ ...build, name: freeName(wanted, names) }, gains);
    return [
      { slot: 'craft', id: after.id, before: null, after },
      { slot: 'current', before: this.craft.value.id, after: after.id },
    ];
  }

  /** Gains from a file: they become the working and the saved ones of the side being edited. */
  openGains(gains: Gains, label: string): void {
    const side = this.side.value;
    this.editCraft(label, (craft) => {
      const { history } = sideOrA(craft, side);
      return withSet(craft, side, { working: gains, saved: gains, history });
    });
  }

  /** Takes a craft away; the last one stays. Returns whether it went. */
  removeCraft(id: string, label: string): boolean {
    const before = this.crafts.value.find((craft) => craft.id === id);
    const other = this.crafts.value.find((craft) => craft.id !== id);
    if (before === undefined || other === undefined) return false;
    const change: SlotChange[] = [{ slot: 'craft', id, before, after: null }];
    if (this.craft.value.id === id) change.push({ slot: 'current', before: id, after: other.id });
    this.commit(label, change);
    return true;
  }

  /** The working gains become the saved ones, with a note in the history. */
  saveGains(note: string): void {
    const side = this.side.value;
    this.history.seal();
    this.editCraft(this.texts.edits.saveGains, (craft) => {
      const set = sideOrA(craft, side);
      const version = { savedAt: new Date().toISOString(), note, gains: set.working };
      const history = [...set.history, version].slice(-MOST_VERSIONS);
      return withSet(craft, side, { working: set.working, saved: set.working, history });
    });
  }

  saveBuild(): void {
    this.editCraft(this.texts.edits.saveBuild, (craft) => ({ ...craft, savedBuild: craft.build }));
  }

  /** B becomes a copy of A's working gains, to be changed and compared. */
  copyToB(): void {
    this.editCraft(this.texts.edits.copyToB, (craft) => ({
      ...craft,
      gainsB: newGainSet(craft.gainsA.working),
    }));
  }

  dropB(): void {
    this.editCraft(this.texts.edits.dropB, (craft) => ({ ...craft, gainsB: null }));
  }

  /** The next edit is an undo step of its own even if it bears the same label. */
  sealEdit(): void {
    this.history.seal();
  }

  get undoLabels(): ReadonlySignal<{ undo: string | null; redo: string | null }> {
    return this.history.next;
  }

  undo(): void {
    const step = this.history.undo();
    if (step !== null) this.apply(reversed(step.change));
  }

  redo(): void {
    const step = this.history.redo();
    if (step !== null) this.apply(step.change);
  }

  // ── Choices: kept, but not edits ───────────────────────────────────────────────────────────────────────

  chooseCraft(id: string): void {
    if (this.crafts.value.some((craft) => craft.id === id)) this.changeDesk({ currentId: id });
  }

  chooseSide(side: Side): void {
    this.changeDesk({ side });
  }

  choosePlace(place: PlaceName): void {
    if (place !== this.place.value) this.changeDesk({ place });
  }

  changeSettings(change: Partial<Settings>): void {
    this.settingsNow.value = { ...this.settingsNow.value, ...change };
  }

  /** Stick settings of one device, opaque to the store. */
  setStickSettings(device: string, value: unknown): void {
    this.changeSettings({ sticks: { ...this.settingsNow.value.sticks, [device]: value } });
  }

  /** Something a place remembers between visits (open panels, chosen plot), opaque to the store. */
  setPlaceMemory(name: string, value: unknown): void {
    this.changeSettings({ places: { ...this.settingsNow.value.places, [name]: value } });
  }

  /** Puts a dot beside a place's word, with the reason; null takes it off. */
  setWaiting(place: PlaceName, what: string | null): void {
    const others = Object.entries(this.waiting.value).filter(([name]) => name !== place);
    this.waiting.value = Object.fromEntries(what === null ? others : [...others, [place, what]]);
  }

  /** Hands a file to a place, which takes it from `offered` when it is open. */
  offerFile(place: PlaceName, file: File): void {
    this.offered.value = { place, file };
    this.setWaiting(place, file.name);
  }

  /** The file offered to `place`, once. */
  takeOffered(place: PlaceName): File | null {
    const offer = this.offered.value;
    if (offer?.place !== place) return null;
    this.offered.value = null;
    this.setWaiting(place, null);
    return offer.file;
  }

  /** Crafts as another window or an archive left them; not an edit of this window. */
  adoptCrafts(crafts: readonly CraftWork[]): void {
    if (crafts.length > 0) this.craftList.value = crafts;
  }

  /** Runs `act`; an InputError becomes a notice (unless quiet) and is returned as its problems. */
  attempt(options: EditOptions, act: () => void): readonly Problem[] {
    try {
      act();
      return [];
    } catch (error) {
      if (!(error instanceof InputError)) throw error;
      if (options.quiet !== true) this.tellInputError(error);
      return error.problems;
    }
  }

  tellInputError(error: InputError): void {
    const lines = error.problems
      .slice(0, MOST_PROBLEMS)
      .map((problem) => describeProblem(error.file, problem));
    const more = error.problems.length - lines.length;
    this.notices.tell('error', this.texts.notices.refused(error.file), {
      details: more > 0 ? [...lines, this.texts.notices.more(more)] : lines,
      topic: `input:${error.file}`,
    });
  }

  private editCraft(label: string, edit: (craft: CraftWork) => CraftWork): void {
    const before = this.craft.value;
    this.commit(label, [{ slot: 'craft', id: before.id, before, after: edit(before) }]);
  }

  private commit(label: string, change: Change): void {
    this.history.record(label, change);
    this.apply(change);
  }

  private apply(change: Change): void {
    batch(() => {
      this.craftList.value = changedCrafts(this.craftList.value, change);
      for (const one of change) {
        if (one.slot === 'wind') this.changeDesk({ wind: one.after });
        else if (one.slot === 'scene') this.changeDesk({ scene: one.after });
        else if (one.slot === 'current') this.changeDesk({ currentId: one.after });
      }
    });
  }

  private changeDesk(change: Partial<Desk>): void {
    this.deskNow.value = { ...this.deskNow.value, ...change };
  }
}

function applied<T>(edit: Edit<T>, now: T): T {
  return typeof edit === 'function' ? (edit as (now: T) => T)(now) : edit;
}

function sideOrA(craft: CraftWork, side: Side): GainSet {
  return side === 'B' && craft.gainsB !== null ? craft.gainsB : craft.gainsA;
}

function withSet(craft: CraftWork, side: Side, set: GainSet): CraftWork {
  return side === 'A' ? { ...craft, gainsA: set } : { ...craft, gainsB: set };
}

function withB(craft: CraftWork, gains: Gains): CraftWork {
  return withSet(craft, 'B', { ...(craft.gainsB ?? newGainSet(gains)), working: gains });
}
