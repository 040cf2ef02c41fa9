/** The view of a flight that is rated: craft, time left, nothing that says which set flies. */
import { useEffect, useRef, useState } from 'preact/hooks';
import { OPEN_FIELD } from '../../../craft/scene.ts';
import { keyMapFrom } from '../../input/keyMap.ts';
import { followThumb } from '../../input/touchSticks.ts';
import { useStore, useTheme } from '../../store/context.ts';
import { FlightView } from '../../view3d/flightView.ts';
import { Button } from '../../widgets/Button.tsx';
import { HandPilot, type Flown, type HandFlight } from './handFlight.ts';
import { proveTexts as words } from './texts.ts';

export function HandView(props: {
  flight: HandFlight;
  onOver: (flown: Flown) => void;
  onLost: (why: string) => void;
  onStop: () => void;
}) {
  const store = useStore();
  const theme = useTheme();
  const host = useRef<HTMLDivElement>(null);
  const thumbs = [useRef<HTMLDivElement>(null), useRef<HTMLDivElement>(null)];
  const [pilot, setPilot] = useState<HandPilot | null>(null);
  const touch = matchMedia('(pointer: coarse)').matches;
  useEffect(() => {
    if (host.current === null) return;
    const settings = store.settings.peek();
    // The view first: it may take a moment, and the flight's clock runs from its beginning.
    const view = new FlightView(host.current);
    view.setContent(props.flight.build, OPEN_FIELD, theme.shown.peek() === 'dark' ? 'dark' : 'light');
    const one = new HandPilot(
      props.flight,
      (id) => settings.sticks[id],
      keyMapFrom(settings.places['fly.keys']),
      props.onOver,
      props.onLost,
    );
    setPilot(one);
    const ends = [
      flown(one, (now_ms) => {
        const frame = one.client.frame(now_ms, null);
        if (frame !== null) view.render(frame, now_ms);
      }),
      keysTo(one),
      ...thumbs.map(({ current }, i) =>
        current === null ? () => undefined : followThumb(current, i === 0 ? one.seat.left : one.seat.right),
      ),
    ];
    return () => {
      ends.forEach((end) => end());
      view.dispose();
      one.end();
    };
  }, []);
  return (
    <div class="prove-flight">
      <div class="prove-flight-view" ref={host} role="img" aria-label={words.handTask} />
      {touch &&
        thumbs.map((thumb, i) => (
          <div key={i} class={`prove-thumb side-${i}`} ref={thumb} aria-hidden="true" />
        ))}
      <div class="prove-flight-line">
        <strong role="timer">{words.handLeft(String(pilot?.left_s.value ?? props.flight.duration_s))}</strong>
        <span class="faint">{words.handTask}</span>
        <Button onClick={props.onStop}>{words.stop}</Button>
      </div>
    </div>
  );
}

/** Beats with the screen; returns the end of it. */
function flown(pilot: HandPilot, draw: (now_ms: number) => void): () => void {
  let frame = 0;
  let last_ms = performance.now();
  const beat = (now_ms: number): void => {
    frame = requestAnimationFrame(beat);
    pilot.beat(Math.min(0.1, Math.max(0, (now_ms - last_ms) / 1000)));
    last_ms = now_ms;
    draw(now_ms);
  };
  frame = requestAnimationFrame(beat);
  return () => cancelAnimationFrame(frame);
}

/** Stick keys go to the pilot while the flight lasts, whatever has the focus; returns the end of it. */
function keysTo({ seat }: HandPilot): () => void {
  const down = (event: KeyboardEvent): void => {
    if (event.altKey || event.ctrlKey || event.metaKey) return;
    if (seat.keys.press(event.code, event.shiftKey)) event.preventDefault();
  };
  const up = (event: KeyboardEvent): void => seat.keys.release(event.code, event.shiftKey);
  const blur = (): void => seat.keys.releaseAll();
  window.addEventListener('keydown', down);
  window.addEventListener('keyup', up);
  window.addEventListener('blur', blur);
  return () => {
    window.removeEventListener('keydown', down);
    window.removeEventListener('keyup', up);
    window.removeEventListener('blur', blur);
  };
}
