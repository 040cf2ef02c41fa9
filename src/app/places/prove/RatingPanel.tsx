/** The pilot's own judgement: A and B in blind order through the same wind, rated one by one, then side by side. */
import type { ComponentType } from 'preact';
import { useEffect, useState } from 'preact/hooks';
import type { Wind } from '../../../craft/wind.ts';
import {
  blindOrder,
  RATING_QUESTIONS,
  RATING_WORDS,
  ratingsOpen,
  type GainSide,
  type RatedFlight,
} from '../../../trials/rating.ts';
import { TRIALS } from '../../../trials/registry.ts';
import { useStore } from '../../store/context.ts';
import { Button } from '../../widgets/Button.tsx';
import { NumberField } from '../../widgets/NumberField.tsx';
import { NoticeBox } from '../../widgets/Notice.tsx';
import { Select } from '../../widgets/Select.tsx';
import type { Flown } from './handFlight.ts';
import type { HandView } from './HandView.tsx';
import type { RatingSession } from './kept.ts';
import { three, useDesk } from './shared.ts';
import { proveTexts as words } from './texts.ts';

const MOST_SESSIONS = 20;
/** The ring of rows holds a minute. */
const LONGEST_S = 60;
const DESK = 'desk';
/** Winds that are there all the time; what their trials fly in. */
const WINDS = TRIALS.filter(({ name }) => name.startsWith('turbulence'));

export function RatingPanel() {
  const { kept, keep } = useDesk();
  const last = kept.sessions.at(-1);
  const open = last !== undefined && last.flights.length < last.order.length ? last : null;
  const put = (session: RatingSession, label: string): void =>
    keep(
      { sessions: [...kept.sessions.filter((one) => one !== open), session].slice(-MOST_SESSIONS) },
      label,
    );
  const finished = kept.sessions.filter((one) => one.flights.length === one.order.length);
  return (
    <section class="prove-part" aria-label={words.hand}>
      <h3>{words.hand}</h3>
      <p class="small faint">{words.handText}</p>
      {open === null ? (
        <SessionForm onBegin={(session) => put(session, words.edits2.session)} />
      ) : (
        <OneFlight
          key={open.flights.length}
          session={open}
          onRated={(flight) => put({ ...open, flights: [...open.flights, flight] }, words.edits2.rating)}
          onDrop={() => keep({ sessions: kept.sessions.filter((one) => one !== open) }, words.handDrop)}
        />
      )}
      {[...finished].reverse().map((session) => (
        <SessionTable key={session.begunAt} session={session} />
      ))}
    </section>
  );
}

function SessionForm(props: { onBegin: (session: RatingSession) => void }) {
  const store = useStore();
  const { now } = useDesk();
  const [rounds, setRounds] = useState(2);
  const [duration_s, setDuration] = useState(20);
  const [windName, setWindName] = useState(WINDS.at(-2)?.name ?? DESK);
  const { gainsB } = now;
  if (gainsB === null) return <p>{words.handNeedsB}</p>;
  const begin = (): void =>
    props.onBegin({
      begunAt: new Date().toISOString(),
      seed: now.seed,
      wind: windOf(windName, store.wind.value),
      duration_s,
      build: now.build,
      gainsA: now.gainsA,
      gainsB,
      order: blindOrder(rounds, orderSeed()),
      flights: [],
    });
  return (
    <div class="prove-hand-form">
      <NumberField
        label={words.handRounds}
        value={rounds}
        min={1}
        max={6}
        step={1}
        noSlider
        onChange={(value) => setRounds(Math.round(value))}
      />
      <NumberField
        label={words.handDuration}
        value={duration_s}
        unit="s"
        min={3}
        max={LONGEST_S}
        step={1}
        noSlider
        onChange={setDuration}
      />
      <Select
        label={words.handWind}
        value={windName}
        options={[
          ...WINDS.map(({ name, title }) => ({ value: name, label: title })),
          { value: DESK, label: words.handDeskWind },
        ]}
        onChange={setWindName}
      />
      <Button primary onClick={begin}>
        {words.handBegin}
      </Button>
    </div>
  );
}

/** Not the seed of the gusts: whoever knows that one would know the order. */
function orderSeed(): number {
  return crypto.getRandomValues(new Uint32Array(1))[0];
}

function windOf(name: string, deskWind: Wind): Wind {
  const trial = WINDS.find((one) => one.name === name);
  if (trial === undefined) return deskWind;
  return trial.wind(
    Object.fromEntries(Object.entries(trial.parameters).map(([key, { value }]) => [key, value])),
  );
}

type Phase =
  | { readonly kind: 'ready'; readonly why: string | null }
  | { readonly kind: 'flying' }
  | { readonly kind: 'rating'; readonly flown: Flown };

