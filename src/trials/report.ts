/** Results as one self-contained HTML page, with everything needed to repeat them. */
import type { Build } from '../craft/build.ts';
import type { Gains } from '../craft/gains.ts';
import type { Wind } from '../craft/wind.ts';
import { VERSION } from '../flight/record.ts';
import type { Overrides } from './overrides.ts';
import type { RatedFlight } from './rating.ts';
import { sweepHtml } from './reportMap.ts';
import { RUN_FORMAT, type SpreadRequest } from './runDescription.ts';
import type { SweepCells } from './sweepResult.ts';
import type { Bands } from './bands.ts';
import type { Band, Score, TrialResult } from './trial.ts';
import { bandUse, type SpreadSummary } from './uncertainty.ts';

export interface ReportContent {
  readonly build: Build;
  readonly gains: Gains;
  readonly results: readonly TrialResult[];
  /** Another gain set's results, to compare with. */
  readonly baseline?: { readonly gains: Gains; readonly results: readonly TrialResult[] };
  readonly notes: string;
  readonly seed: number;
  /** Wind in place of the trials' own. */
  readonly wind?: Wind | null;
  readonly overrides?: Overrides;
  readonly bands?: Readonly<Record<string, Bands>>;
  readonly sweep?: SweepCells | null;
  readonly spread?: { readonly request: SpreadRequest; readonly summaries: readonly SpreadSummary[] } | null;
  readonly ratings?: readonly RatedFlight[];
}

export const CLEARANCE =
  'A simulated pass is no clearance to fly. The model holds only what was measured and typed in. Propellers off for every check on the bench; first hover restrained or low, in a clear area, with eye protection and a kill switch at hand; care with charged packs. Local aviation rules and the judgement of a licensed, experienced pilot come first.';

/** "≥ 1, ≤ 3 s"; "open" without limits. */
export function bandText(band: Band, unit: string): string {
  const parts: string[] = [];
  if (band.least !== undefined) parts.push(`≥ ${short(band.least, 4)}`);
  if (band.most !== undefined) parts.push(`≤ ${short(band.most, 4)}`);
  return parts.length === 0 ? 'open' : `${parts.join(', ')} ${unit}`.trimEnd();
}

/** Value with its unit, or why there is none. */
export function scoreText(score: Score): string {
  if (!score.applies) return 'does not apply';
  return score.value === null ? 'not reached' : `${short(score.value)} ${score.unit}`.trimEnd();
}

function short(value: number, digits = 3): string {
  return String(Number(value.toPrecision(digits)));
}

/** Everything needed to repeat it, as a run description (`prove --run`). */
export function repeatDescription(content: ReportContent): object {
  const { build, gains, baseline, wind, seed, notes, spread } = content;
  const sweep = sameSubject(content) ? content.sweep : null;
  return {
    format: RUN_FORMAT,
    version: VERSION,
    trials: content.results.map((result) => result.trial),
    seed,
    overrides: content.overrides ?? {},
    bands: content.bands ?? {},
    notes,
    ...(wind === undefined || wind === null ? {} : { wind }),
    build,
    gains,
    ...(baseline === undefined ? {} : { baseline: baseline.gains }),
    ...(sweep === undefined || sweep === null ? {} : { sweep: sweep.sweep }),
    ...(spread === undefined || spread === null ? {} : { spread: spread.request }),
  };
}

/** A sweep of other gains stands in the report, but not in the description: it would be another map there. */
function sameSubject({ sweep, build, gains, wind }: ReportContent): boolean {
  if (sweep === undefined || sweep === null) return false;
  const { subject } = sweep;
  const key = (one: readonly unknown[]): string => JSON.stringify(one);
  return key([subject.build, subject.gains, subject.wind ?? null]) === key([build, gains, wind ?? null]);
}

