import { useState } from 'preact/hooks';
import { CORNERS } from '../../../craft/build.ts';
import { AXES } from '../../../craft/gains.ts';
import { missingSignals, SIGNALS, UNITS, unitInside, type ColumnChoice } from '../../../matching/columns.ts';
import { Button } from '../../widgets/Button.tsx';
import { parseNumber } from '../../widgets/numberText.ts';
import type { LogChoice } from './messages.ts';
import type { MatchState } from './session.ts';
import { matchTexts as words } from './texts.ts';

type Confirm = Extract<MatchState, { kind: 'confirm' }>;

interface SignalGroup {
  readonly title: string;
  readonly signals: readonly string[];
}

const GROUPS: readonly SignalGroup[] = [
  { title: words.groups.needed, signals: ['t', ...AXES.map((axis) => `gyro_${axis}`)] },
  { title: words.groups.commands, signals: CORNERS.map((corner) => `cmd_${corner}`) },
  { title: words.groups.setpoints, signals: [...AXES.map((axis) => `sp_${axis}`), 'throttle'] },
  {
    title: words.groups.more,
    signals: [
      ...AXES.map((axis) => `u_${axis}`),
      ...CORNERS.map((corner) => `speed_${corner}`),
      ...AXES.map((axis) => `angle_${axis}`),
      'descent',
    ],
  },
];

/** Rates a controller may run at, Hz; as wide as any log. */
const LOOP_LIMITS_HZ = [20, 20_000] as const;

/** Which column is what, as proposed, corrected and confirmed. */
export function Mapping(props: {
  state: Confirm;
  onChange: (choice: LogChoice) => void;
  onGo: () => void;
  onAgain: () => void;
}) {
  const { file, proposal, choice, remembered } = props.state;
  const { columns } = choice;
  const missing = missingSignals(columns);
  const set = (signal: string, one: ColumnChoice | null): void => {
    // A column is one signal: whoever had it lets go of it.
    const others = Object.fromEntries(
      Object.entries(columns).filter(([name, other]) => name !== signal && other?.column !== one?.column),
    );
    props.onChange({ ...choice, columns: one === null ? others : { ...others, [signal]: one } });
  };
  return (
    <section class="match-mapping" aria-label={words.columns}>
      <h2>{words.columns}</h2>
      <p>
        {words.columnsIntro(file.name, proposal.form.heads.length)} {remembered && words.remembered}
      </p>
      <p class="small faint">{words.signs}</p>
      <div class="match-groups">
        {GROUPS.map((group) => (
          <Group key={group.title} group={group} state={props.state} onChange={set} />
        ))}
      </div>
      {proposal.unused.length > 0 && <p class="small faint">{words.unused(proposal.unused.join(', '))}</p>}
      <LoopField choice={choice} onChange={props.onChange} />
      <div class="match-confirm row">
        <Button primary disabled={missing.length > 0} onClick={props.onGo}>
          {words.go}
        </Button>
        <Button onClick={props.onAgain}>{words.again}</Button>
        <span role="status" class="match-guess">
          {missing.length > 0 && `${words.missing}: ${missing.map(({ allowed }) => allowed).join('; ')}.`}
        </span>
      </div>
    </section>
  );
}

type OnSignal = (signal: string, choice: ColumnChoice | null) => void;

function Group(props: { group: SignalGroup; state: Confirm; onChange: OnSignal }) {
  const { group, state } = props;
  return (
    <table class="table">
      <caption>{group.title}</caption>
      <thead>
        <tr>
          <th scope="col">{words.signal}</th>
          <th scope="col">{words.column}</th>
          <th scope="col">{words.unit}</th>
          <th scope="col">{words.sign}</th>
          <th scope="col">{words.because}</th>
        </tr>
      </thead>
      <tbody>
        {group.signals.map((signal) => (
          <SignalRow key={signal} signal={signal} state={state} onChange={props.onChange} />
        ))}
      </tbody>
    </table>
  );
}

function SignalRow(props: { signal: string; state: Confirm; onChange: OnSignal }) {
  const { signal, state, onChange } = props;
  const { proposal, choice } = state;
  const kind = SIGNALS.get(signal) ?? 'share';
  const now = choice.columns[signal];
  const name = words.names[signal] ?? signal;
  const { heads } = proposal.form;
  const head = typeof now?.column === 'number' ? heads[now.column - 1] : now?.column;
  const reason = proposal.reasons.find((one) => one.signal === signal);
  const asProposed = reason !== undefined && reason.column === head && reason.unit === now?.unit;
  return (
    <tr>
      <th scope="row">{name}</th>
      <td>
        <select
          aria-label={`${words.column}: ${name}`}
          value={head ?? ''}
          onChange={(event) => {
            const column = event.currentTarget.value;
            const unit = now?.unit ?? unitInside(kind);
            onChange(signal, column === '' ? null : { column, unit, sign: now?.sign ?? 1 });
          }}
        >
          <option value="">{words.none}</option>
          {heads.map((one) => (
            <option key={one} value={one}>
              {one}
            </option>
          ))}
        </select>
      </td>
      <td>
        {now !== undefined && (
          <select
            aria-label={`${words.unit}: ${name}`}
            value={now.unit}
            onChange={(event) => onChange(signal, { ...now, unit: event.currentTarget.value })}
          >
            {Object.keys(UNITS[kind]).map((unit) => (
              <option key={unit} value={unit}>
                {unit === 'us' ? 'µs' : unit === '1' ? '0…1' : unit}
              </option>
            ))}
          </select>
        )}
      </td>
      <td>
        {now !== undefined && kind !== 'time' && (
          <select
            aria-label={`${words.sign}: ${name}`}
            value={String(now.sign)}
            onChange={(event) =>
              onChange(signal, { ...now, sign: event.currentTarget.value === '-1' ? -1 : 1 })
            }
          >
            <option value="1">{words.asIs}</option>
            <option value="-1">{words.turned}</option>
          </select>
        )}
      </td>
      <td class="small">
        {now === undefined ? null : asProposed ? (
          <>
            {reason.because.replace(/\bus\b/, 'µs')}
            {!reason.sure && <strong class="match-guess"> {words.look}</strong>}
          </>
        ) : (
          words.chosen
        )}
      </td>
    </tr>
  );
}

function LoopField(props: { choice: LogChoice; onChange: (choice: LogChoice) => void }) {
  const { choice } = props;
  const [text, setText] = useState(choice.loop_Hz === null ? '' : String(choice.loop_Hz));
  const [wrong, setWrong] = useState(false);
  const settle = (): void => {
    const value = parseNumber(text);
    const empty = text.trim() === '';
    const fits = value !== null && value >= LOOP_LIMITS_HZ[0] && value <= LOOP_LIMITS_HZ[1];
    setWrong(!empty && !fits);
    props.onChange({ ...choice, loop_Hz: fits ? value : null });
  };
  return (
    <div class="match-loop">
      <label>
        {words.loop}{' '}
        <input
          class="text-input"
          type="text"
          inputMode="decimal"
          value={text}
          aria-invalid={wrong}
          aria-describedby="match-loop-hint"
          onInput={(event) => setText(event.currentTarget.value)}
          onBlur={settle}
          onKeyDown={(event) => {
            if (event.key === 'Enter') settle();
          }}
        />{' '}
        <span class="unit">Hz</span>
      </label>
      <span id="match-loop-hint" class={wrong ? 'small match-guess' : 'small faint'}>
        {wrong ? words.loopWrong : words.loopHint}
      </span>
    </div>
  );
}
