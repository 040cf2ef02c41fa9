/**
 * A flight session: worker, seat and what the person chose for this flight. Lives on, paused, while another
 * place is open.
 */
import { computed, effect, signal, type ReadonlySignal } from '@preact/signals';
import { describeProblem } from '../../../craft/problem.ts';
import { gustSpans } from '../../../disturbance/gusts.ts';
import { signalIndex } from '../../../flight/signals.ts';
import { FIRST_KEYS, keyMapFrom, type KeyMap } from '../../input/keyMap.ts';
import { Seat } from '../../input/seat.ts';
import type { Store } from '../../store/store.ts';
import { startFlightClient, type FlightClient } from '../../worker/client.ts';
import type { FlightSettings, Speed } from '../../worker/protocol.ts';
import { faultsOf, NO_FAULTS, type FaultChoices } from './faultChoices.ts';
import { flyTexts } from './texts.ts';
import { Watch } from './watch.ts';

/** Choices of this flight that are not part of build, gains or wind. */
export interface FlightChoices extends FaultChoices {
  readonly seed: number;
  readonly noiseScale: number;
  readonly vibrationScale: number;
}

const FIRST_CHOICES: FlightChoices = { ...NO_FAULTS, seed: 1, noiseScale: 1, vibrationScale: 1 };

const TOUCHING = signalIndex('touching');
const THROTTLE = signalIndex('throttle');
const BATTERY = signalIndex('battery_V');
const DISARM_AGAIN_MS = 1200;
/** Where the key map is kept among the places' memory. */
const KEYS_KEPT = 'fly.keys';

export class FlightSession {
  readonly client: FlightClient;
  readonly seat: Seat;
  readonly choices = signal<FlightChoices>(FIRST_CHOICES);
  /** Instant the tape shows, s; null: live. */
  readonly at_s = signal<number | null>(null);
  /** What the person chose to press for what. */
  readonly keys: ReadonlySignal<KeyMap>;
  /** What is going on with the craft that the person should know at once. */
  readonly watch = new Watch();
  private speedBefore: Speed = 1;
  private readonly ends: (() => void)[] = [];
  private disarmAsked_ms = -Infinity;
  private lowToldAt_s = -Infinity;

  constructor(private readonly store: Store) {
    this.client = startFlightClient();
    this.keys = computed(() => keyMapFrom(store.settings.value.places[KEYS_KEPT]));
    this.seat = new Seat((id) => store.settings.value.sticks[id]);
    this.client.onRefused = (file, problems) => {
      store.notices.tell('error', flyTexts.refused, {
        details: problems.slice(0, 4).map((problem) => describeProblem(file, problem)),
        topic: 'fly:refused',
      });
    };
    this.client.onStalled = (away_s) =>
      store.notices.tell('info', flyTexts.stalled(away_s), { topic: 'fly:stalled' });
    this.client.onBegan = () => {
      this.at_s.value = null;
    };
    this.client.onFailed = (what) =>
      store.notices.tell('error', flyTexts.failed, {
        details: [what],
        topic: 'fly:failed',
        action: { label: flyTexts.restart, run: () => this.restart() },
      });
    this.client.onRewound = (sticks) => {
      this.at_s.value = null;
      this.seat.restore(sticks);
      if (this.speedBefore > 0) this.client.setSpeed(this.speedBefore);
    };
    this.seat.onLost = (id) => store.notices.tell('warning', flyTexts.lost(id), { topic: 'fly:lost' });
    this.seat.onSource = (source) => {
      if (source === 'gamepad') store.notices.settle('fly:lost');
      store.notices.tell('info', flyTexts.took[source], { topic: 'fly:source' });
    };
    this.follow();
  }

  /** The settings that the flight has now. */
  private settings(): FlightSettings {
    const { store } = this;
    const choices = this.choices.value;
    return {
      build: store.build.value,
      gains: store.gains.value,
      wind: store.wind.value,
      scene: store.scene.value,
      seed: choices.seed,
      faults: faultsOf(choices),
      noiseScale: choices.noiseScale,
      vibrationScale: choices.vibrationScale,
    };
  }

  /** Hands every change of build, gains, wind, scene and choices to the flight. */
  private follow(): void {
    let first = true;
    this.ends.push(
      effect(() => {
        const settings = this.settings();
        this.client.setGusts(gustSpans(settings.wind, Math.max(1, settings.wind.mean_mps)));
        if (first) this.client.begin(settings, { kind: 'ground' });
        else this.client.change(settings);
        first = false;
      }),
      effect(() => this.seat.keys.bind(this.keys.value)),
    );
  }

  /** Keys as the person wants them; null: as they came. */
  setKeys(map: KeyMap | null): void {
    this.store.setPlaceMemory(KEYS_KEPT, map ?? FIRST_KEYS);
  }

