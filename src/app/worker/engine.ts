/**
 * The flight worker's inside, free of worker and clock: real-time ticking, rewind, settings in flight. Time
 * comes in as milliseconds, rows go out through a callback; so it runs in a test as well.
 */
import { InputError, refuse } from '../../craft/problem.ts';
import { Flight, type Start } from '../../flight/flight.ts';
import { NEUTRAL_STICKS, type Sticks } from '../../flight/pilot.ts';
import { recordCsv, Recorder, type EarlierSettings } from '../../flight/record.ts';
import { SIGNAL_NAMES, signalIndex } from '../../flight/signals.ts';
import type { FlightSettings, Speed, TickStats } from './protocol.ts';
import { Punctuality } from './punctuality.ts';

/** A snapshot this often, s, for at most this long back. */
const SNAPSHOT_S = 0.25;
const REWIND_S = 60;
/** A tick later than this after it was due counts as late. */
const FRAME_MS = 1000 / 60;
/** Of a stall no more than this is caught up; the rest of the time is lost, its ticks count as late. */
const CATCH_UP_MS = 250;
/** After a stall longer than this the flight pauses: nobody was there to fly it. */
const STALL_MS = 2000;
/** Work done in one go at most, so that messages get through. */
const SLICE_MS = 12;
/** Rows a second that go to the page at most. */
const ROWS_PER_S = 500;
/** Rows that the record keeps at most; then its oldest quarter goes. */
const LONGEST_RECORD = 600_000;
/** Command movement above this is noise, below it is flying. */
const ACTIVITY_CORNER_HZ = 20;
/** Changes nearer to each other than this are one movement of a slider, s. */
const ONE_CHANGE_S = 0.5;

type Event =
  | { readonly tick: number; readonly kind: 'sticks'; readonly sticks: Sticks }
  | { readonly tick: number; readonly kind: 'settings'; readonly settings: FlightSettings }
  | { readonly tick: number; readonly kind: 'upright' }
  | { readonly tick: number; readonly kind: 'drop' };

interface Keyframe {
  readonly tick: number;
  readonly snapshot: Float64Array;
  readonly settings: FlightSettings;
  readonly sticks: Sticks;
}

export interface EngineOutput {
  /** One tick's signals; the array is reused. */
  row(signals: Float64Array): void;
  began(time_s: number, loop_Hz: number): void;
  rewound(time_s: number, oldest_s: number, sticks: Sticks): void;
  stalled(away_s: number): void;
}

export class FlightEngine {
  private flight: Flight | null = null;
  private settings: FlightSettings | null = null;
  private start: Start = { kind: 'ground' };
  private speedNow: Speed = 1;
  private sticks: Sticks = { ...NEUTRAL_STICKS };
  private keyframes: Keyframe[] = [];
  private events: Event[] = [];
  private record = new Recorder();
  /** Settings that stood earlier in this flight, each until its time. */
  private earlier: EarlierSettings[] = [];
  /** Tick of the record's first row. */
  private recordFrom = 0;
  /** Where time began: at `origin_ms` the tick `originTick` was due. */
  private origin_ms = 0;
  private originTick = 0;
  private lastCall_ms = -1;
  private late = 0;
  private ticks = 0;
  private readonly punctuality = new Punctuality();
  private readonly slow_us = new Float64Array(4);
  /** A new flight's clock starts once it is ready, however long that took. */
  private fresh = false;
  private activity_us2 = 0;
  private heat_W = 0;
  private stride = 1;
  private readonly commandAt = signalIndex('cmd_FL_us');
  private readonly heatAt = signalIndex('heat_FL_W');

  constructor(private readonly output: EngineOutput) {}

  get speed(): Speed {
    return this.speedNow;
  }

  get stopped() {
    return this.flight?.stopped ?? null;
  }

  /** The payload is still on. */
  get loaded(): boolean {
    return this.settings?.build.payload !== undefined && this.flight?.payloadDropped === false;
  }

