import { describe, expect, test } from 'vitest';
import { assembleSheet, QUANTITY_NAMES, SHEET_TRIALS, type SheetInput } from '../../src/carrying/assemble.ts';
import { NO_CLEARANCE, sheetHtml } from '../../src/carrying/sheet.ts';
import { GUST_STEPS_MPS, windFlights, windProof, windTask } from '../../src/carrying/windLimit.ts';
import { windSentences } from '../../src/carrying/windWords.ts';
import { CONVENTIONS } from '../../src/shaping/conventions.ts';
import { TRIALS } from '../../src/trials/registry.ts';
import { runTrial } from '../../src/trials/runTrial.ts';
import { demoBuild, demoGains, longest, madeResult } from './made.ts';

const build = demoBuild();
const gains = demoGains();
const flights = windFlights(1);
const nameOf = (flight: (typeof flights)[number]) =>
  flight.kind === 'gust' ? `gust-${flight.side}` : flight.trial;

/** A proof in which those flights fail that `fails` picks. */
const proofWhere = (fails: (flight: (typeof flights)[number]) => boolean) =>
  windProof(
    flights,
    flights.map((flight) => madeResult(nameOf(flight), !fails(flight), flight.seed)),
  );

function sheetOf(change: Partial<SheetInput> = {}): string {
  return sheetHtml(
    assembleSheet({
      build,
      gains,
      convention: CONVENTIONS[0],
      results: [],
      printedAt: '2026-01-02',
      ...change,
    }),
  );
}

