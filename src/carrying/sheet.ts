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

export interface SheetScore {
  readonly trial: string;
  readonly score: string;
  readonly value: string;
  readonly band: string;
  readonly pass: boolean;
}

export interface SheetContent {
  readonly build: Build;
  readonly gains: Gains;
  readonly measured: readonly SheetQuantity[];
  /** Name of the gain convention and its constants, as lines of text. */
  readonly convention: string;
  readonly constants: readonly string[];
  readonly margins: readonly SheetMargins[];
  readonly scores: readonly SheetScore[];
  /** What wind was proven, in words, and on how many seeds; null when nothing was. */
  readonly windProven: string | null;
  readonly notTested: readonly string[];
  /** SVG texts. */
  readonly plots: readonly string[];
  readonly seed: number;
  readonly version: string;
  /** "2026-12-01 10:00", given by the caller so that the same input gives the same bytes. */
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
${head(sheet)}
${warning()}
<div class="columns">
<section><h2>Craft</h2>${cornerPlan(sheet.build)}${quantities(sheet.measured)}</section>
<section><h2>Gains</h2>${gainTable(sheet.gains)}${filters(sheet.gains)}<h3>Constants, ${escapeHtml(sheet.convention)}</h3><pre>${escapeHtml(sheet.constants.join('\n'))}</pre></section>
</div>
<section><h2>Margins</h2>${margins(sheet.margins)}</section>
${sheet.plots.length === 0 ? '' : `<section class="plots">${sheet.plots.join('')}</section>`}
<section><h2>Trials</h2>${scores(sheet.scores)}<p><b>Wind proven:</b> ${escapeHtml(sheet.windProven ?? 'none')}</p></section>
<section><h2>Not tested</h2>${list(sheet.notTested.length === 0 ? ['Everything that is not in the table above.'] : sheet.notTested)}</section>
<section><h2>First flight</h2><ol class="steps">${FIRST_FLIGHT_STEPS.map((step) => `<li><span class="box"></span>${escapeHtml(step)}</li>`).join('')}</ol></section>
${signatures()}
</main>
</body>
</html>
`;
}

function head(sheet: SheetContent): string {
  return `<header><h1>${escapeHtml(sheet.build.name)}</h1><p>Pre-flight sheet, ${escapeHtml(sheet.printedAt)}. Gains: ${escapeHtml(sheet.gains.name ?? 'unnamed')}. Seed ${sheet.seed}, Gustbench ${escapeHtml(sheet.version)}.</p></header>`;
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
  const at = (x: number, y: number) => [95 + y * scale, 85 - x * scale];
  const radius = Math.min(26, (build.propeller.diameter_m / 2) * scale);
  const rotors = build.rotors.map((rotor) => {
    const [cx, cy] = at(rotor.position_m[0], rotor.position_m[1]);
    return `<line x1="95" y1="85" x2="${cx}" y2="${cy}" class="s"/><circle cx="${cx}" cy="${cy}" r="${radius.toFixed(1)}" class="f"/><text x="${cx}" y="${cy - 1}" class="t" text-anchor="middle">${rotor.corner}</text><text x="${cx}" y="${cy + 10}" class="n" text-anchor="middle">${rotor.spin === 'cw' ? 'turns right' : 'turns left'}</text>`;
  });
  return `<svg viewBox="0 0 190 170" class="plan" role="img" aria-label="corners and turning sense, seen from above">${rotors.join('')}<path d="M95 68 l-6 12 h12 z"/><text x="95" y="12" class="n" text-anchor="middle">nose, seen from above</text></svg>`;
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
function scores(rows: readonly SheetScore[]): string {
  if (rows.length === 0) return '<p>No trial was run.</p>';
  const trials = [...new Set(rows.map((row) => row.trial))];
  return table(
    ['trial', 'scores (band)', ''],
    trials.map((trial) => {
      const own = rows.filter((row) => row.trial === trial);
      const text = own
        .map((row) => `${row.score} ${row.value} (${row.band})${row.pass ? '' : ' OUTSIDE'}`)
        .join(';  ');
      return [trial, text, own.every((row) => row.pass) ? 'within' : 'OUTSIDE'];
    }),
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

function table(heads: readonly string[], rows: readonly (readonly string[])[]): string {
  const cells = (tag: string, row: readonly string[]) =>
    row.map((cell) => `<${tag}>${escapeHtml(cell)}</${tag}>`).join('');
  return `<table><thead><tr>${cells('th', heads)}</tr></thead><tbody>${rows.map((row) => `<tr>${cells('td', row)}</tr>`).join('')}</tbody></table>`;
}

function list(items: readonly string[]): string {
  return `<ul>${items.map((item) => `<li>${escapeHtml(item)}</li>`).join('')}</ul>`;
}

function number(value: number): string {
  return Number.isFinite(value) ? String(Number(value.toPrecision(4))) : '—';
}

const STYLE = `
@page { size: A4; margin: 12mm }
* { box-sizing: border-box }
body { margin: 0; background: #fff; color: #000; font: 10px/1.35 system-ui, sans-serif; font-variant-numeric: tabular-nums }
main { max-width: 186mm; margin: 0 auto; padding: 4mm 0 }
h1 { font-size: 18px; margin: 0 } h2 { font-size: 12px; margin: 8px 0 3px; border-bottom: 1px solid #000 } h3 { font-size: 10px; margin: 6px 0 2px }
header p { margin: 1px 0 4px }
.warning { border: 2px solid #000; padding: 4px 6px; font-weight: 600; margin: 4px 0 }
.columns { display: grid; grid-template-columns: 1fr 1.25fr; gap: 8mm }
table { border-collapse: collapse; width: 100% } th, td { text-align: left; padding: 1px 5px 1px 0; border-bottom: 1px solid #bbb; vertical-align: top } th { font-weight: 600 }
ul, ol { margin: 3px 0; padding-left: 14px } pre { font: 9px/1.3 ui-monospace, monospace; border: 1px solid #bbb; padding: 3px 5px; margin: 2px 0; white-space: pre-wrap }
.steps { list-style: none; padding: 0 } .steps li { display: flex; gap: 6px; margin: 2px 0; break-inside: avoid } .box { flex: none; width: 9px; height: 9px; border: 1px solid #000; margin-top: 2px }
.plots { display: grid; grid-template-columns: repeat(3, 1fr); gap: 4mm; margin-top: 6px } .plots svg { width: 100% } .plan { width: 150px; display: block; margin: 2px auto }
svg .f { fill: none; stroke: #000; stroke-width: .8 } svg .g { stroke: #ddd; stroke-width: .5 } svg .l { stroke: #000; stroke-width: .6; stroke-dasharray: 2 2 } svg .s { fill: none; stroke: #000; stroke-width: 1.2 } svg .t { font: 600 10px system-ui, sans-serif } svg .n { font: 8px system-ui, sans-serif }
section { break-inside: avoid } .sign { display: grid; grid-template-columns: 1fr 1fr; gap: 6mm 10mm; margin-top: 8mm } .sign span { display: block; border-bottom: 1px solid #000; height: 8mm } .sign p { margin: 0 }
@media screen { body { background: #eee } main { background: #fff; padding: 12mm; margin: 8px auto; max-width: 210mm } }
`;
