/** Numbers of the instant, written ten times a second without rendering anew. */
import { useEffect, useRef } from 'preact/hooks';
import { signalIndex } from '../../../flight/signals.ts';
import { useStore } from '../../store/context.ts';
import { shownUnit } from '../../store/units.ts';
import type { FlightView } from '../../view3d/flightView.ts';
import type { FlightSession } from './session.ts';
import { flyTexts } from './texts.ts';

const DOWN = signalIndex('down_m');
const VELOCITY = signalIndex('vn_mps');
const ATTITUDE = signalIndex('qw');
const BATTERY = signalIndex('battery_V');
const CURRENT = signalIndex('current_A');
const CHARGE = signalIndex('charge');
const EVERY_MS = 100;
/** Below this current the motors are off and a time left means nothing, A. */
const LEAST_CURRENT_A = 1;
/** The current is smoothed over about this time for the time left, s. */
const CURRENT_MEMORY_S = 3;

type Name = Exclude<keyof typeof flyTexts.readout, 'ticks' | 'frames'>;

/** Of the flight, in the order they are read: name, unit and the widest number’s characters. */
const CELLS: readonly (readonly [Name, string, number])[] = [
  ['height', 'm', 4],
  ['speed', 'm/s', 4],
  ['climb', 'm/s', 4],
  ['tilt', 'deg', 3],
  ['battery', 'V', 5],
  ['current', 'A', 4],
  ['left', 'min', 3],
  ['activity', 'µs rms', 5],
  ['heat', 'W', 4],
];
const HINTS: Partial<Record<Name, string>> = {
  activity: flyTexts.activityHint,
  heat: flyTexts.heatHint,
  left: flyTexts.leftHint,
};

/** Calls `write` now and then while mounted. */
function useRepeatedly(write: () => void, deps: readonly unknown[]): void {
  useEffect(() => {
    const timer = setInterval(write, EVERY_MS);
    return () => clearInterval(timer);
  }, deps);
}

export function ReadOut(props: { session: FlightSession }) {
  const { session } = props;
  const host = useRef<HTMLDListElement>(null);
  const store = useStore();
  const { units } = store.settings.value;
  const build = store.build.value;
  const slowCurrent_A = useRef(0);
  useRepeatedly(() => {
    const cells = host.current?.querySelectorAll('dd b');
    if (cells === undefined) return;
    const { client, at_s } = session;
    const get = (index: number) => client.value(index, at_s.value);
    const { stats } = client.state.value;
    const shown = (value: number, unit: string) => fixed(value * shownUnit(unit, units).factor, 1);
    const current = get(CURRENT);
    // From a standstill at once, then smoothed.
    if (slowCurrent_A.current < LEAST_CURRENT_A) slowCurrent_A.current = current;
    slowCurrent_A.current += (EVERY_MS / 1000 / CURRENT_MEMORY_S) * (current - slowCurrent_A.current);
    const left_min = (60 * get(CHARGE) * build.battery.capacity_Ah) / slowCurrent_A.current;
    const [x, y] = [get(ATTITUDE + 1), get(ATTITUDE + 2)];
    const tilt_rad = Math.acos(Math.max(-1, Math.min(1, 1 - 2 * (x * x + y * y))));
    const values: Record<Name, string> = {
      height: shown(-get(DOWN), 'm'),
      speed: shown(Math.hypot(get(VELOCITY), get(VELOCITY + 1)), 'm/s'),
      climb: shown(-get(VELOCITY + 2), 'm/s'),
      tilt: fixed((tilt_rad * 180) / Math.PI, 0),
      battery: fixed(get(BATTERY), 2),
      current: fixed(current, 1),
      left: slowCurrent_A.current > LEAST_CURRENT_A ? fixed(left_min, 0) : '–',
      activity: fixed(stats.motorActivity_us, 1),
      heat: fixed(stats.windingHeat_W, 1),
    };
    CELLS.forEach(([name], i) => write(cells[i], values[name]));
    const charge = host.current?.querySelector('.fly-charge');
    if (charge instanceof Element) write(charge, fixed(100 * get(CHARGE), 0));
    const rough = session.watch.roughness.value;
    const word = host.current?.querySelector('.fly-rough');
    if (word instanceof Element) write(word, flyTexts.roughness[rough]);
    host.current?.classList.toggle('rough', rough !== 'quiet');
  }, [session, units, build]);
  return (
    <dl class="fly-read" ref={host}>
      {CELLS.map(([name, unit, width]) => (
        <div key={name} title={HINTS[name]}>
          <dt>{flyTexts.readout[name]}</dt>
          <dd style={{ minWidth: `${width + 1 + unit.length}ch` }}>
            <b>–</b> <span class="unit">{shownUnit(unit, units).unit}</span>
            {name === 'battery' && (
              <>
                {' '}
                <span class="fly-charge">–</span> <span class="unit">%</span>
              </>
            )}
            {name === 'activity' && <strong class="fly-rough" />}
          </dd>
        </div>
      ))}
    </dl>
  );
}

/** How the program itself keeps up, small in the view's corner. */
export function MachineReadOut(props: { session: FlightSession; view: () => FlightView | null }) {
  const host = useRef<HTMLDListElement>(null);
  useRepeatedly(() => {
    const cells = host.current?.querySelectorAll('dd b');
    if (cells === undefined) return;
    const { stats } = props.session.client.state.value;
    write(cells[0], stats.ticks === 0 ? '–' : percent(stats.onTime));
    write(cells[1], fixed(props.view()?.stats().fps ?? 0, 0));
  }, [props.session]);
  return (
    <dl class="fly-read machine" ref={host}>
      <div title={flyTexts.ticksHint}>
        <dt>{flyTexts.readout.ticks}</dt>
        <dd>
          <b>–</b> <span class="unit">%</span>
        </dd>
      </div>
      <div>
        <dt>{flyTexts.readout.frames}</dt>
        <dd>
          <b>–</b>
        </dd>
      </div>
    </dl>
  );
}

/** Never "100" for less than all. */
function percent(share: number): string {
  return share === 1 ? '100' : Math.min(99.99, 100 * share).toFixed(2);
}

/** Fixed decimals with a true minus sign, and never a negative nought. */
function fixed(value: number, decimals: number): string {
  const text = value.toFixed(decimals);
  return Number(text) === 0 ? text.replace('-', '') : text.replace('-', '−');
}

function write(cell: Element | undefined, text: string): void {
  if (cell !== undefined && cell.textContent !== text) cell.textContent = text;
}
