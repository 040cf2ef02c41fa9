import { useState } from 'preact/hooks';
import { AXES, type AxisName } from '../../../craft/gains.ts';
import { LineSample } from '../../plots/LineSample.tsx';
import { useStore } from '../../store/context.ts';
import { sameJson } from '../../store/document.ts';
import { readable } from '../../store/units.ts';
import { Button } from '../../widgets/Button.tsx';
import { DataTable, type Column } from '../../widgets/DataTable.tsx';
import { FileDrop } from '../../widgets/FileDrop.tsx';
import { NoticeBox } from '../../widgets/Notice.tsx';
import { Stale } from '../../widgets/states.tsx';
import { Tabs } from '../../widgets/Tabs.tsx';
import { acceptCorrection } from './accept.ts';
import { AxisPlots } from './AxisPlots.tsx';
import type { ShownAxis, ShownEstimate } from './messages.ts';
import { Replay } from './Replay.tsx';
import type { Matched, MatchSession } from './session.ts';
import { matchTexts as words } from './texts.ts';

/** Half width of a 95 % interval in standard errors (normal distribution). */
const HALF_95 = 1.96;

/** Numbers on the left, what they stand on at the right. */
export function Results(props: { session: MatchSession; matched: Matched }) {
  const { session, matched } = props;
  const store = useStore();
  const { result } = matched;
  const lively = AXES.find((axis) => result.axes[axis].estimates !== null) ?? 'roll';
  const [axis, setAxis] = useState<AxisName>(lively);
  const now = store.build.value;
  const accepted = result.corrected !== null && sameJson(now, result.corrected);
  const stale = store.craft.value.id !== matched.craftId || (!accepted && !sameJson(now, matched.build));
  return (
    <div class="match-results">
      <section class="match-side" aria-label={words.results}>
        <div class="row">
          <h2>{words.results}</h2>
          <span class="match-fill" />
          {!matched.proposal.ownRecord && (
            <Button onClick={() => session.columnsAgain(matched)}>{words.columnsAgain}</Button>
          )}
          <Button onClick={() => session.clear()}>{words.again}</Button>
        </div>
        <p>
          <strong>{matched.file.name}</strong>{' '}
          <span class="faint">
            {words.facts(String(result.rows), readable(result.seconds, 3), readable(result.rate_Hz, 4))}
          </span>
        </p>
        <Offers session={session} matched={matched} />
        <Stale
          stale={stale}
          onRecompute={() => session.match(matched.file, matched.proposal, matched.choice)}
        >
          <NumbersTable matched={matched} chosen={axis} onChoose={setAxis} />
          <Correction matched={matched} accepted={accepted} stale={stale} />
        </Stale>
        {result.remarks.length > 0 && (
          <>
            <h3>{words.onTheLog}</h3>
            <ul>
              {result.remarks.map((remark) => (
                <li key={remark}>{remark}</li>
              ))}
            </ul>
          </>
        )}
        <FileDrop label={words.again} accept={words.accept} onFiles={(files) => session.open(files[0])} />
      </section>
      <section class="match-main" aria-label={words.axis}>
        <Tabs
          label={words.axis}
          value={axis}
          tabs={AXES.map((value) => ({ value, label: value }))}
          onChange={setAxis}
        >
          <Note axis={axis} note={result.axes[axis].note} />
          <AxisPlots key={axis} axis={axis} shown={result.axes[axis]} />
          <Replay axis={axis} session={session} matched={matched} />
        </Tabs>
      </section>
    </div>
  );
}

function Note(props: { axis: AxisName; note: string }) {
  return (
    <p class="match-note" role="status" aria-label={words.notesOf(props.axis)}>
      {props.note}
    </p>
  );
}

/** What looks mistaken, each as a sentence with the button that puts it right. */
function Offers(props: { session: MatchSession; matched: Matched }) {
  const { session, matched } = props;
  const { offers } = matched.result;
  if (offers.length === 0) return null;
  return (
    <div class="match-offers">
      {offers.map((offer) => (
        <NoticeBox
          key={offer.because}
          kind="warning"
          action={{ label: words.offer(offer.unit), run: () => session.take(matched, [offer]) }}
        >
          {offer.because}
        </NoticeBox>
      ))}
      {offers.length > 1 && (
        <div>
          <Button primary onClick={() => session.take(matched, offers)}>
            {words.offerAll(offers.length)}
          </Button>
        </div>
      )}
    </div>
  );
}

interface AxisRow {
  readonly axis: AxisName;
  readonly shown: ShownAxis;
}