  change(change: Partial<FlightChoices>): void {
    this.choices.value = { ...this.choices.value, ...change };
  }

  restart(): void {
    this.seat.arm(false);
    this.store.notices.settle('fly:failed');
    this.client.setSticks(this.seat.sticks);
    this.client.begin(this.settings(), { kind: 'ground' });
    this.setSpeed(1);
  }

  /** Space: on the ground at once; in the air only when pressed again. */
  toggleArmed(now_ms: number): void {
    const { armed } = this.seat.state.value;
    const inAir = this.client.newest[TOUCHING] === 0;
    if (armed && inAir && now_ms - this.disarmAsked_ms > DISARM_AGAIN_MS) {
      this.disarmAsked_ms = now_ms;
      this.store.notices.tell('warning', flyTexts.disarmInAir, { topic: 'fly:disarm' });
      return;
    }
    this.store.notices.settle('fly:disarm');
    if (this.seat.arm(!armed)) this.store.notices.settle('fly:throttle');
    else this.store.notices.tell('warning', flyTexts.throttleFirst, { topic: 'fly:throttle' });
  }

  /** Self-levelling or height hold on and off. */
  setAssist(which: 'levelling' | 'heightHold'): void {
    const now = this.seat.state.value[which];
    this.seat.setAssists({ [which]: !now }, this.client.newest[THROTTLE]);
  }

  /** A gust from the mean wind's side, half a second from now. */
  gustNow(peak_mps: number): void {
    const start_s = (this.client.newest[0] ?? 0) + 0.5;
    this.store.setWind(
      (wind) => ({
        ...wind,
        gusts: [
          ...wind.gusts.filter((gust) => gust.start_s > start_s - 120).slice(-40),
          { start_s, rise_s: 0.8, peak_mps, from_deg: wind.from_deg },
        ],
      }),
      'gust',
    );
  }

  setSpeed(speed: Speed): void {
    if (speed > 0 && this.at_s.value !== null) this.at_s.value = null;
    this.client.setSpeed(speed);
  }

  togglePause(): void {
    const now = this.client.state.value.speed;
    if (now > 0) this.speedBefore = now;
    this.setSpeed(now > 0 ? 0 : this.speedBefore > 0 ? this.speedBefore : 1);
  }

  /** The tape was moved: hold the flight and show that instant. */
  seek(time_s: number | null): void {
    const { speed } = this.client.state.value;
    if (time_s !== null && speed > 0) {
      this.speedBefore = speed;
      this.client.setSpeed(0);
    }
    this.at_s.value = time_s;
  }

  /** Goes on from the instant that the tape shows. */
  resume(): void {
    const at = this.at_s.value;
    if (at === null) {
      this.setSpeed(this.speedBefore > 0 ? this.speedBefore : 1);
      return;
    }
    if (this.speedBefore === 0) this.speedBefore = 1;
    this.client.rewind(at);
  }

  async saveRecord(): Promise<void> {
    const { csv, rows } = await this.client.record();
    const link = document.createElement('a');
    link.href = URL.createObjectURL(csv);
    link.download = `${this.store.build.value.name.toLowerCase().replace(/[^a-z0-9]+/g, '-')}-record.csv`;
    link.click();
    setTimeout(() => URL.revokeObjectURL(link.href), 10_000);
    this.store.notices.tell('info', flyTexts.saved(rows), { topic: 'fly:saved' });
  }

  /** Once a frame: inputs on, sticks out, warnings. */
  beat(dt_s: number): void {
    const { newest, state } = this.client;
    // While paused the tape may be dragged; the sticks stay as they were.
    this.seat.advance(dt_s, newest[TOUCHING] > 0.5);
    this.client.setSticks(this.seat.sticks);
    const { esc } = this.store.build.value;
    this.watch.look(newest, state.value.stats.motorActivity_us / (esc.max_us - esc.min_us), dt_s);
    this.warn();
  }

  private warn(): void {
    const time_s = this.client.newest[0];
    const volts = this.client.newest[BATTERY];
    const { battery } = this.store.build.value;
    const cutoff = battery.cells * (battery.cutoff_V_per_cell ?? 3.3);
    if (volts > 0 && volts < cutoff && (time_s - this.lowToldAt_s > 20 || time_s < this.lowToldAt_s)) {
      this.lowToldAt_s = time_s;
      this.store.notices.tell('warning', flyTexts.batteryLow, { topic: 'fly:battery' });
    }
  }

  /** Pauses while nobody looks. */
  leave(): void {
    const { speed } = this.client.state.value;
    if (speed > 0) this.speedBefore = speed;
    this.seat.keys.releaseAll();
    this.client.setSpeed(0);
  }

  get state(): ReadonlySignal<FlightClient['state']['value']> {
    return this.client.state;
  }
}
