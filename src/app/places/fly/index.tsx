/** Fly: the flight in the view, under the hand and on the tape. */
import { signal } from '@preact/signals';
import type { ComponentChildren } from 'preact';
import { useEffect, useMemo, useRef, useState } from 'preact/hooks';
import type { AxisName } from '../../../craft/gains.ts';
import { AXES } from '../../../craft/gains.ts';
import { signalIndex } from '../../../flight/signals.ts';
import { followThumb } from '../../input/touchSticks.ts';
import { Tape } from '../../plots/Tape.tsx';
import { useRunning, useStore, useTheme } from '../../store/context.ts';
import { FlightView } from '../../view3d/flightView.ts';
import { CAMERAS } from '../../view3d/cameras.ts';
import { Button } from '../../widgets/Button.tsx';
import { CornerPlan, type CornerReading } from '../../widgets/CornerPlan.tsx';
import type { Speed } from '../../worker/protocol.ts';
import { GUST_CHANNEL } from '../../worker/client.ts';
import './fly.css';
import { keyName, type FlyKey } from '../../input/keyMap.ts';
import { KeyPanel, useKeyboardLayout } from './KeyPanel.tsx';
import { flightKeys, flyOnAfterClick } from './keys.ts';
import { flightLanes } from './lanes.ts';
import { MotorSound } from './motorSound.ts';
import { buildPanel } from './panel.ts';
import { MachineReadOut, ReadOut } from './ReadOut.tsx';
import { FlightSession } from './session.ts';
import { SticksDialog } from './SticksDialog.tsx';
import { flyTexts as words } from './texts.ts';

const SPEEDS: readonly Speed[] = [1, 0.5, 0.25, 0];
const TAPE_SPAN_S = 8;
const COMMAND = signalIndex('cmd_FL_us');
const SPEED = signalIndex('speed_FL_rpm');
const SATURATED = signalIndex('saturated_FL');

export default function Fly() {
  const store = useStore();
  const running = useRunning();
  const session = useMemo(() => {
    const kept = running.get('flight');
    const one = kept instanceof FlightSession ? kept : new FlightSession(store);
    running.set('flight', one);
    // Asked for by Prove, which has something to be flown again.
    const seed = running.get('flight.seed');
    if (typeof seed === 'number') one.change({ seed });
    running.delete('flight.seed');
    return one;
  }, [store, running]);
  const [view, setView] = useState<FlightView | null>(null);
  const [axis, setAxis] = useState<AxisName>('roll');
  const [sticksOpen, setSticksOpen] = useState(false);
  const [keysOpen, setKeysOpen] = useState(false);
  const [choosing, setChoosing] = useState(false);
  const layout = useKeyboardLayout();
  const reading = useMemo(
    () => signal<CornerReading>({ command: [0, 0, 0, 0], saturated: [0, 0, 0, 0] }),
    [],
  );
  const build = store.build.value;
  const lanes = useMemo(() => {
    const full = build.battery.cells * 4.25;
    const empty = build.battery.cells * 3.1;
    return flightLanes(axis, [build.esc.min_us, build.esc.max_us], [empty, full]);
  }, [axis, build]);

  useEffect(() => {
    session.setSpeed(session.at_s.value === null ? 1 : 0);
    return () => session.leave();
  }, [session]);
  const armed = session.seat.state.value.armed;
  useEffect(() => void running.set('armed', armed), [running, armed]);
  useEffect(() => {
    const away = () => {
      if (document.hidden) session.leave();
    };
    document.addEventListener('visibilitychange', away);
    return () => document.removeEventListener('visibilitychange', away);
  }, [session]);
  useEffect(
    () =>
      flightKeys(session, {
        view: () => view,
        blocked: sticksOpen || choosing,
        onKeys: () => setKeysOpen((open) => !open),
        onTerms: () => setAxis((now) => AXES[(AXES.indexOf(now) + 1) % AXES.length]),
      }),
    [session, view, sticksOpen, choosing],
  );

  return (
    <div class="fly" onClick={flyOnAfterClick}>
      <Toolbar session={session} />
      <ViewPane
        session={session}
        onView={setView}
        reading={reading}
        layout={layout}
        onSticks={() => setSticksOpen(true)}
        onKeys={() => setKeysOpen(!keysOpen)}
        keysOpen={keysOpen}
      >
        <CornerPlan build={build} reading={reading} />
        <Cameras view={view} />
      </ViewPane>
      <Panel session={session} view={view} />
      {keysOpen && (
        <KeyPanel
          session={session}
          layout={layout}
          onChoosing={setChoosing}
          onClose={() => setKeysOpen(false)}
        />
      )}
      <div class="fly-tape">
        <Tape
          label={words.tape}
          ring={session.client.ring}
          lanes={lanes}
          span_s={TAPE_SPAN_S}
          shadeChannel={GUST_CHANNEL}
          at_s={session.at_s.value}
          onSeek={(time_s) => session.seek(time_s)}
          onResume={() => session.resume()}
        />
        <span class="fly-terms" role="group" aria-label={words.termsAxis}>
          <span class="fly-label">{words.termsAxis}</span>
          {AXES.map((one) => (
            <Button key={one} quiet pressed={axis === one} onClick={() => setAxis(one)}>
              {one}
            </Button>
          ))}
        </span>
      </div>
      {sticksOpen && <SticksDialog session={session} onClose={() => setSticksOpen(false)} />}
    </div>
  );
}

