import { useState } from 'preact/hooks';
import { useStore } from '../store/context.ts';
import { PLACES, type PlaceName } from '../store/document.ts';
import { Button } from '../widgets/Button.tsx';
import { Dialog } from '../widgets/Dialog.tsx';
import { NoticeBox } from '../widgets/Notice.tsx';
import { guideMemory, setGuide } from './guideMemory.ts';
import './help.css';
import { helpTexts, PLACE_HELP } from './helpTexts.ts';

/** Help for the place that is open, the way to an own craft, the manual of the other places, the keys. */
export default function HelpDialog(props: { onClose: () => void }) {
  const store = useStore();
  const words = store.texts.help;
  const here = store.place.value;
  return (
    <Dialog title={words.title} wide onClose={props.onClose}>
      <p>{words.intro}</p>
      <NoticeBox kind="warning">{words.caution}</NoticeBox>
      <h3>{helpTexts.here(store.texts.places[here])}</h3>
      <PlaceText place={here} />
      <h3>{words.path}</h3>
      <ol>
        {words.steps.map((step) => (
          <li key={step}>{step}</li>
        ))}
      </ol>
      <div class="row">
        <GuideButton onClose={props.onClose} />
      </div>
      <h3>{helpTexts.manual}</h3>
      {PLACES.filter((place) => place !== here).map((place) => (
        <details key={place}>
          <summary>
            <strong>{store.texts.places[place]}</strong> <span class="faint">{store.texts.aims[place]}</span>
          </summary>
          <PlaceText place={place} />
        </details>
      ))}
      <h3>{words.keys}</h3>
      <dl class="keys">
        {words.keyTable.map(([keys, what]) => (
          <div key={keys}>
            <dt>
              <kbd>{keys}</kbd>
            </dt>
            <dd>{what}</dd>
          </div>
        ))}
      </dl>
    </Dialog>
  );
}

function GuideButton(props: { onClose: () => void }) {
  const store = useStore();
  const { step } = guideMemory(store.settings.value);
  return (
    <Button
      onClick={() => {
        setGuide(store, { hidden: false, step });
        props.onClose();
      }}
    >
      {step === 0 ? helpTexts.startGuide : helpTexts.resumeGuide}
    </Button>
  );
}

/** One place of the manual; its picture stands only where it can be had (it is not kept for offline use). */
function PlaceText(props: { place: PlaceName }) {
  const { what, steps, mind, picture } = PLACE_HELP[props.place];
  const [shown, setShown] = useState(true);
  return (
    <div class="help-place">
      {shown && (
        <img
          src={`manual/${props.place}.webp`}
          alt={picture}
          width={1200}
          height={750}
          loading="lazy"
          onError={() => setShown(false)}
        />
      )}
      <div>
        <p>{what}</p>
        <ol>
          {steps.map((step) => (
            <li key={step}>{step}</li>
          ))}
        </ol>
        <p>
          <strong>{helpTexts.mind}</strong> {mind}
        </p>
      </div>
    </div>
  );
}
