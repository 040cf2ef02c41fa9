/** The page's end of the flight worker: rows into a ring for tape and view, state as signals, wishes out. */
import { signal } from '@preact/signals';
import type { Problem } from '../../craft/problem.ts';
import type { Start, Stopped } from '../../flight/flight.ts';
import type { Sticks } from '../../flight/pilot.ts';
import { SIGNAL_NAMES, signalIndex } from '../../flight/signals.ts';
import {
  createRing,
  firstRowAfter,
  oldestRow,
  pushRow,
  truncateRing,
  type SignalRing,
} from '../plots/ring.ts';
import type { ViewFrame } from '../view3d/flightView.ts';
import type { FlightSettings, FromWorker, Speed, TickStats, ToWorker } from './protocol.ts';

/** Rows kept: a minute at the engine's highest row rate. */
const RING_ROWS = 31_000;
/** The view runs this far behind the newest row, so that there are rows on both sides of its time. */
const VIEW_DELAY_S = 0.028;
const ROW = SIGNAL_NAMES.length;

/** One channel more than the signals: 1 inside a gust. */
export const GUST_CHANNEL = ROW;

const POSE = signalIndex('north_m');
const ATTITUDE = signalIndex('qw');
const SPEED = signalIndex('speed_FL_rpm');
const THRUST = signalIndex('thrust_FL_N');
const WIND = signalIndex('wind_n_mps');
const STRUCK = signalIndex('struck_FL');
const RAD_PER_S_PER_RPM = Math.PI / 30;

export interface ClientState {
  readonly speed: Speed;
  readonly stats: TickStats;
  readonly stopped: Stopped | null;
  readonly loop_Hz: number;
}

const NO_STATS: TickStats = { ticks: 0, late: 0, onTime: 1, motorActivity_us: 0, windingHeat_W: 0 };

export class FlightClient {
  readonly ring: SignalRing = createRing(ROW + 1, RING_ROWS);
  readonly state = signal<ClientState>({ speed: 1, stats: NO_STATS, stopped: null, loop_Hz: 400 });
  /** Newest row, for read-outs. */
  readonly newest = new Float64Array(ROW);
  private worker: Worker;
  private readonly row = new Float32Array(ROW + 1);
  private newestArrival_ms = 0;
  private gusts: readonly (readonly [number, number])[] = [];
  private recordWaits: ((record: { csv: Blob; rows: number }) => void)[] = [];
  private readonly pose = new Float64Array(7);
  private readonly speeds = new Float64Array(4);
  private readonly thrusts = new Float64Array(4);
  private readonly wind = new Float64Array(3);
  private readonly struck = new Uint8Array(4);
  private loaded = true;

  /** Told when input was refused, the page was away for long, or the flight began anew. */
  onRefused: (file: string, problems: readonly Problem[]) => void = () => undefined;
  onStalled: (away_s: number) => void = () => undefined;
  onBegan: () => void = () => undefined;
  /** The flight is back at an earlier instant, where the sticks stood so. */
  onRewound: (sticks: Sticks) => void = () => undefined;
  /** The worker itself failed; `begin` starts a new one. */
  onFailed: (what: string) => void = () => undefined;
  private failed = false;

  constructor(private readonly newWorker: () => Worker) {
    this.worker = this.listen(newWorker());
  }

  private listen(worker: Worker): Worker {
    worker.onmessage = ({ data }: MessageEvent<FromWorker>) => this.hear(data);
    worker.onerror = (event) => {
      event.preventDefault();
      this.failed = true;
      this.state.value = { ...this.state.value, speed: 0 };
      this.onFailed(event.message);
    };
    return worker;
  }

  begin(settings: FlightSettings, start: Start): void {
    if (this.failed) {
      this.worker.terminate();
      this.worker = this.listen(this.newWorker());
      this.failed = false;
    }
    this.say({ kind: 'begin', settings, start });
  }

  change(settings: FlightSettings): void {
    this.say({ kind: 'settings', settings });
  }

  /** Spans of the wind's gusts, s of flight time: shaded on the tape. */
  setGusts(spans: readonly (readonly [number, number])[]): void {
    this.gusts = spans;
  }

  setSticks(sticks: Sticks): void {
    this.say({ kind: 'sticks', sticks });
  }

  setSpeed(speed: Speed): void {
    this.state.value = { ...this.state.value, speed };
    this.say({ kind: 'speed', speed });
  }

  singleTick(): void {
    this.say({ kind: 'single-tick' });
  }

  setUpright(): void {
    this.say({ kind: 'set-upright' });
  }

  dropPayload(): void {
    this.say({ kind: 'drop-payload' });
  }

  rewind(time_s: number): void {
    this.say({ kind: 'rewind', time_s });
  }

  record(): Promise<{ csv: Blob; rows: number }> {
    return new Promise((resolve) => {
      this.recordWaits.push(resolve);
      this.say({ kind: 'record' });
    });
  }

  end(): void {
    this.worker.terminate();
  }

  private say(message: ToWorker): void {
    this.worker.postMessage(message);
  }