/** Which camera; over the view's far corner. */
function Cameras(props: { view: FlightView | null }) {
  const { view } = props;
  const [shown, setShown] = useState(view?.camera ?? null);
  // Keys change it as well.
  useEffect(() => {
    setShown(view?.camera ?? null);
    const timer = setInterval(() => setShown(view?.camera ?? null), 200);
    return () => clearInterval(timer);
  }, [view]);
  return (
    <span class="fly-cameras" role="group" aria-label={words.camera}>
      {CAMERAS.map((one) => (
        <Button
          key={one}
          quiet
          pressed={shown === one}
          onClick={() => {
            view?.setCamera(one);
            setShown(one);
          }}
        >
          {words.cameras[one]}
        </Button>
      ))}
    </span>
  );
}

function Toolbar(props: { session: FlightSession }) {
  const { session } = props;
  const { speed } = session.state.value;
  const seat = session.seat.state.value;
  const build = useStore().build.value;
  return (
    <div class="fly-bar" role="toolbar" aria-label={words.view}>
      <Button
        primary={!seat.armed}
        pressed={seat.armed}
        title={words.armHint}
        onClick={() => session.toggleArmed(performance.now())}
      >
        {seat.armed ? words.disarm : words.arm}
      </Button>
      <Button title={words.restartHint} onClick={() => session.restart()}>
        {words.restart}
      </Button>
      <Button title={words.uprightHint} onClick={() => session.client.setUpright()}>
        {words.upright}
      </Button>
      {build.payload !== undefined && (
        <Button title={words.dropHint} onClick={() => session.client.dropPayload()}>
          {words.drop}
        </Button>
      )}
      <span class="fly-group" role="group" aria-label={words.speed}>
        {SPEEDS.map((one) => (
          <Button key={one} quiet pressed={speed === one} onClick={() => session.setSpeed(one)}>
            {words.speeds[one]}
          </Button>
        ))}
        <Button
          quiet
          title={words.tickHint}
          disabled={speed !== 0}
          onClick={() => session.client.singleTick()}
        >
          {words.tick}
        </Button>
      </span>
      <span class="fly-end">
        <SoundButton session={session} />
        <Button title={words.saveHint} onClick={() => void session.saveRecord()}>
          {words.save}
        </Button>
      </span>
    </div>
  );
}

