/** The guide: one line under the top line, from the demo to an own craft; where it stands is kept. */
import { useStore } from '../store/context.ts';
import { newCraft } from '../store/document.ts';
import type { Store } from '../store/store.ts';
import { Button } from '../widgets/Button.tsx';
import './guide.css';
import { guideMemory, setGuide } from './guideMemory.ts';
import { GUIDE_STEPS, guideTexts as words } from './guideTexts.ts';
import { hashOf } from './route.ts';

export default function GuideLine() {
  const store = useStore();
  const { step } = guideMemory(store.settings.value);
  const at = Math.min(step, GUIDE_STEPS.length - 1);
  const { place, text, own } = GUIDE_STEPS[at];
  const { texts } = store;
  const last = at === GUIDE_STEPS.length - 1;
  return (
    <aside class="guide" aria-label={words.label}>
      <span class="guide-count">{words.count(at + 1, GUIDE_STEPS.length)}</span>
      <p>
        <strong>{texts.places[place]}:</strong> {text}
      </p>
      <div class="row">
        <Button quiet disabled={at === 0} onClick={() => goTo(store, at - 1)}>
          {words.back}
        </Button>
        {store.place.value === place ? (
          <>
            {own === true && (
              <Button primary onClick={() => startOwn(store, at)}>
                {words.own}
              </Button>
            )}
            <Button onClick={() => (last ? setGuide(store, { hidden: true, step: 0 }) : goTo(store, at + 1))}>
              {last ? words.done : words.next}
            </Button>
          </>
        ) : (
          <Button onClick={() => goTo(store, at)}>{words.goTo(texts.places[place])}</Button>
        )}
        <Button quiet title={words.hideHint} onClick={() => setGuide(store, { hidden: true, step: at })}>
          {words.hide}
        </Button>
      </div>
    </aside>
  );
}

function goTo(store: Store, step: number): void {
  setGuide(store, { hidden: false, step });
  location.hash = hashOf(GUIDE_STEPS[step].place);
}

/** A copy of the craft on the bench under a name of its own; nothing of the demo changes. */
function startOwn(store: Store, step: number): void {
  const own = newCraft({ ...store.build.value, name: words.ownName }, store.gains.value);
  store.addCrafts([own], words.ownEdit);
  goTo(store, step + 1);
}