  stats(): TickStats {
    return {
      ticks: this.ticks,
      late: this.late,
      onTime: this.punctuality.share,
      motorActivity_us: Math.sqrt(this.activity_us2),
      windingHeat_W: this.heat_W,
    };
  }

  /**
   * A new flight.
   * @throws InputError when the craft cannot hover at this site; the flight that was running goes on.
   */
  begin(settings: FlightSettings, start: Start, now_ms: number): void {
    const flight = newFlight(settings, start);
    this.start = start;
    this.adopt(flight, settings, now_ms);
    this.output.began(0, settings.gains.loop_Hz);
  }

  /**
   * Settings in flight. Gains, wind, noise and faults act from the next tick; another build, scene, seed or
   * loop rate needs a new flight, which takes over where the old one is.
   * @throws InputError as `begin`.
   */
  change(settings: FlightSettings, now_ms: number): void {
    const { flight, settings: old } = this;
    if (flight === null || old === null) {
      this.begin(settings, this.start, now_ms);
      return;
    }
    if (!alike(settings.scene, old.scene)) {
      this.begin(settings, { kind: 'ground' }, now_ms);
      return;
    }
    const same =
      alike(settings.build, old.build) &&
      settings.gains.loop_Hz === old.gains.loop_Hz &&
      settings.seed === old.seed;
    if (!same) {
      const next = newFlight(settings, this.start);
      next.takeOver(flight);
      this.adopt(next, settings, now_ms);
      this.output.began(0, settings.gains.loop_Hz);
      return;
    }
    this.noteEarlier(old, settings, flight.time_s);
    this.settings = settings;
    this.events.push({ tick: flight.tickIndex, kind: 'settings', settings });
    applySettings(flight, settings);
  }

  /** Keeps for the record what stood until now, where gains or wind change. */
  private noteEarlier(old: FlightSettings, next: FlightSettings, until_s: number): void {
    if (alike(old.gains, next.gains) && alike(old.wind, next.wind)) return;
    const last = this.earlier.at(-1);
    if (last !== undefined && until_s - last.until_s < ONE_CHANGE_S) {
      this.earlier[this.earlier.length - 1] = { ...last, until_s };
    } else if (until_s > 0) {
      this.earlier.push({ until_s, gains: old.gains, wind: old.wind });
    }
  }

  setSticks(sticks: Sticks): void {
    if (sameSticks(sticks, this.sticks)) return;
    this.sticks = { ...sticks };
    this.events.push({ tick: this.flight?.tickIndex ?? 0, kind: 'sticks', sticks: this.sticks });
  }

  setSpeed(speed: Speed, now_ms: number): void {
    this.speedNow = speed;
    this.restartClock(now_ms);
  }

  setUpright(): void {
    if (this.flight === null) return;
    this.flight.setUpright();
    this.events.push({ tick: this.flight.tickIndex, kind: 'upright' });
  }

  dropPayload(): void {
    if (this.flight === null) return;
    this.flight.dropPayload();
    this.events.push({ tick: this.flight.tickIndex, kind: 'drop' });
  }

  /** One tick by hand, while paused. */
  singleTick(): void {
    if (this.flight !== null && this.speedNow === 0) this.tickOnce(this.flight);
  }

  /** Runs the ticks that are due; returns whether more are due already. */
  advance(now_ms: number): boolean {
    const { flight } = this;
    if (flight === null || this.speedNow === 0 || flight.stopped !== null) {
      this.lastCall_ms = now_ms;
      return false;
    }
    const away_ms = this.lastCall_ms < 0 ? 0 : now_ms - this.lastCall_ms;
    this.lastCall_ms = now_ms;
    if (away_ms > STALL_MS) {
      this.setSpeed(0, now_ms);
      this.output.stalled(away_ms / 1000);
      return false;
    }
    const perTick_ms = (1000 * flight.tick_s) / this.speedNow;
    this.loseTime(now_ms, away_ms, perTick_ms);
    const due = this.originTick + Math.floor((now_ms - this.origin_ms) / perTick_ms);
    // Enough for one slice even on a slow machine; what is left over is due at the next call.
    const most = Math.max(1, Math.ceil((SLICE_MS * 4) / 1000 / flight.tick_s));
    let done = 0;
    const lateBefore = this.late;
    while (flight.tickIndex < due && done < most && flight.stopped === null) {
      const due_ms = this.origin_ms + (flight.tickIndex - this.originTick) * perTick_ms;
      if (now_ms - due_ms > FRAME_MS + perTick_ms) this.late++;
      this.tickOnce(flight);
      done++;
    }
    if (done > 0) this.punctuality.count(now_ms, done, this.late - lateBefore);
    return flight.tickIndex < due;
  }

