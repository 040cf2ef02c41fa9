import { useId, useState } from 'preact/hooks';
import { useStore } from '../store/context.ts';
import { readable, shownUnit } from '../store/units.ts';
import { onGrid, parseNumber } from './numberText.ts';

export interface NumberFieldProps {
  readonly label: string;
  readonly value: number;
  /** Called with a number inside [min, max]; what it says back (a refusal) is shown under the field. */
  readonly onChange: (value: number) => string | null | void;
  readonly min: number;
  readonly max: number;
  /** One press of an arrow key; Shift makes it a tenth. Default: a hundredth of the slider's range, rounded. */
  readonly step?: number;
  /** The kept unit, SI or µs; shown in the person's system. */
  readonly unit?: string;
  /** Double-click goes back to it; a differing value is marked. */
  readonly saved?: number;
  /** Slider's own range where [min, max] is too wide to slide over. */
  readonly sliderMin?: number;
  readonly sliderMax?: number;
  /** Slider position by logarithm: for values over several decades. */
  readonly logarithmic?: boolean;
  readonly noSlider?: boolean;
  readonly disabled?: boolean;
  readonly hint?: string;
}

const SLIDER_STEPS = 1000;
const FINE = 0.1;
const DIGITS = 6;

/**
 * A number that a person sets: slider, field and arrow keys together, unit in lighter ink, limits said.
 * Wrong text shows what is allowed and leaves the old value in place.
 */
export function NumberField(props: NumberFieldProps) {
  const store = useStore();
  const words = store.texts.field;
  const id = useId();
  const [typed, setTyped] = useState<string | null>(null);
  const [message, setMessage] = useState<string | null>(null);
  const { value, min, max, saved } = props;
  const { unit, factor } = shownUnit(props.unit ?? '', store.settings.value.units);
  const range = sliderRange(props);
  const step = props.step ?? niceStep((range.high - range.low) / 100);
  const ends = [min, max].map((end) => ({ kept: end, shown: readable(end * factor, DIGITS) }));
  const limits = words.limits(ends[0].shown, ends[1].shown, unit);

  const set = (next: number): void => {
    const refusal = props.onChange(Math.min(max, Math.max(min, next)));
    setMessage(typeof refusal === 'string' ? refusal : null);
    setTyped(null);
  };
  const settle = (text: string): void => {
    const shown = parseNumber(text);
    // The limits as said are taken, though rounding may put them a hair outside.
    const end = ends.find((one) => parseNumber(one.shown) === shown);
    const next = shown === null ? null : (end?.kept ?? shown / factor);
    setTyped(null);
    if (next === null) setMessage(words.notNumber(text, limits));
    else if (next < min || next > max) setMessage(words.outside(text.trim(), limits));
    else {
      store.sealEdit();
      set(next);
    }
  };
  const nudge = (direction: number, fine: boolean): void => {
    const by = (fine ? step * FINE : step) * direction;
    set(onGrid(value + by, fine ? step * FINE : step, 0));
  };
  const arrows = (event: KeyboardEvent): void => {
    const direction = event.key === 'ArrowUp' ? 1 : event.key === 'ArrowDown' ? -1 : 0;
    const sideways = event.key === 'ArrowRight' ? 1 : event.key === 'ArrowLeft' ? -1 : 0;
    const onSlider = event.currentTarget instanceof HTMLInputElement && event.currentTarget.type === 'range';
    const move = direction !== 0 ? direction : onSlider ? sideways : 0;
    if (move !== 0) {
      event.preventDefault();
      nudge(move, event.shiftKey);
    } else if (event.key === 'Enter' && typed !== null) settle(typed);
    else if (event.key === 'Escape' && typed !== null) {
      event.preventDefault();
      event.stopPropagation();
      setTyped(null);
      setMessage(null);
    }
  };
  const back = (): void => {
    if (saved === undefined || props.disabled === true) return;
    store.sealEdit();
    set(saved);
  };

  const changed = saved !== undefined && saved !== value;
  const hint = [
    props.hint,
    limits,
    saved === undefined ? null : words.saved(readable(saved * factor, DIGITS)),
    words.fine,
  ]
    .filter((line) => line)
    .join('\n');
  return (
    <div class={props.noSlider ? 'field no-slider' : 'field'} title={hint} onDblClick={back}>
      <label for={id} class={changed ? 'changed-from' : undefined}>
        {props.label}
        {changed ? <span aria-hidden="true"> {store.texts.topLine.changedMark}</span> : null}
      </label>
      {props.noSlider ? null : (
        <input
          type="range"
          aria-label={props.label}
          aria-valuetext={`${readable(value * factor, DIGITS)} ${unit}`}
          min={0}
          max={SLIDER_STEPS}
          step="any"
          value={range.toSlider(value) * SLIDER_STEPS}
          disabled={props.disabled}
          onKeyDown={arrows}
          onPointerDown={() => store.sealEdit()}
          onInput={(event) => {
            const raw = range.fromSlider(Number(event.currentTarget.value) / SLIDER_STEPS);
            const grid = props.logarithmic ? niceStep(raw / 200) : step * FINE;
            set(onGrid(raw, grid, 0));
          }}
        />
      )}
      <span class="number">
        <input
          id={id}
          type="text"
          inputMode="decimal"
          autocomplete="off"
          spellcheck={false}
          value={typed ?? readable(value * factor, DIGITS)}
          disabled={props.disabled}
          aria-invalid={message !== null}
          aria-describedby={message === null ? undefined : `${id}-message`}
          onInput={(event) => setTyped(event.currentTarget.value)}
          onKeyDown={arrows}
          onFocus={(event) => event.currentTarget.select()}
          onBlur={() => {
            if (typed !== null) settle(typed);
          }}
        />
        <span class="unit">{unit}</span>
      </span>
      {message === null ? null : (
        <p class="message" id={`${id}-message`} role="alert">
          {message}
        </p>
      )}
    </div>
  );
}

interface SliderRange {
  readonly low: number;
  readonly high: number;
  readonly toSlider: (value: number) => number;
  readonly fromSlider: (share: number) => number;
}

function sliderRange(props: NumberFieldProps): SliderRange {
  const low = props.sliderMin ?? props.min;
  const high = props.sliderMax ?? props.max;
  const held = (share: number) => Math.min(1, Math.max(0, share));
  if (props.logarithmic === true && low > 0) {
    const span = Math.log(high / low);
    return {
      low,
      high,
      toSlider: (value) => (value <= 0 ? 0 : held(Math.log(value / low) / span)),
      fromSlider: (share) => low * Math.exp(share * span),
    };
  }
  return {
    low,
    high,
    toSlider: (value) => held((value - low) / (high - low)),
    fromSlider: (share) => low + share * (high - low),
  };
}

/** The nearest 1, 2 or 5 times a power of ten at or above `size`. */
function niceStep(size: number): number {
  const power = 10 ** Math.floor(Math.log10(size));
  const mantissa = size / power;
  return (mantissa <= 1 ? 1 : mantissa <= 2 ? 2 : mantissa <= 5 ? 5 : 10) * power;
}