function OneFlight(props: {
  session: RatingSession;
  onRated: (flight: RatedFlight) => void;
  onDrop: () => void;
}) {
  const { runs } = useDesk();
  const { session } = props;
  const [phase, setPhase] = useState<Phase>({ kind: 'ready', why: null });
  const [View, setView] = useState<ComponentType<Parameters<typeof HandView>[0]> | null>(null);
  const flying = phase.kind === 'flying';
  // View and worker client come with the first flight.
  useEffect(() => void import('./HandView.tsx').then((loaded) => setView(() => loaded.HandView)), []);
  useEffect(() => {
    runs.holdWhileFlying(flying);
    return () => runs.holdWhileFlying(false);
  }, [flying]);
  const set: GainSide = session.order[session.flights.length];
  const { build, wind, seed, duration_s } = session;
  return (
    <div class="prove-one-flight">
      <div class="row">
        <strong>{words.handFlight(session.flights.length + 1, session.order.length)}</strong>
        {phase.kind === 'ready' && (
          <Button primary disabled={View === null} onClick={() => setPhase({ kind: 'flying' })}>
            {words.handFly}
          </Button>
        )}
        {phase.kind === 'rating' && (
          <Button onClick={() => setPhase({ kind: 'flying' })}>{words.handAgain}</Button>
        )}
        {!flying && (
          <Button quiet onClick={props.onDrop}>
            {words.handDrop}
          </Button>
        )}
      </div>
      {phase.kind === 'ready' && phase.why !== null && (
        <NoticeBox kind="warning">{words.handLost(phase.why)}</NoticeBox>
      )}
      {phase.kind === 'ready' && <p class="faint">{words.handTask}</p>}
      {flying && View !== null && (
        <View
          flight={{ build, gains: set === 'A' ? session.gainsA : session.gainsB, wind, seed, duration_s }}
          onOver={(flown) => setPhase({ kind: 'rating', flown })}
          onLost={(why) => setPhase({ kind: 'ready', why })}
          onStop={() => setPhase({ kind: 'ready', why: null })}
        />
      )}
      {phase.kind === 'rating' && (
        <Questions
          stopped={phase.flown.stopped}
          onRated={(rating, note) =>
            props.onRated({
              set,
              seed,
              rating,
              note,
              activity: phase.flown.activity,
              scores: phase.flown.scores,
            })
          }
        />
      )}
    </div>
  );
}

/** The three decisions one after the other, then the ratings that are left. */
function Questions(props: { stopped: string | null; onRated: (rating: number, note: string) => void }) {
  const [answers, setAnswers] = useState<readonly boolean[]>([]);
  const [note, setNote] = useState('');
  const decided = answers.includes(false) || answers.length === RATING_QUESTIONS.length;
  return (
    <div class="prove-questions">
      <p>
        {words.handOver} {props.stopped !== null && <span class="bad">{words.handLost(props.stopped)}</span>}
      </p>
      {decided ? (
        <>
          <label class="prove-rating-note">
            {words.ratingNote}
            <input
              class="text-input grow"
              maxLength={300}
              value={note}
              onChange={(event) => setNote(event.currentTarget.value)}
            />
          </label>
          <p>{words.ratingPick}</p>
          {ratingsOpen(answers).map((rating) => (
            <Button key={rating} onClick={() => props.onRated(rating, note)}>
              {`${rating}  ${RATING_WORDS[rating]}`}
            </Button>
          ))}
        </>
      ) : (
        <>
          <p>
            <strong>{RATING_QUESTIONS[answers.length].question}</strong>
          </p>
          <div class="row">
            <Button onClick={() => setAnswers([...answers, true])}>{words.yes}</Button>
            <Button onClick={() => setAnswers([...answers, false])}>{words.no}</Button>
          </div>
        </>
      )}
      {answers.length > 0 && (
        <Button quiet onClick={() => setAnswers([])}>
          {words.ratingBack}
        </Button>
      )}
      <p class="faint small">{words.scale}</p>
    </div>
  );
}

function SessionTable({ session }: { session: RatingSession }) {
  const { flights, order } = session;
  const scores = flights[0]?.scores ?? [];
  const rows: readonly { head: string; set: string; flights: readonly RatedFlight[] }[] = [
    ...flights.map((flight, i) => ({ head: String(i + 1), set: flight.set, flights: [flight] })),
    ...(['A', 'B'] as const).map((set) => ({
      head: words.handMean,
      set,
      flights: flights.filter((flight) => flight.set === set),
    })),
  ];
  const mean = (of: readonly RatedFlight[], value: (flight: RatedFlight) => number): string =>
    three(of.reduce((sum, flight) => sum + value(flight), 0) / of.length);
  return (
    <div class="table-scroll">
      <h3>
        {words.handResult}, {session.begunAt.slice(0, 16).replace('T', ' ')} UTC
      </h3>
      <p class="small">
        {words.handOrder(order.join(', '))} {session.wind.name ?? words.handDeskWind},{' '}
        {words.seed.toLowerCase()} {session.seed}. {words.scale}
      </p>
      <table class="table" aria-label={words.handResult}>
        <thead>
          <tr>
            <th>{words.flight}</th>
            <th>{words.set}</th>
            <th class="numeric">{words.rating}</th>
            <th class="numeric">{words.stickRms}</th>
            <th class="numeric">{words.stickSpeed}</th>
            <th class="numeric">{words.reversals}</th>
            {scores.map(({ name, unit }) => (
              <th key={name} class="numeric">
                {name}, <span class="unit">{unit}</span>
              </th>
            ))}
            <th>{words.note}</th>
          </tr>
        </thead>
        <tbody>
          {rows.map(({ head, set, flights: of }, i) => (
            <tr key={i} class={head === words.handMean ? 'prove-mean' : undefined}>
              <td>{head}</td>
              <td>{set}</td>
              <td class="numeric">{mean(of, (one) => one.rating)}</td>
              <td class="numeric">{mean(of, (one) => one.activity.rmsDeflection)}</td>
              <td class="numeric">{mean(of, (one) => one.activity.rmsSpeed_per_s)}</td>
              <td class="numeric">{mean(of, (one) => one.activity.reversals_per_s)}</td>
              {scores.map((_, k) => (
                <td key={k} class="numeric">
                  {mean(of, (one) => one.scores[k]?.value ?? NaN)}
                </td>
              ))}
              <td>{head === words.handMean ? '' : of[0].note}</td>
            </tr>
          ))}
        </tbody>
      </table>
    </div>
  );
}