export function reportHtml(content: ReportContent): string {
  const { build, gains, results, baseline, notes, seed } = content;
  const within = results.filter((result) => result.pass).length;
  const about = [
    `Gains: ${gains.name ?? 'unnamed'}`,
    ...(baseline === undefined ? [] : [`compared with ${baseline.gains.name ?? 'unnamed'}`]),
    `seed ${seed}`,
    `Gustbench ${VERSION}`,
    ...(content.wind == null ? [] : [`wind: ${content.wind.name ?? 'given'}, in place of the trials’ own`]),
    ...Object.entries(content.overrides ?? {}).map(([path, value]) => `${path} = ${value}`),
  ];
  return [
    `<!doctype html><html lang="en"><head><meta charset="utf-8"><meta name="viewport" content="width=device-width">`,
    `<title>Trials: ${escape(build.name)}</title><style>${STYLE}</style></head><body>`,
    `<h1>Trials: ${escape(build.name)}</h1><p>${escape(about.join('; '))}.</p>`,
    results.length === 0
      ? ''
      : `<p><strong>${within} of ${results.length} trials within their bands.</strong></p>`,
    `<p class="warning">${escape(CLEARANCE)}</p>`,
    notes === '' ? '' : `<h2>Notes</h2><p class="notes">${escape(notes)}</p>`,
    results.length === 0 ? '' : resultsTable(results, baseline?.results ?? null),
    content.sweep == null ? '' : `<h2>Sweep</h2>${sweepHtml(content.sweep, escape)}`,
    content.spread == null ? '' : content.spread.summaries.map(spreadPart).join(''),
    content.ratings === undefined || content.ratings.length === 0 ? '' : ratingsPart(content.ratings),
    `<h2>To repeat</h2><p>Save this as a file and give it to <code>gustbench prove --run FILE</code>; the same seed gives the same numbers.</p>`,
    `<pre>${escape(JSON.stringify(repeatDescription(content), null, 1))}</pre></body></html>\n`,
  ].join('');
}

const STYLE = `
body{font:14px/1.45 system-ui,sans-serif;max-width:1040px;margin:24px auto;padding:0 16px;color:#1b2427;background:#fff;font-variant-numeric:tabular-nums}
table{border-collapse:collapse;width:100%;margin:8px 0 20px}th,td{text-align:left;padding:2px 10px 2px 0;border-bottom:1px solid #d6d2c6;vertical-align:top}
td.n,th.n{text-align:right}tr.first td{border-top:2px solid #8b8778}.out{font-weight:700;color:#a33e00}.faint{color:#5d6668}
.warning{border:2px solid #a33e00;padding:6px 10px}.notes{white-space:pre-wrap}pre{white-space:pre-wrap;overflow-wrap:anywhere;font-size:11px;border:1px solid #d6d2c6;padding:8px}
svg text{font:11px system-ui,sans-serif;fill:#1b2427}@media print{body{margin:0;max-width:none}tr{break-inside:avoid}}`;

function resultsTable(results: readonly TrialResult[], before: readonly TrialResult[] | null): string {
  const rows = results.flatMap((result) => {
    const other = before?.find((one) => one.trial === result.trial) ?? null;
    return result.scores.map((score, i) => {
      const earlier = other?.scores.find((one) => one.name === score.name) ?? null;
      return scoreRow(result, score, i === 0, before === null ? null : { earlier });
    });
  });
  const compared = before === null ? '' : '<th class="n">baseline</th><th class="n">difference</th>';
  return `<h2>Scores</h2><table><thead><tr><th>trial</th><th>score</th><th class="n">value</th>${compared}<th>band</th><th>use of the band</th><th></th><th>source of the band</th></tr></thead><tbody>${rows.join('')}</tbody></table>`;
}