  private hear(message: FromWorker): void {
    if (message.kind === 'rows') this.takeRows(message);
    else if (message.kind === 'began') {
      truncateRing(this.ring, -Infinity);
      this.state.value = { ...this.state.value, stopped: null, loop_Hz: message.loop_Hz };
      this.onBegan();
    } else if (message.kind === 'rewound') {
      truncateRing(this.ring, message.time_s);
      this.state.value = { ...this.state.value, stopped: null, speed: 0 };
      this.onRewound(message.sticks);
    } else if (message.kind === 'record') {
      for (const wait of this.recordWaits.splice(0)) wait(message);
    } else if (message.kind === 'refused') this.onRefused(message.file, message.problems);
    else {
      this.state.value = { ...this.state.value, speed: 0 };
      this.onStalled(message.away_s);
    }
  }

  private takeRows(message: Extract<FromWorker, { kind: 'rows' }>): void {
    const rows = new Float64Array(message.buffer);
    for (let k = 0; k < message.count; k++) {
      const at = k * ROW;
      const time_s = rows[at];
      for (let i = 0; i < ROW; i++) this.row[i] = rows[at + i];
      this.row[GUST_CHANNEL] = this.gusts.some(([from, to]) => time_s >= from && time_s <= to) ? 1 : 0;
      pushRow(this.ring, time_s, this.row);
    }
    if (message.count > 0) {
      this.newest.set(rows.subarray((message.count - 1) * ROW, message.count * ROW));
      this.newestArrival_ms = performance.now();
    }
    this.loaded = message.loaded;
    const old = this.state.value;
    if (
      old.stats.ticks !== message.stats.ticks ||
      old.stopped !== message.stopped ||
      old.speed !== message.speed
    ) {
      // The worker's word on speed lags behind a wish just made; the wish stands until it is answered.
      this.state.value = { ...old, stats: message.stats, stopped: message.stopped };
    }
    this.worker.postMessage({ kind: 'buffer', buffer: message.buffer } satisfies ToWorker, [message.buffer]);
  }

  /** What to draw now, or at `at_s` while the tape is held; null before the first row. */
  frame(now_ms: number, at_s: number | null): ViewFrame | null {
    const { ring } = this;
    if (ring.written === 0) return null;
    const newest_s = ring.time_s[(ring.written - 1) % ring.capacity];
    const speed = this.state.value.speed;
    const live_s = newest_s + (speed * (now_ms - this.newestArrival_ms)) / 1000 - VIEW_DELAY_S * speed;
    const time_s = at_s ?? Math.min(newest_s, live_s);
    const after = Math.min(ring.written - 1, Math.max(oldestRow(ring), firstRowAfter(ring, time_s)));
    const before = Math.max(oldestRow(ring), after - 1);
    const a = before % ring.capacity;
    const b = after % ring.capacity;
    const span = ring.time_s[b] - ring.time_s[a];
    const share = span > 0 ? Math.max(0, Math.min(1, (time_s - ring.time_s[a]) / span)) : 1;
    const mixed = (channel: number) => {
      const column = ring.channels[channel];
      return column[a] + share * (column[b] - column[a]);
    };
    for (let i = 0; i < 3; i++) this.pose[i] = mixed(POSE + i);
    this.mixAttitude(a, b, share);
    for (let i = 0; i < 4; i++) this.speeds[i] = mixed(SPEED + i) * RAD_PER_S_PER_RPM;
    for (let i = 0; i < 4; i++) this.thrusts[i] = mixed(THRUST + i);
    for (let i = 0; i < 3; i++) this.wind[i] = mixed(WIND + i);
    for (let i = 0; i < 4; i++) this.struck[i] = ring.channels[STRUCK + i][b] > 0.5 ? 1 : 0;
    return {
      pose: this.pose,
      rotorSpeeds: this.speeds,
      thrusts_N: this.thrusts,
      wind_mps: this.wind,
      loaded: this.loaded,
      struck: this.struck,
    };
  }

  /** Normalised linear mix of two near quaternions, the short way. */
  private mixAttitude(a: number, b: number, share: number): void {
    const { channels } = this.ring;
    let dot = 0;
    for (let i = 0; i < 4; i++) dot += channels[ATTITUDE + i][a] * channels[ATTITUDE + i][b];
    const sign = dot < 0 ? -1 : 1;
    let square = 0;
    for (let i = 0; i < 4; i++) {
      const q = channels[ATTITUDE + i];
      const mixed = (1 - share) * q[a] + share * sign * q[b];
      this.pose[3 + i] = mixed;
      square += mixed * mixed;
    }
    const scale = square > 0 ? 1 / Math.sqrt(square) : 1;
    for (let i = 0; i < 4; i++) this.pose[3 + i] *= scale;
  }

  /** Value of a signal at `at_s` while the tape is held, else the newest. */
  value(channel: number, at_s: number | null): number {
    if (at_s === null || this.ring.written === 0) return this.newest[channel] ?? 0;
    const row = Math.min(this.ring.written - 1, firstRowAfter(this.ring, at_s));
    return this.ring.channels[channel][row % this.ring.capacity];
  }
}

/** Starts the flight worker. */
export function startFlightClient(): FlightClient {
  return new FlightClient(
    () => new Worker(new URL('./flight.worker.ts', import.meta.url), { type: 'module' }),
  );
}
