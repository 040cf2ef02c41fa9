/** Match: a log of the real craft over the model; identified numbers with their intervals; a corrected build. */
import { useEffect, useMemo, useRef, useState } from 'preact/hooks';
import { AXES, type AxisName } from '../../../craft/gains.ts';
import { SIGNALS, UNITS, type ColumnChoice, type Columns } from '../../../matching/columns.ts';
import { excitationC, suggestedExcitations } from '../../../matching/excitation.ts';
import { LOG_GUIDE } from '../../../matching/guide.ts';
import type { LogProposal } from '../../../matching/inspectLog.ts';
import { LinePlot, type PlotSeries } from '../../plots/LinePlot.tsx';
import { useStore } from '../../store/context.ts';
import { readable } from '../../store/units.ts';
import { Button } from '../../widgets/Button.tsx';
import { FileDrop } from '../../widgets/FileDrop.tsx';
import { NoticeBox } from '../../widgets/Notice.tsx';
import './match.css';
import type { FromMatchWorker, ShownAxis, ShownEstimate, ShownMatch, ToMatchWorker } from './match.worker.ts';
import { matchTexts as words } from './texts.ts';

type Step =
  | { readonly kind: 'drop' }
  | {
      readonly kind: 'confirm';
      readonly file: File;
      readonly proposal: LogProposal;
      readonly columns: Columns;
    }
  | { readonly kind: 'busy'; readonly file: File }
  | { readonly kind: 'matched'; readonly file: File; readonly columns: Columns; readonly result: ShownMatch };

/** The same heads: the same mapping as last time. */
const shapeOf = (proposal: LogProposal): string => proposal.form.heads.join('|').slice(0, 400);

export default function Match() {
  const store = useStore();
  const [step, setStep] = useState<Step>({ kind: 'drop' });
  const [refused, setRefused] = useState<string | null>(null);
  const worker = useRef<Worker | null>(null);
  useEffect(() => () => worker.current?.terminate(), []);
  const start = (message: ToMatchWorker, hear: (data: FromMatchWorker, end: () => void) => void): void => {
    worker.current?.terminate();
    const one = new Worker(new URL('./match.worker.ts', import.meta.url), { type: 'module' });
    worker.current = one;
    const job = store.jobs.start(words.reading, () => {
      one.terminate();
      setStep({ kind: 'drop' });
    });
    const end = (): void => {
      job.end();
      one.terminate();
    };
    one.onerror = (event) => {
      end();
      setRefused(event.message);
      setStep({ kind: 'drop' });
    };
    one.onmessage = ({ data }: MessageEvent<FromMatchWorker>) => {
      if (data.kind === 'progress') job.progress(data.share);
      else if (data.kind === 'refused') {
        end();
        const first = data.problems[0];
        setRefused(
          `${data.file}: ${first?.path ?? ''} ${first?.value ?? ''}. Allowed: ${first?.allowed ?? ''}`,
        );
        setStep({ kind: 'drop' });
      } else hear(data, end);
    };
    one.postMessage(message);
  };
  const match = (file: File, columns: Columns): void => {
    setStep({ kind: 'busy', file });
    start({ kind: 'match', file, columns, build: store.build.value }, (data, end) => {
      if (data.kind !== 'matched') return;
      end();
      setStep({ kind: 'matched', file, columns, result: data.result });
    });
  };
  const take = (file: File): void => {
    setRefused(null);
    setStep({ kind: 'busy', file });
    start({ kind: 'inspect', file }, (data, end) => {
      if (data.kind !== 'proposal') return;
      end();
      const { proposal } = data;
      const kept = store.settings.value.places[`match:${shapeOf(proposal)}`] as Columns | undefined;
      if (proposal.ownRecord) match(file, proposal.columns);
      else setStep({ kind: 'confirm', file, proposal, columns: kept ?? proposal.columns });
    });
  };
  useEffect(() => {
    const offered = store.takeOffered('match');
    if (offered !== null) take(offered);
  }, []);
  return (
    <div class="match">
      {step.kind === 'drop' && (
        <>
          <p>{words.intro}</p>
          <FileDrop
            label={words.drop}
            accept=".csv,.txt,.json,.jsonl,.ndjson"
            onFiles={(files) => files[0] !== undefined && take(files[0])}
          />
          {refused !== null && <NoticeBox kind="error">{refused}</NoticeBox>}
          <Guide />
        </>
      )}
      {step.kind === 'busy' && (
        <p role="status">
          {words.reading}: {step.file.name}
        </p>
      )}
      {step.kind === 'confirm' && (
        <Mapping
          proposal={step.proposal}
          columns={step.columns}
          onChange={(columns) => setStep({ ...step, columns })}
          onGo={() => {
            store.setPlaceMemory(`match:${shapeOf(step.proposal)}`, step.columns);
            match(step.file, step.columns);
          }}
        />
      )}
      {step.kind === 'matched' && (
        <Result
          result={step.result}
          onAgain={() => setStep({ kind: 'drop' })}
          onOffer={(offer) => {
            const changed: Record<string, ColumnChoice> = {};
            for (const signal of offer.signals) {
              const now = step.columns[signal];
              if (now === undefined) continue;
              changed[signal] = {
                ...now,
                ...(offer.unit === undefined ? {} : { unit: offer.unit }),
                ...(offer.sign === -1 ? { sign: now.sign === -1 ? 1 : -1 } : {}),
              };
            }
            match(step.file, { ...step.columns, ...changed });
          }}
        />
      )}
    </div>
  );
}