function NumbersTable(props: { matched: Matched; chosen: AxisName; onChoose: (axis: AxisName) => void }) {
  const { axes } = props.matched.result;
  const rows = AXES.map((axis): AxisRow => ({ axis, shown: axes[axis] }));
  const number = (
    label: string,
    unit: string,
    scale: number,
    of: (shown: ShownAxis) => { estimate: ShownEstimate | null; build: number },
  ): Column<AxisRow> => ({
    key: label,
    label,
    unit,
    numeric: true,
    show: ({ shown }) => {
      const { estimate, build } = of(shown);
      return (
        <>
          <div>{estimate === null ? '–' : withInterval(estimate, scale)}</div>
          <div class="small faint">{words.buildSays(readable(build * scale, 3))}</div>
        </>
      );
    },
  });
  const columns: Column<AxisRow>[] = [
    {
      key: 'axis',
      label: words.axis,
      show: ({ axis, shown }) => (
        <>
          <button type="button" class="sort" onClick={() => props.onChoose(axis)}>
            {axis}
          </button>{' '}
          <LineSample axis={axis} />
          {shown.estimates === null && <div class="small match-guess">{words.noNumbers}</div>}
        </>
      ),
    },
    number(words.gain, words.gainUnit, 1, ({ estimates, model }) => ({
      estimate: estimates?.gain_dps2_per_us ?? null,
      build: model.gain_dps2_per_us,
    })),
    number(words.lag, 'ms', 1000, ({ estimates, model }) => ({
      estimate: estimates?.lag_s ?? null,
      build: model.lag_s,
    })),
    number(words.delay, 'ms', 1000, ({ estimates, model }) => ({
      estimate: estimates?.delay_s ?? null,
      build: model.delay_s,
    })),
    {
      key: 'fit',
      label: words.fit,
      unit: '%',
      numeric: true,
      show: ({ shown }) => (
        <span title={words.fitHint}>{shown.fit_pct === null ? '–' : shown.fit_pct.toFixed(0)}</span>
      ),
    },
    {
      key: 'used',
      label: words.usable,
      unit: 's',
      numeric: true,
      show: ({ shown }) => shown.usable_s.toFixed(0),
    },
  ];
  return (
    <>
      <div class="match-table">
        <DataTable
          label={words.results}
          columns={columns}
          rows={rows}
          rowKey={({ axis }) => axis}
          chosen={props.chosen}
        />
      </div>
      <p class="small faint">{words.interval}</p>
      {rows
        .filter(({ shown }) => shown.estimates === null)
        .map(({ axis, shown }) => (
          <p key={axis} class="match-why">
            <strong>{axis}</strong>: {shown.note}
          </p>
        ))}
    </>
  );
}

/** "30.12 ± 0.45": the interval with two digits, the value to the same place. */
function withInterval(estimate: ShownEstimate, scale: number): string {
  const half = HALF_95 * estimate.sigma * scale;
  const places = half > 0 ? Math.min(4, Math.max(0, 1 - Math.floor(Math.log10(half)))) : 3;
  return `${(estimate.value * scale).toFixed(places).replace('-', '−')} ± ${half.toFixed(places)}`;
}

/** A sentence about the build's fields with the words for them. */
function plainly(line: string): string {
  const named = Object.entries(words.fields).find(([field]) => line.startsWith(field));
  return (named === undefined ? line : named[1] + line.slice(named[0].length)).replace('(-', '(−');
}

function Correction(props: { matched: Matched; accepted: boolean; stale: boolean }) {
  const store = useStore();
  const { result, file } = props.matched;
  const { corrected, changes, kept } = result;
  return (
    <section class="panel" aria-label={words.correct}>
      <h2>{words.correct}</h2>
      {corrected === null ? null : <p class="small faint">{words.correctIntro}</p>}
      <ul class="match-changes">
        {[...changes, ...kept].map((line) => (
          <li key={line}>{plainly(line)}</li>
        ))}
      </ul>
      {corrected !== null && (
        <>
          <div class="row">
            <Button
              primary
              disabled={props.accepted || props.stale}
              onClick={() =>
                acceptCorrection(store, corrected, result.axes, `${words.acceptLabel} ${file.name}`)
              }
            >
              {words.acceptNow}
            </Button>
            <span role="status">{props.accepted ? words.accepted : ''}</span>
          </div>
          {props.accepted && (
            <p class="row">
              <a href="#/shape">{words.toShape}</a>
              <a href="#/prove">{words.toProve}</a>
            </p>
          )}
          <p class="small faint">{words.notClearance}</p>
        </>
      )}
    </section>
  );
}
