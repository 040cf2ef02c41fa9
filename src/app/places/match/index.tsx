/** Match: a log of the real craft over the model; identified numbers with their intervals; a corrected build. */
import { useEffect } from 'preact/hooks';
import { useRunning, useStore } from '../../store/context.ts';
import type { Store } from '../../store/store.ts';
import { Button } from '../../widgets/Button.tsx';
import { FileDrop } from '../../widgets/FileDrop.tsx';
import { NoticeBox } from '../../widgets/Notice.tsx';
import { ProgressLine } from '../../widgets/ProgressLine.tsx';
import { Excitations } from './Excitations.tsx';
import { Guide } from './Guide.tsx';
import './match.css';
import { Mapping } from './Mapping.tsx';
import { Results } from './Results.tsx';
import { MatchSession } from './session.ts';
import { matchTexts as words } from './texts.ts';

/** The log on the bench stays there while another place is open. */
function sessionOf(running: Map<string, unknown>, store: Store): MatchSession {
  const kept = running.get('match');
  if (kept instanceof MatchSession) return kept;
  const made = new MatchSession(store);
  running.set('match', made);
  return made;
}

export default function Match() {
  const store = useStore();
  const session = sessionOf(useRunning(), store);
  const offered = store.offered.value;
  useEffect(() => {
    store.setWaiting('match', null);
    const file = store.takeOffered('match');
    if (file !== null) session.open(file);
  }, [offered]);
  const state = session.state.value;
  return (
    <div class="match">
      <Progress session={session} />
      {session.refused.value.length > 0 && (
        <div role="alert">
          <NoticeBox
            kind="error"
            details={session.refused.value}
            onDismiss={() => {
              session.refused.value = [];
            }}
          >
            {words.refused}
          </NoticeBox>
        </div>
      )}
      {state.kind === 'empty' && <Front session={session} />}
      {state.kind === 'confirm' && (
        <Mapping
          state={state}
          onChange={(choice) => session.choose(choice)}
          onGo={() => session.match(state.file, state.proposal, state.choice)}
          onAgain={() => session.clear()}
        />
      )}
      {state.kind === 'matched' && <Results session={session} matched={state} />}
    </div>
  );
}

function Progress(props: { session: MatchSession }) {
  const busy = props.session.busy.value;
  if (busy === null) return null;
  return (
    <div class="match-busy">
      <p role="status">
        <strong>{busy.fileName}</strong> {words.doing[busy.doing]}
      </p>
      <ProgressLine share={busy.share} label={words.doing[busy.doing]} />
      <Button onClick={() => props.session.stop()}>{words.stop}</Button>
    </div>
  );
}

function Front(props: { session: MatchSession }) {
  return (
    <>
      <div class="match-drop">
        <FileDrop
          label={words.drop}
          accept={words.accept}
          onFiles={(files) => props.session.open(files[0])}
        />
        <p class="faint">{words.intro}</p>
      </div>
      <div class="match-front">
        <Guide />
        <Excitations />
      </div>
    </>
  );
}
