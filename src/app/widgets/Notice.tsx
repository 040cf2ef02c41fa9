import type { ComponentChildren } from 'preact';
import type { NoticeAction, NoticeKind } from '../store/notices.ts';
import { en } from '../texts/en.ts';
import { Button } from './Button.tsx';

/** A message with a border; its kind is a word in the text or in the border's weight, never colour alone. */
export function NoticeBox(props: {
  kind: NoticeKind;
  children: ComponentChildren;
  details?: readonly string[];
  action?: NoticeAction | null;
  onDismiss?: () => void;
}) {
  const { action, onDismiss } = props;
  return (
    <div class={`notice ${props.kind}`}>
      <div>
        <p>{props.children}</p>
        {props.details !== undefined && props.details.length > 0 ? (
          <ul class="small">
            {props.details.map((line) => (
              <li key={line}>{line}</li>
            ))}
          </ul>
        ) : null}
      </div>
      {action || onDismiss ? (
        <div class="notice-actions">
          {action ? <Button onClick={action.run}>{action.label}</Button> : null}
          {onDismiss ? (
            <Button quiet onClick={onDismiss}>
              {en.notices.dismiss}
            </Button>
          ) : null}
        </div>
      ) : null}
    </div>
  );
}
