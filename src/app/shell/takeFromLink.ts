/** A link that holds a build and gains: they become a craft of its own, whatever is on the bench. */
import { newCraft } from '../store/document.ts';
import type { Store } from '../store/store.ts';
import { hashOf } from './route.ts';

/** Of every link that holds a craft. */
const PREFIX = '#/take/';

/** Takes what the address holds, if it holds a craft; junk is refused by name and nothing is changed. */
export async function takeFromLink(store: Store): Promise<void> {
  const fragment = location.hash;
  if (!fragment.startsWith(PREFIX)) return;
  // Taken once: a reload must not bring the craft again.
  history.replaceState(null, '', hashOf('measure'));
  const { takeLink } = await import('../places/carry/shareLink.ts');
  store.attempt({}, () => {
    const taken = takeLink(fragment);
    if (taken === null) return;
    store.addCrafts([newCraft(taken.build, taken.gains)], store.texts.edits.byLink);
    store.choosePlace('measure');
    store.notices.tell('info', store.texts.archive.byLink(store.build.value.name), { topic: 'link' });
  });
}