function Mapping(props: {
  proposal: LogProposal;
  columns: Columns;
  onChange: (columns: Columns) => void;
  onGo: () => void;
}) {
  const { proposal, columns } = props;
  const set = (signal: string, choice: ColumnChoice | null): void => {
    const { [signal]: _old, ...others } = columns;
    props.onChange(choice === null ? others : { ...others, [signal]: choice });
  };
  return (
    <section aria-label={words.mapping}>
      <h2>{words.mapping}</h2>
      {proposal.missing.length > 0 && (
        <NoticeBox kind="warning">
          {words.missing}: {proposal.missing.map((one) => `${one.signal} (${one.allowed})`).join('; ')}
        </NoticeBox>
      )}
      <table class="match-table">
        <thead>
          <tr>
            <th>{words.signal}</th>
            <th>{words.column}</th>
            <th>{words.unit}</th>
            <th>{words.because}</th>
          </tr>
        </thead>
        <tbody>
          {[...SIGNALS].map(([signal, kind]) => {
            const choice = columns[signal];
            const reason = proposal.reasons.find((one) => one.signal === signal);
            return (
              <tr key={signal}>
                <th scope="row">{signal}</th>
                <td>
                  <select
                    aria-label={`${words.column} ${signal}`}
                    value={choice === undefined ? '' : String(choice.column)}
                    onChange={(event) => {
                      const column = event.currentTarget.value;
                      set(
                        signal,
                        column === ''
                          ? null
                          : {
                              column,
                              unit: choice?.unit ?? Object.keys(UNITS[kind])[0],
                              sign: choice?.sign ?? 1,
                            },
                      );
                    }}
                  >
                    <option value="">{words.none}</option>
                    {proposal.form.heads.map((head) => (
                      <option key={head} value={head}>
                        {head}
                      </option>
                    ))}
                  </select>
                </td>
                <td>
                  {choice !== undefined && (
                    <select
                      aria-label={`${words.unit} ${signal}`}
                      value={choice.unit}
                      onChange={(event) => set(signal, { ...choice, unit: event.currentTarget.value })}
                    >
                      {Object.keys(UNITS[kind]).map((unit) => (
                        <option key={unit}>{unit}</option>
                      ))}
                    </select>
                  )}
                </td>
                <td class="small">
                  {reason?.because}{' '}
                  {reason !== undefined && !reason.sure && <em class="warn">({words.guess})</em>}
                </td>
              </tr>
            );
          })}
        </tbody>
      </table>
      <Button primary onClick={props.onGo}>
        {words.go}
      </Button>
    </section>
  );
}

