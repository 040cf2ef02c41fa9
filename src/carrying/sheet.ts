/**
 * The pre-flight sheet: one or two printed pages, black on white, self-contained HTML. It says what was
 * measured and how well, which gains in which units, what was proven and what was not, and walks through a
 * careful first flight. It never says that a craft may fly.
 */
import type { Build } from '../craft/build.ts';
import { AXES, type AxisName, type Gains } from '../craft/gains.ts';
import { escapeHtml } from './svgPlot.ts';

export interface SheetQuantity {
  readonly name: string;
  readonly value: string;
  readonly unit: string;
  /** "± 3 %", "not measured", "from parts, ± 15 %". */
  readonly known: string;
}

export interface SheetMargins {
  readonly axis: AxisName;
  readonly gainMargin_dB: number | null;
  readonly phaseMargin_deg: number | null;
  readonly delayMargin_ms: number | null;
  readonly crossover_Hz: number | null;
  readonly maxSensitivity: number | null;
  readonly noiseAtMotor_us_rms: number | null;
}

export interface SheetTrial {
  readonly trial: string;
  /** Scores with their bands; what is outside is said in the text itself. */
  readonly scores: string;
  readonly seed: number;
  readonly pass: boolean;
}

/** The wind that was shown to hold, in sentences, with the gust flights as a table. */
export interface SheetWind {
  readonly sentences: readonly string[];
  readonly steps: readonly string[];
  /** Per side: "3 of 3" at each step. */
  readonly sides: readonly { readonly side: string; readonly held: readonly string[] }[];
}

export interface SheetContent {
  readonly build: Build;
  readonly gains: Gains;
  readonly measured: readonly SheetQuantity[];
  /** Name of the gain convention and its constants, as lines of text. */
  readonly convention: string;
  readonly constants: readonly string[];
  readonly margins: readonly SheetMargins[];
  readonly trials: readonly SheetTrial[];
  /** Trials beyond what a page holds, in a sentence; empty when there are none. */
  readonly moreTrials: string;
  /** Null when no wind was flown for the sheet. */
  readonly wind: SheetWind | null;
  readonly notTested: readonly string[];
  /** SVG texts. */
  readonly plots: readonly string[];
  readonly version: string;
  /** "2026-12-01", given by the caller so that the same input gives the same bytes. */
  readonly printedAt: string;
}

export const NO_CLEARANCE =
  'A simulated pass is not clearance to fly. Local aviation rules and the judgement of a licensed or competent pilot come first.';

/** The careful first flight; common practice, no source. */
export const FIRST_FLIGHT_STEPS: readonly string[] = [
  'Propellers off. Check motor order and turning sense at each corner against the plan above; check that each stick moves the right pair of motors the right way.',
  'Propellers off. Tilt the craft by hand, armed at idle: the low side must speed up, the high side slow down.',
  'Kill switch: tried by the pilot, and by the helper if there is one. Fail-safe: transmitter off must stop the motors.',
  'Battery: charged, not swollen, strapped, leads clear of propellers; a fire-safe bag and place for charging and for a crashed pack.',
  'Clear area, no people or animals within the reach of a fly-away; eye protection on; helper behind the pilot.',
  'Propellers on, tight, right way round. Restrained hover first: tether or stand, half a metre, ten seconds. Stop at any growing oscillation.',
  'Feel the motors at once after landing: one hotter than the others, or all too hot to hold, is a stop.',
  'Free hover in calm air at two metres, then gentle doublets on each axis. Land with a third of the battery left.',
  'Save the log; lay it over the simulation before raising gains, speed or wind.',
];

/** The sheet as one HTML document. */
export function sheetHtml(sheet: SheetContent): string {
  return `<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta name="viewport" content="width=device-width, initial-scale=1">
<title>Pre-flight sheet: ${escapeHtml(sheet.build.name)}</title>
<style>${STYLE}</style>
</head>
<body>
<main>
<section class="page">
${head(sheet)}
${warning()}
<div class="columns">
<section><h2>Craft</h2>${cornerPlan(sheet.build)}${quantities(sheet.measured)}</section>
<section><h2>Gains</h2>${gainTable(sheet.gains)}${filters(sheet.gains)}<h3>Constants, ${escapeHtml(sheet.convention)}</h3><pre>${escapeHtml(sheet.constants.join('\n'))}</pre></section>
</div>
<section><h2>Margins</h2>${margins(sheet.margins)}</section>
${sheet.plots.length === 0 ? '' : `<section class="plots">${sheet.plots.join('')}</section>`}
</section>
<section class="page">
<section><h2>Trials</h2>${trials(sheet)}</section>
<section><h2>Wind limit proven in simulation</h2>${wind(sheet.wind)}</section>
<section><h2>Not tested</h2>${list(sheet.notTested)}</section>
<section><h2>First flight</h2><ol class="steps">${FIRST_FLIGHT_STEPS.map((step) => `<li><span class="box"></span>${escapeHtml(step)}</li>`).join('')}</ol></section>
${signatures()}
</section>
</main>
</body>
</html>
`;
}

