import { useStore } from '../store/context.ts';
import { Dialog } from '../widgets/Dialog.tsx';
import { NoticeBox } from '../widgets/Notice.tsx';

export function HelpDialog(props: { onClose: () => void }) {
  const words = useStore().texts.help;
  return (
    <Dialog title={words.title} onClose={props.onClose}>
      <p>{words.intro}</p>
      <NoticeBox kind="warning">{words.caution}</NoticeBox>
      <h3>{words.path}</h3>
      <ol>
        {words.steps.map((step) => (
          <li key={step}>{step}</li>
        ))}
      </ol>
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
