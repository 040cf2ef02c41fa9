import { useStore } from '../store/context.ts';
import { NoticeBox } from '../widgets/Notice.tsx';

/** The stack of messages in the corner; read aloud as they come. */
export function Notices() {
  const store = useStore();
  return (
    <div class="notices" role="log" aria-live="polite" aria-label={store.texts.notices.label}>
      {store.notices.current.value.map((notice) => (
        <NoticeBox
          key={notice.id}
          kind={notice.kind}
          details={notice.details}
          action={notice.action}
          onDismiss={() => store.notices.dismiss(notice.id)}
        >
          {notice.text}
        </NoticeBox>
      ))}
    </div>
  );
}