function head(sheet: SheetContent): string {
  return `<header><h1>${escapeHtml(sheet.build.name)}</h1><p>Pre-flight sheet, ${escapeHtml(sheet.printedAt)}. Gains: ${escapeHtml(sheet.gains.name ?? 'unnamed')}. Gustbench ${escapeHtml(sheet.version)}.</p></header>`;
}

function warning(): string {
  return `<p class="warning">${escapeHtml(NO_CLEARANCE)}</p>`;
}

/** Corners by place on a plan, with the sense of turning; no numbers. */
function cornerPlan(build: Build): string {
  const reach = Math.max(
    ...build.rotors.map((rotor) => Math.max(Math.abs(rotor.position_m[0]), Math.abs(rotor.position_m[1]))),
  );
  const scale = 52 / reach;
  const at = (x: number, y: number) => [95 + y * scale, 84 - x * scale];
  const radius = Math.min(26, (build.propeller.diameter_m / 2) * scale);
  const arms = build.rotors.map((rotor) => {
    const [cx, cy] = at(rotor.position_m[0], rotor.position_m[1]);
    return `<line x1="95" y1="84" x2="${cx}" y2="${cy}" class="s"/>`;
  });
  const rotors = build.rotors.map((rotor) => {
    const [cx, cy] = at(rotor.position_m[0], rotor.position_m[1]);
    return `<circle cx="${cx}" cy="${cy}" r="${radius.toFixed(1)}" class="p"/><text x="${cx}" y="${cy - 1}" class="t" text-anchor="middle">${rotor.corner}</text><text x="${cx}" y="${cy + 10}" class="n" text-anchor="middle">${rotor.spin === 'cw' ? 'turns right' : 'turns left'}</text>`;
  });
  return `<svg viewBox="0 0 190 182" class="plan" role="img" aria-label="corners and turning sense, seen from above">${arms.join('')}${rotors.join('')}<path d="M95 66 l-6 12 h12 z"/><text x="95" y="178" class="n" text-anchor="middle">seen from above, the triangle is the nose</text></svg>`;
}

function quantities(rows: readonly SheetQuantity[]): string {
  return table(
    ['measured', 'value', 'known to'],
    rows.map((row) => [row.name, `${row.value} ${row.unit}`, row.known]),
  );
}

function gainTable(gains: Gains): string {
  return table(
    ['axis', 'P µs per deg/s', 'I µs per deg', 'D µs per deg/s²', 'feed-forward'],
    AXES.map((axis) => {
      const one = gains.axes[axis];
      return [
        axis,
        ...[one.p_us_per_dps, one.i_us_per_deg, one.d_us_per_dps2, one.feedforward_us_per_dps].map(number),
      ];
    }),
  );
}

function filters(gains: Gains): string {
  const hertz = (value: number) => (value === 0 ? 'none' : `${number(value)} Hz`);
  const notches = gains.notches.map((notch) => `${number(notch.centre_Hz)} Hz (q ${number(notch.q)})`);
  return list([
    `loop ${number(gains.loop_Hz)} Hz, compute delay ${number(gains.computeDelay_s * 1000)} ms`,
    `D low-pass ${hertz(gains.derivativeLowPass_Hz)}, on ${gains.derivativeOn}; gyro low-pass ${hertz(gains.gyroLowPass_Hz)}`,
    `notches ${notches.length === 0 ? 'none' : notches.join(', ')}`,
    `limits: integral ${number(gains.integralLimit_us)} µs, output ${number(gains.outputLimit_us)} µs`,
  ]);
}

function margins(rows: readonly SheetMargins[]): string {
  if (rows.length === 0) return '<p>Not computed.</p>';
  return table(
    [
      'axis',
      'gain margin dB',
      'phase margin deg',
      'delay margin ms',
      'crossover Hz',
      'Ms',
      'noise at motors µs rms',
    ],
    rows.map((row) => [
      row.axis,
      ...[
        row.gainMargin_dB,
        row.phaseMargin_deg,
        row.delayMargin_ms,
        row.crossover_Hz,
        row.maxSensitivity,
        row.noiseAtMotor_us_rms,
      ].map((value) => (value === null ? '—' : number(value))),
    ]),
  );
}

/** One row a trial; what is outside its band is marked where it stands. */
function trials({ trials: rows, moreTrials }: SheetContent): string {
  if (rows.length === 0) return '<p>No trial was run.</p>';
  const shown = rows.map((row) => [row.trial, row.scores, String(row.seed), row.pass ? 'within' : 'OUTSIDE']);
  const more = moreTrials === '' ? '' : `<p>${escapeHtml(moreTrials)}</p>`;
  return table(['trial', 'scores (band)', 'seed', ''], shown, 'trials') + more;
}

