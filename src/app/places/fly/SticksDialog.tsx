/** Calibration walk-through of a gamepad or USB transmitter, kept per device. */
import { useEffect, useRef, useState } from 'preact/hooks';
import type { StickMode } from '../../../control/sticks.ts';
import { CalibrationWalk, settingsFor, WAYS, type DeviceSettings } from '../../input/gamepadSticks.ts';
import { useStore } from '../../store/context.ts';
import { Button } from '../../widgets/Button.tsx';
import { Dialog } from '../../widgets/Dialog.tsx';
import { NumberField } from '../../widgets/NumberField.tsx';
import { Select } from '../../widgets/Select.tsx';
import { Toggle } from '../../widgets/Toggle.tsx';
import type { FlightSession } from './session.ts';
import { flyTexts } from './texts.ts';

const words = flyTexts.sticks;
const MODES: readonly StickMode[] = [1, 2, 3, 4];

export function SticksDialog(props: { session: FlightSession; onClose: () => void }) {
  const store = useStore();
  const [walk, setWalk] = useState<CalibrationWalk | null>(null);
  const [, redraw] = useState(0);
  const latest = useRef<CalibrationWalk | null>(null);
  latest.current = walk;
  useEffect(() => {
    // While sticks are being found they must not fly the craft.
    props.session.seat.calibrating = walk !== null;
    return () => {
      props.session.seat.calibrating = false;
    };
  }, [walk, props.session]);
  useEffect(() => {
    let frame = 0;
    const beat = () => {
      const pad = props.session.seat.device();
      if (pad !== null) latest.current?.feed(pad.axes);
      redraw((n) => n + 1);
      frame = requestAnimationFrame(beat);
    };
    frame = requestAnimationFrame(beat);
    return () => cancelAnimationFrame(frame);
  }, [props.session]);

  const pad = props.session.seat.device();
  if (pad === null) {
    return (
      <Dialog title={words.title} onClose={props.onClose}>
        <p>{words.none}</p>
      </Dialog>
    );
  }
  const { settings } = settingsFor(store.settings.value.sticks[pad.id], pad.mapping === 'standard');
  const keep = (next: DeviceSettings) => store.setStickSettings(pad.id, next);
  const goOn = () => {
    walk?.next();
    if (walk?.step.kind === 'done') {
      keep(walk.step.settings);
      setWalk(null);
    }
    redraw((n) => n + 1);
  };
  return (
    <Dialog title={words.title} onClose={props.onClose}>
      <p>{words.found(pad.id)}</p>
      {walk === null ? (
        <Button primary onClick={() => setWalk(new CalibrationWalk(settings))}>
          {words.start}
        </Button>
      ) : (
        <WalkStepView walk={walk} onNext={goOn} />
      )}
      <div class="stick-bars">
        <Bars title={words.live} bars={pad.axes.slice(0, 8).map((value, i) => [String(i + 1), value])} />
        <Bars title={words.result} bars={Object.entries(props.session.seat.padDemand)} />
      </div>
      <DeviceFields settings={settings} keep={keep} />
    </Dialog>
  );
}

function WalkStepView(props: { walk: CalibrationWalk; onNext: () => void }) {
  const { step } = props.walk;
  if (step.kind === 'failed') return <p role="alert">{words.failed(step.reason)}</p>;
  if (step.kind === 'done') return <p>{words.done}</p>;
  const { low, high } = props.walk.progress();
  const waits = step.kind === 'way' && high - low === 0;
  return (
    <div class="walk">
      <p>{step.kind === 'centre' ? words.centre : words.ways[step.way]}</p>
      <Button primary onClick={props.onNext} disabled={waits}>
        {waits ? words.waiting : words.next}
      </Button>
    </div>
  );
}

/** Values from −1 to 1 as bars with their names. */
function Bars(props: { title: string; bars: readonly (readonly [string, number])[] }) {
  return (
    <section>
      <h3>{props.title}</h3>
      <ul class="axis-bars">
        {props.bars.map(([name, value]) => (
          <li key={name}>
            <span>{name}</span>
            <meter min={-1} max={1} value={value} aria-label={name} />
            <span class="axis-value">{value.toFixed(2).replace('-', '−')}</span>
          </li>
        ))}
      </ul>
    </section>
  );
}

function DeviceFields(props: { settings: DeviceSettings; keep: (settings: DeviceSettings) => void }) {
  const { settings, keep } = props;
  return (
    <div class="device-fields">
      <Select
        label={words.mode}
        value={String(settings.mode)}
        options={MODES.map((mode) => ({ value: String(mode), label: words.modes[mode] }))}
        onChange={(value) => keep({ ...settings, mode: Number(value) as StickMode })}
      />
      <NumberField
        label={words.deadband}
        value={settings.deadband}
        min={0}
        max={0.3}
        step={0.01}
        onChange={(deadband) => keep({ ...settings, deadband })}
      />
      <NumberField
        label={words.curve}
        value={settings.curve}
        min={0}
        max={1}
        step={0.05}
        onChange={(curve) => keep({ ...settings, curve })}
      />
      <NumberField
        label={words.slew}
        value={settings.slew_per_s}
        min={0}
        max={50}
        step={0.5}
        onChange={(slew_per_s) => keep({ ...settings, slew_per_s })}
      />
      {WAYS.map((way) => (
        <Toggle
          key={way}
          label={`${words.wayNames[way]} ${words.reverse}`}
          on={settings.ways[way].reverse}
          onChange={(reverse) =>
            keep({ ...settings, ways: { ...settings.ways, [way]: { ...settings.ways[way], reverse } } })
          }
        />
      ))}
      <Toggle
        label={words.stays}
        on={settings.throttleStays}
        onChange={(throttleStays) => keep({ ...settings, throttleStays })}
      />
    </div>
  );
}
