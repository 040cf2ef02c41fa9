/** On or off, with its word. */
export function Toggle(props: {
  label: string;
  on: boolean;
  onChange: (on: boolean) => void;
  disabled?: boolean;
  hint?: string;
}) {
  return (
    <label class="toggle" title={props.hint}>
      <input
        type="checkbox"
        checked={props.on}
        disabled={props.disabled}
        onChange={(event) => props.onChange(event.currentTarget.checked)}
      />
      {props.label}
    </label>
  );
}
