/** The flight in a worker of its own: keeps real time whatever the screen does. */
import { InputError } from '../../craft/problem.ts';
import { FlightEngine, ROW_SIZE } from './engine.ts';
import type { FromWorker, ToWorker } from './protocol.ts';

const SEND_EVERY_MS = 12;
const ROWS_A_BUFFER = 512;

const say = (message: FromWorker, transfer: Transferable[] = []): void => {
  self.postMessage(message, { transfer });
};

/** Buffers that travel to the page and come back. */
const pool: ArrayBuffer[] = [];
const takeBuffer = (): Float64Array =>
  new Float64Array(pool.pop() ?? new ArrayBuffer(ROWS_A_BUFFER * ROW_SIZE * 8));

let rows = takeBuffer();
let count = 0;
let lastSent_ms = 0;

const engine = new FlightEngine({
  row(signals) {
    if (count === ROWS_A_BUFFER) send();
    rows.set(signals, count * ROW_SIZE);
    count++;
  },
  began(time_s, loop_Hz) {
    count = 0;
    say({ kind: 'began', time_s, loop_Hz });
  },
  rewound(time_s, oldest_s, sticks) {
    count = 0;
    say({ kind: 'rewound', time_s, oldest_s, sticks });
  },
  stalled(away_s) {
    say({ kind: 'stalled', away_s });
  },
});

function send(): void {
  const { buffer } = rows;
  if (!(buffer instanceof ArrayBuffer)) return;
  const { speed, stopped, loaded } = engine;
  say({ kind: 'rows', buffer, count, speed, stats: engine.stats(), stopped, loaded }, [buffer]);
  rows = takeBuffer();
  count = 0;
}

const again = new MessageChannel();
again.port1.onmessage = () => beat();

function beat(): void {
  const now_ms = performance.now();
  const more = engine.advance(now_ms);
  if (now_ms - lastSent_ms >= SEND_EVERY_MS) {
    lastSent_ms = now_ms;
    send();
  }
  // A message to itself comes at once, where a timer of 0 ms is held back to 4 ms by browsers.
  if (more) again.port2.postMessage(null);
  else setTimeout(beat, 3);
}

self.onmessage = ({ data }: MessageEvent<ToWorker>) => {
  try {
    answer(data);
    engine.startClock(performance.now());
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    say({ kind: 'refused', file: error.file, problems: error.problems });
  }
};

function answer(message: ToWorker): void {
  const now_ms = performance.now();
  switch (message.kind) {
    case 'begin':
      return engine.begin(message.settings, message.start, now_ms);
    case 'settings':
      return engine.change(message.settings, now_ms);
    case 'sticks':
      return engine.setSticks(message.sticks);
    case 'speed':
      return engine.setSpeed(message.speed, now_ms);
    case 'single-tick':
      return engine.singleTick();
    case 'set-upright':
      return engine.setUpright();
    case 'drop-payload':
      return engine.dropPayload();
    case 'rewind':
      return engine.rewind(message.time_s, now_ms);
    case 'record':
      return say({ kind: 'record', ...engine.recordBlob() });
    case 'buffer':
      if (pool.length < 8) pool.push(message.buffer);
  }
}

beat();