function scoreRow(
  result: TrialResult,
  score: Score,
  first: boolean,
  compared: { earlier: Score | null } | null,
): string {
  const why = result.stopped ?? result.note;
  const parameters = Object.entries(result.parameters).map(([name, value]) => `${name} ${value}`);
  const heading = first
    ? `${escape(result.title)}${why === null ? '' : ` <span class="out">${escape(why)}</span>`}<br><span class="faint">${escape(parameters.join(', '))}</span>`
    : '';
  const earlier = compared?.earlier ?? null;
  const difference =
    earlier?.value == null || score.value === null ? '—' : signed(score.value - earlier.value);
  const comparison =
    compared === null
      ? ''
      : `<td class="n">${earlier === null ? '—' : escape(scoreText(earlier))}</td><td class="n">${difference}</td>`;
  return `<tr${first ? ' class="first"' : ''}><td>${heading}</td><td>${escape(score.name)}</td><td class="n">${escape(scoreText(score))}</td>${comparison}<td>${escape(bandText(score.band, score.unit))}</td><td>${useBar(score)}</td><td>${score.pass ? 'within' : '<span class="out">OUTSIDE</span>'}</td><td class="faint">${escape(score.source)}</td></tr>`;
}

function signed(value: number): string {
  return `${value > 0 ? '+' : value < 0 ? '−' : '±'}${short(Math.abs(value))}`;
}

/** A bar up to the limit, with the limit as a mark at two thirds of the width. */
function useBar(score: Score): string {
  const use = score.applies ? bandUse(score.value, score.band) : null;
  if (use === null) return '';
  const width = 60 * Math.min(1.5, use);
  const colour = score.pass ? '#0072b2' : '#d55e00';
  const label = Number.isFinite(use) ? `${Math.round(100 * use)} %` : 'not reached';
  return `<svg width="92" height="10" role="img" aria-label="${label} of the band"><rect y="2" width="${width.toFixed(1)}" height="6" fill="${colour}"/><path d="M60 0V10" stroke="#1b2427"/></svg>`;
}

function spreadPart(spread: SpreadSummary): string {
  const { failures } = spread;
  const percent = (share: number) => `${(100 * share).toFixed(1)} %`;
  const rows = spread.matters.map(
    (one) => `<tr><td>${escape(one.name)}</td><td class="n">${one.correlation.toFixed(2)}</td></tr>`,
  );
  const worst = spread.worst;
  const replay =
    worst === null
      ? ''
      : `<p>Worst sample: ${escape(
          Object.entries(worst.factors)
            .map(([name, factor]) => `${name} × ${factor.toFixed(3)}`)
            .join(', '),
        )}. Flown again from seed ${worst.seed} with:</p><pre>${escape(JSON.stringify(worst.overrides))}</pre>`;
  return `<h2>Spread: ${escape(spread.trial)}</h2><p>${percent(failures.share)} of ${spread.flown} samples fell outside a band (95 % interval ${percent(failures.low)} to ${percent(failures.high)}, Wilson 1927)${spread.lost > 0 ? `; ${spread.lost} samples could not be flown` : ''}.</p><table><thead><tr><th>not known well</th><th class="n">rank correlation with the hardest used band</th></tr></thead><tbody>${rows.join('')}</tbody></table>${replay}`;
}

function ratingsPart(ratings: readonly RatedFlight[]): string {
  const rows = ratings.map((one) => {
    const { rmsDeflection, rmsSpeed_per_s, reversals_per_s } = one.activity;
    const scores = one.scores.map((score) => `${score.name} ${short(score.value)} ${score.unit}`).join(', ');
    return `<tr><td>${escape(one.set)}</td><td class="n">${one.rating}</td><td>${escape(one.note)}</td><td class="n">${short(rmsDeflection)}</td><td class="n">${short(rmsSpeed_per_s)}</td><td class="n">${short(reversals_per_s)}</td><td>${escape(scores)}</td></tr>`;
  });
  return `<h2>Pilot’s ratings</h2><p>Cooper–Harper scale (NASA TN D-5153); 1 is best.</p><table><thead><tr><th>set</th><th class="n">rating</th><th>note</th><th class="n">stick rms</th><th class="n">stick speed, 1/s</th><th class="n">reversals, 1/s</th><th>scores</th></tr></thead><tbody>${rows.join('')}</tbody></table>`;
}

function escape(text: string): string {
  return text.replace(/&/g, '&amp;').replace(/</g, '&lt;').replace(/>/g, '&gt;').replace(/"/g, '&quot;');
}
