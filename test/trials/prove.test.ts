/** `prove` from the shell: exit codes, the same bytes on any number of workers, sweeps that go on, one-line errors. */
import { spawnSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { root } from '../../src/cli/setup.mjs';

const FILES = ['--build', 'scenes/sandpiper.build.json', '--gains', 'scenes/sandpiper.gains.json'];
let folder = '';
beforeAll(() => {
  folder = mkdtempSync(path.join(tmpdir(), 'gustbench-prove-'));
});
afterAll(() => rmSync(folder, { recursive: true, force: true }));

function prove(...args: string[]) {
  const done = spawnSync(process.execPath, ['src/cli/launch.mjs', 'prove', ...args], {
    cwd: root,
    encoding: 'utf8',
  });
  return { code: done.status, out: done.stdout, err: done.stderr };
}

function file(name: string, content?: unknown): string {
  const place = path.join(folder, name);
  if (content !== undefined) writeFileSync(place, JSON.stringify(content));
  return place;
}

const sweep = {
  format: 'gustbench.sweep/1',
  trial: 'rate-step-yaw-large',
  x: { path: 'gains.axes.yaw.p_us_per_dps', from: 1, to: 6, count: 3 },
};

describe('prove', () => {
  it('exits 0 within all bands and 1 outside one, the same bytes for one and two workers', () => {
    const trials = ['--trial', 'rate-step-roll-small', 'hover-noise', '--json', '--seed', '4'];
    const one = prove(...FILES, ...trials, '--workers', '1');
    const two = prove(...FILES, ...trials, '--workers', '2');
    expect([one.code, two.code]).toEqual([0, 0]);
    expect(two.out).toBe(one.out);
    const bands = { 'hover-noise': { 'motor activity': { most: 1 } } };
    const run = file('run.json', { format: 'gustbench.run/1', trials: ['hover-noise'], bands });
    const outside = prove(...FILES, '--run', run, '--json', '--workers', '1');
    expect(outside.code).toBe(1);
    expect(JSON.parse(outside.out)).toMatchObject({
      pass: false,
      trials: [{ trial: 'hover-noise', pass: false }],
    });
  }, 60_000);

  it('its report is a run description: flown from that alone, the same scores', () => {
    const html = file('report.html');
    const args = ['--trial', 'rate-step-yaw-large', '--seed', '8', '--json', '--workers', '1'];
    const first = prove(...FILES, ...args, '--html', html);
    const page = readFileSync(html, 'utf8');
    const block = page.slice(page.lastIndexOf('<pre>') + 5, page.lastIndexOf('</pre>'));
    const text = block
      .replace(/&lt;/g, '<')
      .replace(/&gt;/g, '>')
      .replace(/&quot;/g, '"')
      .replace(/&amp;/g, '&');
    const again = prove('--run', file('again.json', JSON.parse(text)), '--json', '--workers', '1');
    expect(again.out).toBe(first.out);
  }, 60_000);

  it('a sweep goes on from the cells that are there', () => {
    const whole = prove(...FILES, '--sweep', file('sweep.json', sweep), '--json', '--workers', '1');
    const cells = file('cells.json');
    prove(...FILES, '--sweep', file('sweep.json'), '--cells', cells, '--workers', '1');
    const kept = JSON.parse(readFileSync(cells, 'utf8')) as { cells: unknown[] };
    expect(kept.cells).toHaveLength(3);
    writeFileSync(cells, JSON.stringify({ ...kept, cells: kept.cells.slice(0, 1) }));
    const resumed = prove(
      ...FILES,
      '--sweep',
      file('sweep.json'),
      '--cells',
      cells,
      '--json',
      '--workers',
      '1',
    );
    expect(resumed.out).toBe(whole.out);
    const wren = ['--build', 'scenes/wren.build.json', '--gains', 'scenes/wren.gains.json'];
    const foreign = prove(...wren, '--sweep', file('sweep.json'), '--cells', cells);
    expect(foreign.code).toBe(2);
    expect(foreign.err).toMatch(/cells of another sweep/);
  }, 60_000);

  it('a spread prints its interval, what matters and the worst sample', () => {
    const { out } = prove(
      ...FILES,
      '--trial',
      'rate-step-yaw-large',
      '--spread',
      '4',
      '--json',
      '--workers',
      '1',
    );
    const [one] = (JSON.parse(out) as { spreads: Record<string, unknown>[] }).spreads;
    expect(one).toMatchObject({ trial: 'rate-step-yaw-large', flown: 4, lost: 0 });
    expect(one.worst).toHaveProperty('overrides');
  }, 60_000);

  it.each([
    [['--trial', 'gust'], /gust-front/],
    [['--workers', '0'], /--workers: "?0"?; allowed: a whole number from 1 to 64/],
    [['--spread', '2'], /from 3 to 10000/],
    [['--cells', 'x.json'], /only with a sweep/],
    [['--sweep', 'nowhere.json'], /nowhere\.json/],
    [['--run', 'scenes/sandpiper.gains.json'], /gustbench\.run\/1/],
  ])(
    '%j is bad input: exit 2, one line, nothing on standard output',
    (args, message) => {
      const { code, out, err } = prove(...FILES, ...args);
      expect(code).toBe(2);
      expect(out).toBe('');
      expect(err.trim().split('\n')).toHaveLength(1);
      expect(err).toMatch(message);
    },
    60_000,
  );

  it.each([
    [{ ...sweep, x: { ...sweep.x, path: 'gains.axes.yaw.p' } }, /p_us_per_dps/],
    [
      {
        ...sweep,
        x: { ...sweep.x, count: 1000 },
        y: { ...sweep.x, path: 'build.airframe.mass_kg', count: 1000 },
      },
      /1000000 cells.*at most 40000/,
    ],
  ])(
    'a sweep that cannot be (%#) is refused before the first flight',
    (bad, message) => {
      const { code, err } = prove(...FILES, '--sweep', file('bad.json', bad));
      expect(code).toBe(2);
      expect(err).toMatch(message);
    },
    60_000,
  );

  it('without a build says so; --list needs none', () => {
    expect(prove('--gains', 'scenes/sandpiper.gains.json').err).toMatch(
      /--build: missing; allowed: a build file/,
    );
    expect(prove('--list').out).toMatch(/gust-front/);
  }, 60_000);
});
