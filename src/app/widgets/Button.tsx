import type { ComponentChildren } from 'preact';

export interface ButtonProps {
  readonly onClick: () => void;
  readonly children: ComponentChildren;
  /** The one thing this part of the page is for. */
  readonly primary?: boolean;
  /** No border: for rows of small tools. */
  readonly quiet?: boolean;
  readonly disabled?: boolean;
  readonly pressed?: boolean;
  /** Tooltip; also the screen reader's name when `children` is only a sign. */
  readonly title?: string;
  readonly name?: string;
}

/** Acts at once. */
export function Button(props: ButtonProps) {
  const kind = props.primary ? 'button primary' : props.quiet ? 'button quiet' : 'button';
  return (
    <button
      type="button"
      class={kind}
      disabled={props.disabled}
      title={props.title}
      aria-label={props.name}
      aria-pressed={props.pressed}
      onClick={props.onClick}
    >
      {props.children}
    </button>
  );
}