  /** After a stall, moves the clock's origin so that only a part of it is caught up. */
  private loseTime(now_ms: number, away_ms: number, perTick_ms: number): void {
    const lost = Math.floor((away_ms - CATCH_UP_MS) / perTick_ms);
    if (lost <= 0) return;
    this.origin_ms += lost * perTick_ms;
    this.late += lost;
    this.ticks += lost;
    this.punctuality.count(now_ms, lost, lost);
  }

  /** Starts the clock of a flight that has just been made; does nothing in the middle of one. */
  startClock(now_ms: number): void {
    if (this.fresh) this.restartClock(now_ms);
  }

  private tickOnce(flight: Flight): void {
    if (flight.tickIndex % this.keyframeTicks(flight) === 0) this.keepKeyframe(flight);
    flight.tick(this.sticks);
    this.ticks++;
    this.record.take(flight.signals);
    if (this.record.length >= LONGEST_RECORD) {
      this.record.dropOldest(LONGEST_RECORD / 4);
      this.recordFrom += LONGEST_RECORD / 4;
    }
    this.measureActivity(flight);
    if (flight.tickIndex % this.stride === 0) this.output.row(flight.signals);
  }

  private keyframeTicks(flight: Flight): number {
    return Math.max(1, Math.round(SNAPSHOT_S / flight.tick_s));
  }

  private keepKeyframe(flight: Flight): void {
    const { settings, sticks } = this;
    if (settings === null) return;
    const last = this.keyframes.at(-1);
    if (last !== undefined && last.tick >= flight.tickIndex) return;
    this.keyframes.push({ tick: flight.tickIndex, snapshot: flight.save(), settings, sticks });
    const oldest = flight.tickIndex - REWIND_S / flight.tick_s;
    while (this.keyframes.length > 1 && this.keyframes[1].tick <= oldest) this.keyframes.shift();
    while (this.events.length > 0 && this.events[0].tick < this.keyframes[0].tick) this.events.shift();
  }

  private measureActivity(flight: Flight): void {
    const follow = 1 - Math.exp(-2 * Math.PI * ACTIVITY_CORNER_HZ * flight.tick_s);
    const forget = 1 - Math.exp(-flight.tick_s / 0.5);
    let square = 0;
    let heat = 0;
    for (let i = 0; i < 4; i++) {
      const command = flight.signals[this.commandAt + i];
      if (Number.isNaN(this.slow_us[i])) this.slow_us[i] = command;
      this.slow_us[i] += follow * (command - this.slow_us[i]);
      square += (command - this.slow_us[i]) ** 2 / 4;
      heat += flight.signals[this.heatAt + i] / 4;
    }
    this.activity_us2 += forget * (square - this.activity_us2);
    this.heat_W += forget * (heat - this.heat_W);
  }

