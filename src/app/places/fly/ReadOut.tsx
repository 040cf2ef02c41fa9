/** Numbers of the instant, written ten times a second without rendering anew. */
import { useEffect, useRef } from 'preact/hooks';
import { signalIndex } from '../../../flight/signals.ts';
import { useStore } from '../../store/context.ts';
import type { FlightView } from '../../view3d/flightView.ts';
import type { FlightSession } from './session.ts';
import { flyTexts } from './texts.ts';

const words = flyTexts.readout;
const at = (name: string) => signalIndex(name);
const DOWN = at('down_m');
const V = at('vn_mps');
const Q = at('qw');
const BATTERY = at('battery_V');
const CURRENT = at('current_A');
const EVERY_MS = 100;

const CELLS = [
  ['height', 'm'],
  ['speed', 'm/s'],
  ['climb', 'm/s'],
  ['tilt', 'deg'],
  ['battery', 'V'],
  ['current', 'A'],
  ['activity', 'µs rms'],
  ['heat', 'W'],
  ['ticks', '%'],
  ['frames', ''],
] as const;

export function ReadOut(props: { session: FlightSession; view: () => FlightView | null }) {
  const host = useRef<HTMLDListElement>(null);
  const store = useStore();
  const imperial = store.settings.value.units === 'imperial';
  useEffect(() => {
    const list = host.current;
    if (list === null) return;
    const cells = [...list.querySelectorAll('dd b')];
    const timer = setInterval(() => {
      const { client, at_s } = props.session;
      const get = (index: number) => client.value(index, at_s.value);
      const vn = get(V);
      const ve = get(V + 1);
      const [x, y] = [get(Q + 1), get(Q + 2)];
      const { stats } = client.state.value;
      const length = imperial ? 3.28084 : 1;
      const values = [
        (-get(DOWN) * length).toFixed(1),
        (Math.hypot(vn, ve) * length).toFixed(1),
        (-get(V + 2) * length).toFixed(1),
        ((Math.acos(Math.max(-1, Math.min(1, 1 - 2 * (x * x + y * y)))) * 180) / Math.PI).toFixed(0),
        get(BATTERY).toFixed(2),
        get(CURRENT).toFixed(1),
        stats.motorActivity_us.toFixed(1),
        stats.windingHeat_W.toFixed(1),
        stats.ticks === 0 ? '—' : (100 * (1 - stats.late / stats.ticks)).toFixed(2),
        (props.view()?.stats().fps ?? 0).toFixed(0),
      ];
      values.forEach((value, i) => {
        if (cells[i].textContent !== value) cells[i].textContent = value;
      });
    }, EVERY_MS);
    return () => clearInterval(timer);
  }, [props.session, imperial]);
  return (
    <dl class="fly-read" ref={host}>
      {CELLS.map(([name, unit]) => (
        <div
          key={name}
          title={
            name === 'activity' ? flyTexts.activityHint : name === 'heat' ? flyTexts.heatHint : undefined
          }
        >
          <dt>{words[name]}</dt>
          <dd>
            <b>—</b> <span class="unit">{imperial ? unit.replace(/^m/, 'ft') : unit}</span>
          </dd>
        </div>
      ))}
    </dl>
  );
}
