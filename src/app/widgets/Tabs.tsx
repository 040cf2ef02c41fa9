import type { ComponentChildren } from 'preact';
import { useId, useRef } from 'preact/hooks';

/** One of several sheets at a time; arrow keys go from tab to tab. */
export function Tabs<T extends string>(props: {
  label: string;
  value: T;
  tabs: readonly { readonly value: T; readonly label: string }[];
  onChange: (value: T) => void;
  children: ComponentChildren;
}) {
  const id = useId();
  const list = useRef<HTMLDivElement>(null);
  const press = (event: KeyboardEvent): void => {
    const by = event.key === 'ArrowRight' ? 1 : event.key === 'ArrowLeft' ? -1 : 0;
    if (by === 0) return;
    event.preventDefault();
    const now = props.tabs.findIndex(({ value }) => value === props.value);
    const next = (now + by + props.tabs.length) % props.tabs.length;
    props.onChange(props.tabs[next].value);
    const tab = list.current?.children[next];
    if (tab instanceof HTMLElement) tab.focus();
  };
  return (
    <div class="tabs">
      <div class="tab-list" role="tablist" aria-label={props.label} ref={list} onKeyDown={press}>
        {props.tabs.map(({ value, label }) => (
          <button
            key={value}
            type="button"
            role="tab"
            id={`${id}-${value}`}
            aria-selected={value === props.value}
            aria-controls={`${id}-sheet`}
            tabIndex={value === props.value ? 0 : -1}
            onClick={() => props.onChange(value)}
          >
            {label}
          </button>
        ))}
      </div>
      <div role="tabpanel" id={`${id}-sheet`} aria-labelledby={`${id}-${props.value}`}>
        {props.children}
      </div>
    </div>
  );
}
