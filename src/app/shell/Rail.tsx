import { PLACE_LIST } from '../places/registry.ts';
import { useStore } from '../store/context.ts';
import { hashOf } from './route.ts';

/** The six words; a dot where something waits. */
export function Rail() {
  const store = useStore();
  const { texts } = store;
  const here = store.place.value;
  const waiting = store.waiting.value;
  return (
    <nav class="rail" aria-label={texts.rail}>
      <div class="rail-mark">
        <svg width="22" height="22" viewBox="0 0 22 22" role="img" aria-label={texts.title} fill="none">
          <path d="M5 5 17 17M17 5 5 17" stroke-width="1.5" />
          <circle cx="4.5" cy="4.5" r="3" stroke-width="1.2" />
          <circle cx="17.5" cy="4.5" r="3" stroke-width="1.2" />
          <circle cx="4.5" cy="17.5" r="3" stroke-width="1.2" />
          <circle cx="17.5" cy="17.5" r="3" stroke-width="1.2" />
        </svg>
      </div>
      <ol>
        {PLACE_LIST.map(({ name, key }) => {
          const what = waiting[name];
          return (
            <li key={name}>
              <a
                href={hashOf(name)}
                aria-current={name === here ? 'page' : undefined}
                aria-keyshortcuts={`Alt+${key}`}
                title={`${texts.aims[name]} (Alt+${key})${what === undefined ? '' : `\n${texts.waits(what)}`}`}
              >
                {texts.places[name]}
                {what === undefined ? null : <span class="dot" role="img" aria-label={texts.waits(what)} />}
              </a>
            </li>
          );
        })}
      </ol>
    </nav>
  );
}
