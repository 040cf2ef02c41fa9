/** Further measures of the loop, A against B, computed beside the page once the gains rest. */
import { useEffect, useRef, useState } from 'preact/hooks';
import type { Build } from '../../../craft/build.ts';
import type { AxisName, Gains } from '../../../craft/gains.ts';
import type { TrimChoice } from '../../../shaping/axisModel.ts';
import type { AxisReport, ShapeReport } from '../../../shaping/report.ts';
import type { FromShapeWorker, ToShapeWorker } from './shape.worker.ts';
import { shapeTexts } from './texts.ts';
import { useShapeWorker } from './useShapeWorker.ts';

const words = shapeTexts.measures;
const WAIT_MS = 200;

type Value = number | null | undefined;
interface Row {
  readonly label: string;
  readonly unit: string;
  readonly hint: string;
  readonly pick: (report: AxisReport) => Value | readonly number[];
  /** Names in the report's reasons. */
  readonly reason: string;
}

const thousandfold = (value: Value): Value => (value == null ? value : value * 1000);
const ROWS: readonly Row[] = [
  { ...words.bandwidth, unit: 'Hz', pick: (r) => r.handling?.bandwidth_Hz, reason: 'handling' },
  {
    ...words.phaseDelay,
    unit: 'ms',
    pick: (r) => thousandfold(r.handling?.phaseDelay_s),
    reason: 'handling',
  },
  {
    ...words.rejection,
    unit: 'Hz',
    pick: (r) => r.disturbanceRejection?.bandwidth_Hz,
    reason: 'disturbanceRejection',
  },
  {
    ...words.rejectionPeak,
    unit: 'dB',
    pick: (r) => r.disturbanceRejection?.peak_dB,
    reason: 'disturbanceRejection',
  },
  { ...words.pushRate, unit: 'deg/s', pick: (r) => r.push?.peakRate_dps, reason: 'push' },
  { ...words.pushAngle, unit: 'deg', pick: (r) => r.push?.lastingAngle_deg, reason: 'push' },
  { ...words.heat, unit: 'mW', pick: (r) => thousandfold(r.noiseHeat_W), reason: 'noiseHeat_W' },
  { ...words.levelledGain, unit: 'dB', pick: (r) => r.levelled?.gainMarginAtMotors_dB, reason: 'levelled' },
  {
    ...words.levelledPhase,
    unit: 'deg',
    pick: (r) => r.levelled?.phaseMarginAtMotors_deg,
    reason: 'levelled',
  },
  {
    ...words.levelledDelay,
    unit: 'ms',
    pick: (r) => r.levelled?.delayMarginAtMotors_ms,
    reason: 'levelled',
  },
  {
    ...words.levelledRise,
    unit: 'ms',
    pick: (r) => thousandfold(r.levelled?.step.rise_s),
    reason: 'levelled',
  },
  { ...words.gainCrossings, unit: 'Hz', pick: (r) => r.gainCrossings_Hz, reason: 'crossover_Hz' },
  { ...words.phaseCrossings, unit: 'Hz', pick: (r) => r.phaseCrossings_Hz, reason: 'gainMargin_dB' },
];
const HALF = Math.ceil(ROWS.length / 2);
const PARTS = [ROWS.slice(0, HALF), ROWS.slice(HALF)];

export function Measures(props: {
  build: Build;
  gains: Gains;
  other: Gains | null;
  axis: AxisName;
  trim: TrimChoice;
}) {
  const { build, gains, other, axis, trim } = props;
  const worker = useShapeWorker();
  const [found, setFound] = useState<{ a: ShapeReport; b: ShapeReport | null } | null>(null);
  const [failed, setFailed] = useState<string | null>(null);
  const id = useRef(0);
  useEffect(() => {
    const timer = setTimeout(() => {
      const one = worker.current;
      if (one === null) return;
      const own = ++id.current;
      one.onmessage = ({ data }: MessageEvent<FromShapeWorker>) => {
        if (data.id !== own) return;
        setFailed(data.kind === 'failed' ? data.reason : null);
        setFound(data.kind === 'reported' ? data : null);
      };
      one.postMessage({ kind: 'report', id: own, build, gains, other, trim } satisfies ToShapeWorker);
    }, WAIT_MS);
    return () => clearTimeout(timer);
  }, [build, gains, other, trim]);
  const a = found?.a[axis] ?? null;
  const b = found?.b?.[axis] ?? null;
  return (
    <section class="shape-measures shape-full" aria-label={words.label}>
      <h3>{words.label}</h3>
      {failed !== null && <p class="bad">{failed}</p>}
      <div class="shape-measures-parts">
        {PARTS.map((rows) => (
          <Part key={rows[0].label} rows={rows} a={a} b={b} two={other !== null} />
        ))}
      </div>
      {reasonsOf(a).map((why) => (
        <p class="small faint" key={why}>
          {why}
        </p>
      ))}
    </section>
  );
}

function Part(props: { rows: readonly Row[]; a: AxisReport | null; b: AxisReport | null; two: boolean }) {
  return (
    <table class="small">
      <thead>
        <tr>
          <th scope="col">{words.quantity}</th>
          <th scope="col">A</th>
          {props.two && <th scope="col">B</th>}
          <th scope="col">{words.unit}</th>
        </tr>
      </thead>
      <tbody>
        {props.rows.map((row) => (
          <tr key={row.label} title={row.hint}>
            <th scope="row">{row.label}</th>
            <Cell row={row} report={props.a} />
            {props.two && <Cell row={row} report={props.b} />}
            <td class="unit">{row.unit}</td>
          </tr>
        ))}
      </tbody>
    </table>
  );
}

const absent = (value: Value | readonly number[]): boolean =>
  Array.isArray(value) ? value.length === 0 : value == null;

function reasonFor(row: Row, report: AxisReport): string {
  const own = row.reason === 'handling' ? report.handling?.reason : null;
  return own ?? report.reasons[row.reason] ?? words.none;
}

/** Why measures of set A are not there, each reason once with the measures it holds for. */
function reasonsOf(report: AxisReport | null): string[] {
  if (report === null) return [];
  const held = new Map<string, string[]>();
  for (const row of ROWS) {
    if (!absent(row.pick(report))) continue;
    const why = reasonFor(row, report);
    held.set(why, [...(held.get(why) ?? []), row.label]);
  }
  return [...held].map(([why, rows]) => words.absent(rows.join(', '), why));
}

/** A number, or a dash with the reason behind it. */
function Cell(props: { row: Row; report: AxisReport | null }) {
  const { row, report } = props;
  if (report === null) return <td>…</td>;
  const value = row.pick(report);
  if (typeof value === 'number') return <td>{three(value)}</td>;
  if (Array.isArray(value) && value.length > 0) return <td>{value.map(three).join(', ')}</td>;
  return <td title={reasonFor(row, report)}>—</td>;
}

const three = (value: number): string => String(Number(value.toPrecision(3))).replace('-', '−');
