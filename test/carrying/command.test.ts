/** `carry` as a person meets it: the same sheet as the page's, and refusals in one line. */
import { spawnSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { root } from '../../src/cli/setup.mjs';

let folder = '';
beforeAll(() => {
  folder = mkdtempSync(path.join(tmpdir(), 'gustbench-carry-'));
});
afterAll(() => rmSync(folder, { recursive: true, force: true }));

function carry(...more: string[]) {
  const files = ['--build', 'scenes/wren.build.json', '--gains', 'scenes/wren.gains.json'];
  const out = path.join(folder, 'out');
  return spawnSync(
    process.execPath,
    ['src/cli/launch.mjs', 'carry', ...files, '--out', out, '--date', '2026-01-02', ...more],
    { cwd: root, encoding: 'utf8' },
  );
}

function known(content: unknown): string {
  const file = path.join(folder, 'known.json');
  writeFileSync(file, JSON.stringify(content));
  return file;
}

describe('carry', () => {
  it('flies the sheet’s trials, prints uncertainties, and tells what was flown', () => {
    const done = carry('--known', known({ 'all-up mass': '± 0.5 %' }), '--no-wind-limit', '--json');
    expect(done.status, done.stderr).toBe(0);
    expect(JSON.parse(done.stdout)).toMatchObject({ trialsRun: 12, wind: null });
    const sheet = readFileSync(path.join(folder, 'out', 'sheet.html'), 'utf8');
    expect(sheet).toContain('± 0.5 %');
    expect(sheet).toContain('Gust from the left');
    expect(sheet).toContain('No wind was flown for this sheet');
    expect(sheet).not.toMatch(/NaN|undefined/);
  }, 120_000);

  it.each([
    [{ mass: '1 %' }, /known\.json.*mass.*all-up mass/],
    [{ 'all-up mass': 3 }, /all-up mass.*a text of at most 60 characters/],
    [[1], /an object of quantity and text/],
  ])('refuses uncertainties that it cannot place: %j', (content, message) => {
    const done = carry('--known', known(content), '--no-trials');
    expect(done.status).toBe(2);
    expect(done.stderr.trim().split('\n')).toHaveLength(1);
    expect(done.stderr).toMatch(message);
  });
});
