/** Run descriptions and the report: what is needed to repeat a run is in it, and repeats it. */
import { describe, expect, it } from 'vitest';
import { InputError } from '../../src/craft/problem.ts';
import { inPlaceWorker } from '../../src/trials/pool.ts';
import { answerTask } from '../../src/trials/protocol.ts';
import { bandText, reportHtml, scoreText, type ReportContent } from '../../src/trials/report.ts';
import { parseRun, PLAIN_RUN, runTasksOf, sweepOf } from '../../src/trials/runDescription.ts';
import { runTrial } from '../../src/trials/runTrial.ts';
import { parseSweep } from '../../src/trials/sweep.ts';
import { runSweep, SweepCells } from '../../src/trials/sweepResult.ts';
import {
  latinHypercube,
  spreadSchema,
  spreadsOf,
  spreadTasks,
  summariseSpread,
} from '../../src/trials/uncertainty.ts';
import { demo } from './demo.ts';

const { build, gains } = demo('sandpiper');
const subject = { build, gains, wind: null, seed: 6 };
const raw = {
  format: 'gustbench.run/1',
  trials: ['rate-step-yaw-large', 'doublet-roll-small'],
  seed: 6,
  overrides: { 'build.airframe.mass_kg': 1.4 },
  bands: { 'doublet-roll-small': { 'rms rate error': { most: 1 } } },
  notes: 'After <b>new</b> propellers & a "heavier" pack',
};

function contentOf(extra: Partial<ReportContent> = {}): ReportContent {
  const run = parseRun(raw);
  const { overrides, bands, notes } = run;
  return { ...subject, results: runTasksOf(run, subject).map(runTrial), overrides, bands, notes, ...extra };
}

/** The run description that stands in the report. */
function repeatOf(html: string): unknown {
  const block = html.slice(html.lastIndexOf('<pre>') + 5, html.lastIndexOf('</pre>'));
  const text = block
    .replace(/&lt;/g, '<')
    .replace(/&gt;/g, '>')
    .replace(/&quot;/g, '"')
    .replace(/&amp;/g, '&');
  return JSON.parse(text);
}

describe('run descriptions', () => {
  it('a plain one runs every trial on nothing changed', () => {
    expect(PLAIN_RUN.trials.length).toBeGreaterThan(25);
    expect(runTasksOf(PLAIN_RUN, subject)).toHaveLength(PLAIN_RUN.trials.length);
  });

  it.each([
    [{ ...raw, trials: ['gust'] }, /gust-front/],
    [{ ...raw, trials: 'all' }, /list of names/],
    [{ ...raw, speed: 1 }, /no field of this name/],
    [{ ...raw, seed: 1.5 }, /whole number/],
    [{ ...raw, bands: { 'gust-front': { tilt: { most: 2 } } } }, /one of peak tilt/],
    [{ ...raw, bands: { 'gust-front': { 'peak tilt': { most: 2, least: 3 } } } }, /at most 2/],
    [{ ...raw, spread: { trials: ['no'] } }, /gust-front/],
    [{ ...raw, spread: { samples: 1 } }, /from 3 to 10000/],
    [{ ...raw, spread: { shares: { weight: 1 } } }, /no field of this name/],
    [{ ...raw, build: { format: 'gustbench.build/1' } }, /./],
    [{ ...raw, format: 'gustbench.run/2' }, /gustbench\.run\/1/],
    [null, /a run description/],
  ])('%# is refused', (bad, message) => {
    expect(() => parseRun(bad)).toThrow(InputError);
    expect(() => parseRun(bad)).toThrow(message);
  });

  it('an override that leads nowhere in one of its trials is refused before the first flight', () => {
    const run = parseRun({
      ...raw,
      overrides: { 'trial.peak_mps': 3 },
      trials: ['gust-front', 'hover-noise'],
    });
    expect(() => runTasksOf(run, subject)).toThrow(/trial\.peak_mps/);
  });

  it('a sweep inside takes the run’s overrides and bands', () => {
    const run = parseRun(raw);
    const x = { path: 'gains.axes.roll.p_us_per_dps', from: 1, to: 2, count: 2 };
    const sweep = sweepOf(
      run,
      { format: 'gustbench.sweep/1', trial: 'doublet-roll-small', x },
      subject,
      'run',
    );
    expect(sweep.overrides).toEqual(raw.overrides);
    expect(sweep.bands).toEqual(raw.bands['doublet-roll-small']);
  });
});