  /**
   * Back to the first tick not before `time_s`, by the snapshot before it and replay of what was done since.
   * Pauses. What was flown after it is forgotten once the flight goes on, here: at once.
   */
  rewind(time_s: number, now_ms: number): void {
    const { flight, settings } = this;
    if (flight === null || settings === null || this.keyframes.length === 0) return;
    const wanted = Math.max(0, Math.min(flight.tickIndex, Math.round(time_s / flight.tick_s)));
    const keyframe = this.keyframes.findLast((one) => one.tick <= wanted) ?? this.keyframes[0];
    const back = newFlight(keyframe.settings, this.start);
    applySettings(back, keyframe.settings);
    back.load(keyframe.snapshot);
    let { sticks } = keyframe;
    let then = keyframe.settings;
    // What was done at the snapshot's own tick is in it already.
    const events = this.events.filter((event) => event.tick > keyframe.tick && event.tick < wanted);
    while (back.tickIndex < wanted) {
      while (events.length > 0 && events[0].tick <= back.tickIndex) {
        const event = events.shift();
        if (event === undefined) break;
        if (event.kind === 'sticks') sticks = event.sticks;
        else if (event.kind === 'settings') {
          then = event.settings;
          applySettings(back, then);
        } else if (event.kind === 'upright') back.setUpright();
        else back.dropPayload();
      }
      back.tick(sticks);
    }
    // From here the person flies on with the settings on the panel, whatever they were then.
    applySettings(back, settings);
    this.flight = back;
    this.keyframes = this.keyframes.filter((one) => one.tick <= wanted);
    this.events = this.events.filter((event) => event.tick < wanted);
    this.events.push({ tick: wanted, kind: 'settings', settings });
    this.record.truncate(wanted - this.recordFrom);
    this.earlier = this.earlier.filter((one) => one.until_s < back.time_s);
    this.noteEarlier(then, settings, back.time_s);
    this.sticks = { ...sticks };
    this.setSpeed(0, now_ms);
    this.output.rewound(back.time_s, this.keyframes[0].tick * back.tick_s, this.sticks);
  }

  /** The record so far as CSV, with everything needed to fly it again. */
  recordBlob(): { csv: Blob; rows: number } {
    const { settings } = this;
    if (settings === null) throw new Error('no flight has begun');
    const pieces = [...recordCsv(this.record, { ...settings, earlier: this.earlier })];
    return { csv: new Blob(pieces, { type: 'text/csv' }), rows: this.record.length };
  }

  private adopt(flight: Flight, settings: FlightSettings, now_ms: number): void {
    this.flight = flight;
    this.settings = settings;
    this.keyframes = [];
    this.events = [{ tick: 0, kind: 'sticks', sticks: this.sticks }];
    this.record = new Recorder();
    this.recordFrom = 0;
    this.earlier = [];
    this.slow_us.fill(NaN);
    this.activity_us2 = 0;
    this.heat_W = 0;
    this.stride = Math.max(1, Math.ceil(settings.gains.loop_Hz / ROWS_PER_S));
    this.restartClock(now_ms);
    this.fresh = true;
  }

  private restartClock(now_ms: number): void {
    this.origin_ms = now_ms;
    this.originTick = this.flight?.tickIndex ?? 0;
    this.lastCall_ms = now_ms;
    this.fresh = false;
  }
}

export const ROW_SIZE = SIGNAL_NAMES.length;

function newFlight(settings: FlightSettings, start: Start): Flight {
  try {
    const flight = new Flight({ ...settings, start });
    applySettings(flight, settings);
    return flight;
  } catch (error) {
    if (error instanceof InputError) throw error;
    if (error instanceof RangeError) {
      throw refuse(settings.build.name, 'propeller', error.message, 'a craft that can hover at this site');
    }
    throw error;
  }
}

function applySettings(flight: Flight, settings: FlightSettings): void {
  if (flight.gains !== settings.gains) flight.setGains(settings.gains);
  if (flight.wind !== settings.wind) flight.setWind(settings.wind);
  if (flight.faults !== settings.faults) flight.setFaults(settings.faults);
  flight.setNoise(settings.noiseScale, settings.vibrationScale);
}

/** Same content; plain data that came through a message is never the same object. */
function alike(a: unknown, b: unknown): boolean {
  return a === b || JSON.stringify(a) === JSON.stringify(b);
}

function sameSticks(a: Sticks, b: Sticks): boolean {
  return (
    a.roll === b.roll &&
    a.pitch === b.pitch &&
    a.yaw === b.yaw &&
    a.throttle === b.throttle &&
    a.armed === b.armed &&
    a.levelling === b.levelling &&
    a.heightHold === b.heightHold &&
    a.moored === b.moored
  );
}