describe('the wind limit', () => {
  test('is the greatest gust below the first failure from any side on any seed', () => {
    const proof = proofWhere(
      (f) =>
        f.kind === 'gust' &&
        ((f.peak_mps === 8 && f.side === 'rear' && f.seed === 3) || (f.peak_mps > 10 && f.side === 'left')),
    );
    expect(proof.gust.held_mps).toBe(6);
    expect(proof.gust.failure?.at).toBe('8 m/s');
    expect(proof.gust.failure?.what).toHaveLength(1);
    expect(proof.gust.failure?.what[0]).toMatch(/^from the rear: peak .* \(≤ 1/);
    expect(proof.gust.sides.find(({ side }) => side === 'rear')?.held).toEqual([3, 3, 3, 2, 3, 3, 3]);
    expect(windSentences(proof)[0]).toMatch(
      /held up to 6 m\/s \(13 mph\) from all four sides, 3 seeds \(1 to 3\); first failure at 8 m\/s: from the rear/,
    );
  });

  test.each([
    ['nothing fails', () => false, 14, /no failure up to 14 m\/s, the highest tried/],
    ['everything fails', () => true, null, /did not hold 2 m\/s, the least tried/],
  ])('%s', (_, fails, held, words) => {
    const proof = proofWhere(fails);
    expect(proof.gust.held_mps).toBe(held);
    expect(windSentences(proof)[0]).toMatch(words);
  });

  test('turbulence counts only when every seed held', () => {
    const proof = proofWhere((f) => f.kind === 'turbulence' && f.trial.endsWith('moderate') && f.seed === 4);
    expect(proof.turbulence.held).toBe('Turbulence, light');
    expect(proof.turbulence.failure).toMatchObject({ at: 'Turbulence, moderate' });
    expect(proof.turbulence.failure?.what[0]).toMatch(/^seed 4: /);
    expect(proof.turbulence.seeds).toEqual([1, 2, 3, 4, 5]);
  });

  test('a flight without an answer is a failure, and said', () => {
    const proof = windProof(
      flights,
      flights.map((f) => (f.kind === 'gust' && f.peak_mps === 4 ? null : madeResult(nameOf(f), true))),
    );
    expect(proof.gust.held_mps).toBe(2);
    expect(proof.missing).toBe(12);
    expect(windSentences(proof).join(' ')).toMatch(/first failure at 4 m\/s: from the front: no answer/);
  });

  test('a flown gust task is the trial with that peak: a stronger gust tilts more', () => {
    const tilt = [2, 10].map((peak_mps) => {
      const result = runTrial(windTask({ kind: 'gust', side: 'right', peak_mps, seed: 1 }, build, gains));
      expect(result.parameters.peak_mps).toBe(peak_mps);
      return result.scores.find(({ name }) => name === 'peak tilt')?.value ?? NaN;
    });
    expect(tilt[1]).toBeGreaterThan(3 * tilt[0]);
  });
});

describe('the pre-flight sheet', () => {
  test('says what was measured and how well, the margins, the gains, the caution', () => {
    const html = sheetOf({ known: { 'all-up mass': '± 0.2 %', nonsense: 'no' } });
    for (const name of QUANTITY_NAMES) expect(html).toContain(`<td>${name}</td>`);
    expect(html).toContain('<td>1.35 kg (2.976 lb) </td><td>± 0.2 %</td>');
    expect(html).not.toContain('nonsense');
    expect(html).toContain(NO_CLEARANCE);
    expect(html).toMatch(/Propellers off/);
    expect(html).toMatch(/Restrained hover/);
    expect(html).toMatch(/roll {2}p +1\.4 +us per deg\/s/);
    for (const title of ['Rate step', 'Rate after a gust', 'Loop gain', 'Sensitivity'])
      expect(html).toContain(title);
    expect(html).toContain('Pilot in charge');
    expect(html).toContain('No wind was flown for this sheet');
    expect(html).not.toMatch(/NaN|undefined|Infinity|\[object/);
  });

  test('is black, white and grey: nothing is told by colour', () => {
    const html = sheetOf({ results: SHEET_TRIALS.map((trial) => madeResult(trial, false)) });
    const colours = html.match(/#[0-9a-f]{3,6}\b/gi) ?? [];
    expect(colours.length).toBeGreaterThan(3);
    for (const colour of colours) expect(colour).toMatch(/^#(.)\1\1$/);
    expect(html).not.toMatch(/rgb\(|hsl\(|url\(|<script|<link/);
  });

  test('what is outside its band is always named; the rest is named where there is no row left', () => {
    const failing = TRIALS[TRIALS.length - 1].name;
    const results = TRIALS.map(({ name }) => madeResult(name, name !== failing));
    const content = assembleSheet({
      build,
      gains,
      convention: CONVENTIONS[0],
      results,
      printedAt: '2026-01-02',
    });
    expect(content.trials[0]).toMatchObject({ trial: TRIALS[TRIALS.length - 1].title, pass: false });
    const html = sheetHtml(content);
    for (const { title } of TRIALS) expect(html).toContain(title);
    const allOut = sheetOf({ results: TRIALS.map(({ name }) => madeResult(name, false)) });
    for (const { title } of TRIALS) expect(allOut).toContain(title);
    expect(allOut).toMatch(/Also OUTSIDE their bands/);
  });

  test('a trial with another parameter says so, an ended flight says why', () => {
    const gust = madeResult('gust-front', true);
    const html = sheetOf({
      results: [
        { ...gust, parameters: { ...gust.parameters, peak_mps: 9 } },
        { ...madeResult('hover-noise', false), stopped: 'ground at 2.00 s: <b>fell</b>' },
      ],
    });
    expect(html).toContain('Gust from the front (peak_mps 9)');
    expect(html).toContain('ended early: ground at 2.00 s: &lt;b&gt;fell&lt;/b&gt;');
  });

  test('names what was not tested', () => {
    expect(sheetOf()).toMatch(/Trials not run: .*Gust from the front/);
    expect(sheetOf({ wind: proofWhere(() => false) })).toContain(
      `Gusts above ${GUST_STEPS_MPS[GUST_STEPS_MPS.length - 1]} m/s.`,
    );
  });

  test('the same input gives the same bytes', () => {
    expect(sheetOf()).toBe(sheetOf());
  });

  test('gains that ring make a sheet with dashes and no plot of a growing line, never a crash', () => {
    const axes = Object.fromEntries(
      Object.entries(gains.axes).map(([axis, one]) => [axis, { ...one, p_us_per_dps: 60 }]),
    ) as typeof gains.axes;
    const html = sheetOf({ gains: { ...gains, axes } });
    expect(html).toContain('—');
    expect(html).not.toMatch(/NaN|undefined|Infinity/);
  });

  test('the longest names and filters stay within the sheet’s text', () => {
    const html = sheetOf({ ...longest() });
    expect(html).toContain('Wide name Wide name');
    expect(html).toContain('151.3 Hz (q 3.375)');
  });
});