function Result(props: {
  result: ShownMatch;
  onAgain: () => void;
  onOffer: (offer: ShownMatch['offers'][number]) => void;
}) {
  const { result } = props;
  const store = useStore();
  const [said, setSaid] = useState('');
  const interval = (one: ShownEstimate | null, scale: number) =>
    one === null ? words.noNumbers : `${readable(one.value * scale)} ± ${readable(1.96 * one.sigma * scale)}`;
  return (
    <section aria-label={words.results}>
      <div class="row">
        <h2>{words.results}</h2>
        <Button onClick={props.onAgain}>{words.again}</Button>
      </div>
      {result.offers.map((offer) => (
        <NoticeBox
          key={offer.because}
          kind="warning"
          action={{ label: words.offer, run: () => props.onOffer(offer) }}
        >
          {offer.because}
        </NoticeBox>
      ))}
      <table class="match-table">
        <thead>
          <tr>
            <th>{words.axis}</th>
            <th>{words.gain}</th>
            <th>{words.lag}</th>
            <th>{words.delay}</th>
            <th>{words.fit}</th>
            <th>{words.usable}</th>
          </tr>
        </thead>
        <tbody>
          {AXES.map((axis) => {
            const one = result.axes[axis];
            return (
              <tr key={axis}>
                <th scope="row">{axis}</th>
                <td>{interval(one.gain_dps2_per_us, 1)}</td>
                <td>{interval(one.lag_s, 1000)}</td>
                <td>{interval(one.delay_s, 1000)}</td>
                <td>{one.fit_pct === null ? words.none : `${one.fit_pct.toFixed(0)} %`}</td>
                <td>{one.usable_s.toFixed(0)} s</td>
              </tr>
            );
          })}
        </tbody>
      </table>
      <ul>
        {AXES.map((axis) => (
          <li key={axis}>
            <strong>{axis}</strong>: {result.axes[axis].note}
          </li>
        ))}
        {result.remarks.map((remark) => (
          <li key={remark}>{remark}</li>
        ))}
      </ul>
      {result.corrected !== null && (
        <div class="panel">
          <ul class="small">
            {[...result.changes, ...result.kept].map((one) => (
              <li key={one}>{one}</li>
            ))}
          </ul>
          <Button
            primary
            onClick={() => {
              if (result.corrected !== null && store.setBuild(result.corrected, words.accept).length === 0)
                setSaid(words.accepted);
            }}
          >
            {words.accept}
          </Button>
          <span role="status"> {said}</span>
        </div>
      )}
      <div class="match-plots">
        {AXES.map((axis) => (
          <AxisPlots key={axis} axis={axis} shown={result.axes[axis]} />
        ))}
      </div>
    </section>
  );
}

function AxisPlots(props: { axis: AxisName; shown: ShownAxis }) {
  const { axis } = props;
  const { check, response } = props.shown;
  const over = useMemo((): PlotSeries[] => {
    if (check === null) return [];
    return [
      { label: words.measured, axis: 'faint', values: check.measured_dps },
      { label: words.simulated, axis, values: check.simulated_dps },
    ];
  }, [check, axis]);
  const left = useMemo(
    (): PlotSeries[] =>
      check === null
        ? []
        : [
            {
              label: words.measured,
              axis,
              values: check.measured_dps.map((y, i) => y - check.simulated_dps[i]),
            },
          ],
    [check, axis],
  );
  const gain = useMemo(
    (): PlotSeries[] => (response === null ? [] : [{ label: axis, axis, values: response.gain_dB }]),
    [response, axis],
  );
  const coherence = useMemo(
    (): PlotSeries[] =>
      response === null ? [] : [{ label: words.coherence, axis: 'ink', values: response.coherence }],
    [response],
  );
  return (
    <>
      {check !== null && (
        <>
          <LinePlot
            label={words.check(axis)}
            x={check.t_s}
            series={over}
            xLabel=""
            xUnit="s"
            yLabel={axis}
            yUnit="deg/s"
            height={170}
          />
          <LinePlot
            label={words.residual(axis)}
            x={check.t_s}
            series={left}
            xLabel=""
            xUnit="s"
            yLabel={axis}
            yUnit="deg/s"
            height={120}
          />
        </>
      )}
      {response !== null && (
        <>
          <LinePlot
            label={words.response(axis)}
            x={response.f_Hz}
            series={gain}
            xLabel=""
            xUnit="Hz"
            yLabel={axis}
            yUnit="dB"
            logX
            height={150}
          />
          <LinePlot
            label={words.coherence}
            x={response.f_Hz}
            series={coherence}
            xLabel=""
            xUnit="Hz"
            yLabel={words.coherence}
            yUnit=""
            logX
            yRange={[0, 1]}
            height={120}
          />
        </>
      )}
    </>
  );
}

function Guide() {
  const store = useStore();
  const [said, setSaid] = useState('');
  const copy = async () => {
    const all = suggestedExcitations('roll', store.gains.value.maxRate_dps.roll).map(excitationC).join('\n');
    await navigator.clipboard.writeText(all);
    setSaid(words.copied);
  };
  return (
    <section class="match-guide">
      <h2>{words.guide}</h2>
      <ul class="match-cautions" aria-label={words.cautions}>
        {LOG_GUIDE.cautions.map((one) => (
          <li key={one}>{one}</li>
        ))}
      </ul>
      <ul>
        {[...LOG_GUIDE.before, ...LOG_GUIDE.logging].map((one) => (
          <li key={one}>{one}</li>
        ))}
      </ul>
      <ol>
        {LOG_GUIDE.steps.map((one) => (
          <li key={one.title}>
            <strong>{one.title}</strong>, {one.seconds} s. {one.how} <span class="faint">{one.gives}</span>
          </li>
        ))}
      </ol>
      <p>
        <strong>{words.excitation}.</strong> {words.excitationHint}{' '}
        <Button onClick={() => void copy()}>{words.copyC}</Button> <span role="status">{said}</span>
      </p>
    </section>
  );
}