function wind(proven: SheetWind | null): string {
  if (proven === null) return '<p><b>None.</b> No wind was flown for this sheet.</p>';
  const sentences = proven.sentences.map((one) => `<p>${escapeHtml(one)}</p>`).join('');
  if (proven.sides.length === 0) return sentences;
  return (
    sentences +
    table(
      ['gust from, held of seeds', ...proven.steps],
      proven.sides.map(({ side, held }) => [side, ...held]),
      'wind',
    )
  );
}

function signatures(): string {
  const places = [
    'Built and measured by',
    'Gains checked by',
    'Pilot in charge',
    'Date and place of the first flight',
  ];
  return `<section class="sign">${places.map((place) => `<p><span></span>${place}</p>`).join('')}</section>`;
}

function table(heads: readonly string[], rows: readonly (readonly string[])[], kind = ''): string {
  const cells = (tag: string, row: readonly string[]) =>
    row.map((cell) => `<${tag}>${escapeHtml(cell)}</${tag}>`).join('');
  return `<table class="${kind}"><thead><tr>${cells('th', heads)}</tr></thead><tbody>${rows.map((row) => `<tr>${cells('td', row)}</tr>`).join('')}</tbody></table>`;
}

function list(items: readonly string[]): string {
  return `<ul>${items.map((item) => `<li>${escapeHtml(item)}</li>`).join('')}</ul>`;
}

function number(value: number): string {
  return Number.isFinite(value) ? String(Number(value.toPrecision(4))) : '—';
}

/** No paper size: the printer's own. Both A4 and US Letter hold 186 × 251 mm within these edges. */
const STYLE = `
@page { margin: 12mm }
* { box-sizing: border-box }
body { margin: 0; background: #fff; color: #000; font: 10px/1.3 system-ui, sans-serif; font-variant-numeric: tabular-nums; overflow-wrap: anywhere }
main { max-width: 186mm; margin: 0 auto }
.page + .page { break-before: page }
h1 { font-size: 18px; line-height: 1.15; margin: 0 } h2 { font-size: 12px; margin: 6px 0 2px; border-bottom: 1px solid #000 } h3 { font-size: 10px; margin: 5px 0 2px }
p { margin: 2px 0 } header p { margin: 1px 0 3px }
.warning { border: 2px solid #000; padding: 3px 6px; font-weight: 600; margin: 3px 0 }
.columns { display: grid; grid-template-columns: 1fr 1.4fr; gap: 6mm }
table { border-collapse: collapse; width: 100% } th, td { text-align: left; padding: 1px 5px 1px 0; border-bottom: 1px solid #999; vertical-align: top } th { font-weight: 600 } tr { break-inside: avoid }
.trials { font-size: 9px; line-height: 1.22 } .trials td:first-child { width: 30% } .trials th:nth-child(n + 3), .trials td:nth-child(n + 3) { white-space: nowrap; width: 1% } .wind { margin-top: 3px; font-size: 9px }
ul, ol { margin: 2px 0; padding-left: 14px } pre { font: 8.5px/1.3 ui-monospace, monospace; border: 1px solid #999; padding: 3px 5px; margin: 2px 0; white-space: pre-wrap }
.steps { list-style: none; padding: 0 } .steps li { display: flex; gap: 6px; margin: 2px 0; break-inside: avoid } .box { flex: none; width: 9px; height: 9px; border: 1px solid #000; margin-top: 2px }
.plots { display: grid; grid-template-columns: repeat(2, 1fr); gap: 2mm 5mm; margin-top: 4px } .plots svg { width: 100%; display: block } .plan { width: 132px; display: block; margin: 0 auto }
svg .p { fill: #fff; stroke: #000; stroke-width: .8 } svg .f { fill: none; stroke: #000; stroke-width: .8 } svg .g { stroke: #bbb; stroke-width: .5 } svg .l { stroke: #000; stroke-width: .6; stroke-dasharray: 2 2 } svg .s { fill: none; stroke: #000; stroke-width: 1.2 } svg .t { font: 600 10px system-ui, sans-serif } svg .n { font: 8.5px system-ui, sans-serif }
.sign { display: grid; grid-template-columns: 1fr 1fr; gap: 2mm 10mm; margin-top: 3mm; break-inside: avoid } .sign span { display: block; border-bottom: 1px solid #000; height: 8mm } .sign p { margin: 0 }
@media screen { body { background: #eee } main { max-width: 210mm } .page { background: #fff; padding: 12mm; margin: 8px auto } }
@media screen and (max-width: 640px) { .page { padding: 4mm } .columns, .plots { grid-template-columns: minmax(0, 1fr) } table { display: block; overflow-x: auto } }
`;
