/** Results of trials as self-contained HTML, with everything needed to repeat them. */
import { VERSION } from '../flight/record.ts';
import type { Build } from '../craft/build.ts';
import type { Gains } from '../craft/gains.ts';
import type { Band, Score, TrialResult } from './trial.ts';

export interface ReportContent {
  readonly build: Build;
  readonly gains: Gains;
  readonly results: readonly TrialResult[];
  /** Another gain set's results, to compare with. */
  readonly baseline?: { readonly gains: Gains; readonly results: readonly TrialResult[] };
  readonly notes: string;
  readonly seed: number;
}

export function bandText(band: Band, unit: string): string {
  const parts: string[] = [];
  if (band.least !== undefined) parts.push(`≥ ${band.least}`);
  if (band.most !== undefined) parts.push(`≤ ${band.most}`);
  return parts.length === 0 ? 'open' : `${parts.join(', ')} ${unit}`;
}

function shown(value: number | null): string {
  return value === null ? 'not reached' : String(Number(value.toPrecision(3)));
}

export function reportHtml(content: ReportContent): string {
  const { results, baseline } = content;
  const rows = results.flatMap((result) => {
    const before = baseline?.results.find((one) => one.trial === result.trial);
    return result.scores.map((score, i) =>
      scoreRow(result, score, before?.scores[i] ?? null, i === 0, baseline !== undefined),
    );
  });
  const failed = results.filter((result) => !result.pass);
  const repeat = {
    version: VERSION,
    seed: content.seed,
    build: content.build,
    gains: content.gains,
    ...(baseline === undefined ? {} : { baselineGains: baseline.gains }),
  };
  return `<!doctype html><html lang="en"><head><meta charset="utf-8"><title>Trials: ${escape(content.build.name)}</title><style>
body{font:14px/1.45 system-ui,sans-serif;max-width:1000px;margin:24px auto;padding:0 16px;color:#1b2427;background:#fff;font-variant-numeric:tabular-nums}
table{border-collapse:collapse;width:100%}th,td{text-align:left;padding:2px 10px 2px 0;border-bottom:1px solid #c9c4b6;vertical-align:top}
td.n{text-align:right}.out{font-weight:700}.warning{border:2px solid;padding:6px 10px}pre{white-space:pre-wrap;font-size:11px;border:1px solid #c9c4b6;padding:8px}
</style></head><body><h1>Trials: ${escape(content.build.name)}</h1>
<p>Gains: ${escape(content.gains.name ?? 'unnamed')}. Seed ${content.seed}, Gustbench ${VERSION}. ${results.length - failed.length} of ${results.length} trials within their bands.</p>
<p class="warning">A simulated pass is not clearance to fly. Local aviation rules and licensed practice come first.</p>
${content.notes === '' ? '' : `<p>${escape(content.notes)}</p>`}
<table><thead><tr><th>trial</th><th>score</th><th>value</th>${baseline === undefined ? '' : '<th>baseline</th><th>difference</th>'}<th>band</th><th></th><th>source of the band</th></tr></thead><tbody>${rows.join('')}</tbody></table>
<h2>To repeat</h2><pre>${escape(JSON.stringify(repeat, null, 1))}</pre></body></html>
`;
}

function scoreRow(
  result: TrialResult,
  score: Score,
  before: Score | null,
  first: boolean,
  compared: boolean,
): string {
  const difference = before?.value == null || score.value === null ? '—' : shown(score.value - before.value);
  const cells = [
    first ? `${escape(result.title)}${result.stopped === null ? '' : ` (${escape(result.stopped)})`}` : '',
    escape(score.name),
    `${shown(score.value)} ${escape(score.unit)}`,
    ...(compared ? [shown(before?.value ?? null), difference] : []),
    escape(bandText(score.band, score.unit)),
    score.pass ? 'within' : '<span class="out">OUTSIDE</span>',
    escape(score.source),
  ];
  return `<tr>${cells.map((cell) => `<td>${cell}</td>`).join('')}</tr>`;
}

function escape(text: string): string {
  return text.replace(/&/g, '&amp;').replace(/</g, '&lt;').replace(/>/g, '&gt;');
}
