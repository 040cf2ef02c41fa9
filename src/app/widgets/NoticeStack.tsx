import { useStore } from '../store/context.ts';
import { NoticeBox } from './Notice.tsx';

/** The messages of the moment; read aloud as they come. In the page's corner, or inside the open dialog. */
export function NoticeStack() {
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
