import { useId } from 'preact/hooks';

export interface SelectProps<T extends string> {
  readonly label: string;
  readonly value: T;
  readonly options: readonly { readonly value: T; readonly label: string }[];
  readonly onChange: (value: T) => void;
  readonly disabled?: boolean;
  readonly hint?: string;
}

/** One of a few; the label stands before it, as in a NumberField. */
export function Select<T extends string>(props: SelectProps<T>) {
  const id = useId();
  return (
    <div class="field choice" title={props.hint}>
      <label for={id}>{props.label}</label>
      <select
        id={id}
        value={props.value}
        disabled={props.disabled}
        onChange={(event) => {
          const chosen = props.options.find((option) => option.value === event.currentTarget.value);
          if (chosen !== undefined) props.onChange(chosen.value);
        }}
      >
        {props.options.map((option) => (
          <option key={option.value} value={option.value}>
            {option.label}
          </option>
        ))}
      </select>
    </div>
  );
}