/** Motor sound, off by default. */
function SoundButton(props: { session: FlightSession }) {
  const { session } = props;
  const store = useStore();
  const [on, setOn] = useState(false);
  const { propeller } = store.build.value;
  useEffect(() => {
    if (!on) return;
    const sound = new MotorSound(propeller.blades ?? 2);
    const speeds = new Float64Array(4);
    const timer = setInterval(() => {
      const quiet = session.state.value.speed === 0;
      let top = 1;
      for (let i = 0; i < 4; i++) {
        speeds[i] = quiet ? 0 : (session.client.newest[SPEED + i] * Math.PI) / 30;
        top = Math.max(top, speeds[i]);
      }
      sound.update(
        speeds,
        Math.max(top, 1.6 * (speeds.reduce((sum, one) => sum + one, 0) / 4)),
        session.state.value.stats.motorActivity_us,
      );
    }, 40);
    return () => {
      clearInterval(timer);
      sound.end();
    };
  }, [on, session, propeller]);
  return (
    <Button quiet pressed={on} onClick={() => setOn(!on)}>
      {words.sound}
    </Button>
  );
}

function ViewPane(props: {
  session: FlightSession;
  onView: (view: FlightView | null) => void;
  reading: { value: CornerReading };
  layout: ReadonlyMap<string, string> | null;
  onSticks: () => void;
  onKeys: () => void;
  keysOpen: boolean;
  children: ComponentChildren;
}) {
  const { session, reading } = props;
  const touch = useTouch();
  const store = useStore();
  const theme = useTheme();
  const host = useRef<HTMLDivElement>(null);
  const left = useRef<HTMLDivElement>(null);
  const right = useRef<HTMLDivElement>(null);
  const made = useRef<FlightView | null>(null);
  const build = store.build.value;
  const scene = store.scene.value;
  const shade = theme.shown.value === 'dark' ? 'dark' : 'light';

  useEffect(() => {
    if (host.current === null) return;
    const view = new FlightView(host.current);
    made.current = view;
    props.onView(view);
    return () => {
      made.current = null;
      props.onView(null);
      view.dispose();
    };
  }, []);
  useEffect(() => made.current?.setContent(build, scene, shade), [build, scene, shade]);
  useEffect(() => {
    let frame = 0;
    let last_ms = performance.now();
    const command = new Float64Array(4);
    const saturated = new Float64Array(4);
    const beat = (now_ms: number) => {
      frame = requestAnimationFrame(beat);
      const dt_s = Math.min(0.1, Math.max(0, (now_ms - last_ms) / 1000));
      last_ms = now_ms;
      session.beat(dt_s);
      const { client } = session;
      const drawn = client.frame(now_ms, session.at_s.value);
      if (drawn !== null) made.current?.render(drawn, now_ms);
      const { esc } = store.build.value;
      for (let i = 0; i < 4; i++) {
        command[i] = (client.value(COMMAND + i, session.at_s.value) - esc.min_us) / (esc.max_us - esc.min_us);
        saturated[i] = Math.abs(client.value(SATURATED + i, session.at_s.value));
      }
      reading.value = { command, saturated };
    };
    frame = requestAnimationFrame(beat);
    return () => cancelAnimationFrame(frame);
  }, [session]);
  useEffect(() => {
    if (left.current === null || right.current === null) return;
    const ends = [
      followThumb(left.current, session.seat.left),
      followThumb(right.current, session.seat.right),
    ];
    return () => ends.forEach((end) => end());
  }, [session, touch]);

  return (
    <div class="fly-view">
      <div class="fly-canvas" ref={host} role="img" aria-label={words.view} />
      {touch && (
        <>
          <div class="thumb left" ref={left} aria-hidden="true" data-label={words.touchHints.left} />
          <div class="thumb right" ref={right} aria-hidden="true" data-label={words.touchHints.right} />
        </>
      )}
      <div class="fly-over">{props.children}</div>
      <MachineReadOut session={session} view={() => made.current} />
      <ReadOut session={session} />
      <Hint {...props} canvas={made.current?.renderer === 'canvas'} />
    </div>
  );
}

