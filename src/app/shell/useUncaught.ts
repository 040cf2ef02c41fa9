import { useEffect } from 'preact/hooks';
import { useStore } from '../store/context.ts';

/** Errors that no place caught become a message with their text to copy; the page goes on. */
export function useUncaught(): void {
  const store = useStore();
  useEffect(() => {
    const words = store.texts.states;
    const tell = (error: unknown): void => {
      const text = error instanceof Error ? (error.stack ?? error.message) : String(error);
      store.notices.tell('error', words.uncaught, {
        details: [text.split('\n')[0]],
        topic: `uncaught:${text}`,
        action: { label: words.copyError, run: () => void navigator.clipboard.writeText(text) },
      });
    };
    const failed = (event: ErrorEvent): void => {
      // The browser's word for "sizes settled a frame later": nothing failed.
      if (!event.message.startsWith('ResizeObserver')) tell(event.error ?? event.message);
    };
    const rejected = (event: PromiseRejectionEvent): void => tell(event.reason);
    window.addEventListener('error', failed);
    window.addEventListener('unhandledrejection', rejected);
    return () => {
      window.removeEventListener('error', failed);
      window.removeEventListener('unhandledrejection', rejected);
    };
  }, [store]);
}