describe('the report', () => {
  const content = contentOf();
  const html = reportHtml(content);

  it('is one page with nothing from elsewhere and no script, and what was typed in stays text', () => {
    expect(html).toMatch(/^<!doctype html>/);
    expect(html).not.toMatch(/<script|<link|src=|href=|https?:/i);
    expect(html).toContain('After &lt;b&gt;new&lt;/b&gt; propellers &amp; a &quot;heavier&quot; pack');
  });

  it('says that a simulated pass is no clearance to fly, and what a first hover asks for', () => {
    expect(html).toMatch(/no clearance to fly/);
    expect(html).toMatch(
      /Propellers off.*restrained.*clear area.*eye protection.*kill switch.*aviation rules/s,
    );
  });

  it('shows every score with its band, use and source, and what is outside', () => {
    for (const result of content.results) {
      for (const score of result.scores) {
        expect(html).toContain(scoreText(score).replace('<', '&lt;'));
        expect(html).toContain(bandText(score.band, score.unit));
      }
    }
    expect(html).toContain('OUTSIDE');
    expect(html).toContain('set by the user');
    expect(html).toContain('build.airframe.mass_kg = 1.4');
  });

  it('holds everything needed to repeat it: flown from the page alone, the same bytes', () => {
    const run = parseRun(repeatOf(html));
    if (run.build === null || run.gains === null || run.seed === null)
      throw new Error('not all is in the report');
    const again = { build: run.build, gains: run.gains, wind: run.wind, seed: run.seed };
    expect(JSON.stringify(runTasksOf(run, again).map(runTrial))).toBe(JSON.stringify(content.results));
    expect(run.notes).toBe(raw.notes);
  });

  it('with a baseline shows it and the difference', () => {
    const stiff = {
      ...gains,
      name: 'old set',
      axes: { ...gains.axes, yaw: { ...gains.axes.yaw, p_us_per_dps: 2 } },
    };
    const results = runTasksOf(parseRun(raw), { ...subject, gains: stiff }).map(runTrial);
    const compared = reportHtml(contentOf({ baseline: { gains: stiff, results } }));
    expect(compared).toContain('difference');
    expect(compared).toContain('compared with old set');
    const [now, before] = [content.results[0].scores[0].value ?? NaN, results[0].scores[0].value ?? NaN];
    expect(compared).toContain(`${now > before ? '+' : '−'}${Number(Math.abs(now - before).toPrecision(3))}`);
    expect(parseRun(repeatOf(compared)).baseline?.name).toBe('old set');
  });

  it('draws a sweep over two numbers and lists one over one', async () => {
    const x = { path: 'gains.axes.yaw.p_us_per_dps', from: 1, to: 6, count: 3 };
    const flown = async (extra: object) => {
      const kept = new SweepCells(
        parseSweep({ format: 'gustbench.sweep/1', trial: 'doublet-yaw-small', x, ...extra }, subject),
        { build, gains },
      );
      await runSweep(kept, inPlaceWorker, 1).done;
      return reportHtml(contentOf({ results: [], sweep: kept }));
    };
    const map = await flown({ y: { path: 'gains.axes.yaw.i_us_per_deg', from: 0, to: 20, count: 2 } });
    expect(map.match(/<svg/g)).toHaveLength(2);
    expect(map.match(/<rect/g)?.length).toBe(12);
    expect(map).toContain('6 of 6 cells');
    const line = await flown({});
    expect(line).not.toContain('<svg');
    expect(line.match(/<tr><td class="n">/g)).toHaveLength(3);
  });

  it('shows a spread with its interval and the worst sample, and pilots’ ratings', () => {
    const request = { trials: ['rate-step-yaw-large'], samples: 4, shares: spreadSchema.parse({}) };
    const spreads = spreadsOf(request.shares);
    const factors = latinHypercube(spreads, 4, 1);
    const tasks = spreadTasks('rate-step-yaw-large', { build, gains }, spreads, factors, 1);
    const summary = summariseSpread(
      tasks,
      spreads,
      factors,
      tasks.map((task, id) => answerTask({ id, task })),
    );
    const activity = { rmsDeflection: 0.2, rmsSpeed_per_s: 1.5, reversals_per_s: 0.7 };
    const rated = {
      set: 'B',
      seed: 3,
      rating: 4,
      note: 'twitchy',
      activity,
      scores: [{ name: 'peak tilt', unit: 'deg', value: 12 }],
    } as const;
    const page = reportHtml(
      contentOf({ results: [], spread: { request, summaries: [summary] }, ratings: [rated] }),
    );
    expect(page).toMatch(/of 4 samples fell outside a band \(95 % interval/);
    expect(page).toContain('Worst sample');
    expect(page).toContain('twitchy');
    expect(page).toContain('Cooper–Harper');
    expect(parseRun(repeatOf(page)).spread).toEqual(request);
  });
});

it.each([
  [{}, 's', 'open'],
  [{ most: 3 }, 'deg', '≤ 3 deg'],
  [{ least: 1, most: 2.5 }, '%', '≥ 1, ≤ 2.5 %'],
])('a band %o reads', (band, unit, text) => expect(bandText(band, unit)).toBe(text));