/** Whether thumbs are there: a touch screen as the main pointer, or the first touch on another one. */
function useTouch(): boolean {
  const [touch, setTouch] = useState(() => matchMedia('(pointer: coarse)').matches);
  useEffect(() => {
    if (touch) return;
    const first = (event: PointerEvent) => {
      if (event.pointerType === 'touch') setTouch(true);
    };
    window.addEventListener('pointerdown', first);
    return () => window.removeEventListener('pointerdown', first);
  }, [touch]);
  return touch;
}

/** One line under the view: what to press now, or what went wrong. */
function Hint(props: {
  session: FlightSession;
  canvas: boolean;
  layout: ReadonlyMap<string, string> | null;
  onSticks: () => void;
  onKeys: () => void;
  keysOpen: boolean;
}) {
  const { session } = props;
  const seat = session.seat.state.value;
  const key = (action: FlyKey) => keyName(session.keys.value[action], props.layout);
  const at = session.at_s.value;
  const { text, loud } = hintOf(session, key);
  return (
    <div class={loud ? 'fly-hint loud' : 'fly-hint'} role="status">
      {at !== null ? (
        <>
          <Button primary onClick={() => session.resume()}>
            {words.refly}
          </Button>
          <span class="faint">{words.reflyKey(key('flyOn'))}</span>
          <Button onClick={() => session.seek(null)}>{words.live}</Button>
        </>
      ) : (
        <span>{text}</span>
      )}
      {props.canvas && <span class="faint">{words.noWebgl}</span>}
      {at === null && (
        <span class="fly-end">
          <Button
            quiet
            pressed={seat.levelling}
            title={key('levelling')}
            onClick={() => session.setAssist('levelling')}
          >
            {words.levelling}
          </Button>
          <Button
            quiet
            pressed={seat.heightHold}
            title={key('heightHold')}
            onClick={() => session.setAssist('heightHold')}
          >
            {words.heightHold}
          </Button>
          <Button quiet onClick={props.onSticks}>
            {words.sticksButton}
          </Button>
          <Button quiet pressed={props.keysOpen} title={key('keys')} onClick={props.onKeys}>
            {words.keysButton}
          </Button>
        </span>
      )}
    </div>
  );
}

/** The line itself; loud when something is wrong. */
function hintOf(session: FlightSession, key: (action: FlyKey) => string): { text: string; loud: boolean } {
  const { stopped } = session.state.value;
  const seat = session.seat.state.value;
  const concern = session.watch.concern.value;
  if (stopped !== null) return { text: words.stopped(stopped.tick, stopped.what), loud: true };
  switch (concern?.kind) {
    case 'struck':
      return { text: words.struck(concern.corners.join(', '), key('upright'), key('restart')), loud: true };
    case 'tipped':
      return { text: words.tipped(key('upright')), loud: true };
    case 'saturated':
      return { text: words.saturated(concern.corners.join(', ')), loud: true };
    case 'screaming':
      return { text: words.screaming, loud: true };
  }
  if (seat.uncalibrated && seat.device !== null) {
    return { text: words.uncalibrated(seat.device), loud: true };
  }
  return { text: seat.armed ? words.flying(key) : words.armFirst(key('arm'), key('up')), loud: false };
}

function Panel(props: { session: FlightSession; view: FlightView | null }) {
  const store = useStore();
  const host = useRef<HTMLDivElement>(null);
  useEffect(() => {
    if (host.current === null || props.view === null) return;
    return buildPanel(host.current, store, props.session, props.view.shows);
  }, [props.view, props.session, store.craft.value.id]);
  return <div class="fly-panel" ref={host} />;
}
