/**
 * Works offline after the first visit. A new version waits until the person takes it, and is never taken in
 * the middle of a flight: the offer stands while motors are armed, but does nothing until they are not.
 */
import { registerSW } from 'virtual:pwa-register';
import type { Store } from '../store/store.ts';

/** Starts the service worker where the browser has one. @param busy whether an update would interrupt */
export function startOffline(store: Store, busy: () => boolean): void {
  if (!('serviceWorker' in navigator)) return;
  const words = store.texts.offline;
  const update = registerSW({
    onNeedRefresh: () => offer(),
    onRegisterError: () => store.notices.tell('warning', words.failed, { topic: 'offline' }),
  });
  const offer = (): void => {
    store.notices.tell('info', words.newVersion, {
      topic: 'offline',
      action: {
        label: words.take,
        run: () => {
          if (!busy()) void update(true);
          else store.notices.tell('warning', words.afterLanding, { topic: 'offline' });
        },
      },
    });
  };
}
