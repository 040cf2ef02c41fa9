import { execFileSync } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { root } from '../../src/cli/setup.mjs';
import { accessibilityFaults, describeInBrowser } from './harness.ts';

let folder = '';
beforeAll(() => {
  folder = mkdtempSync(path.join(tmpdir(), 'gustbench-page-'));
});
afterAll(() => rmSync(folder, { recursive: true, force: true }));

describeInBrowser('Measure and Match', (site) => {
  test('a swing test typed in gives inertia with its interval, is accepted and undone', async () => {
    const opened = await site.open({ at: '#/measure' });
    const { page } = opened;
    await page.getByRole('tab', { name: 'Swing test' }).click();
    await page.getByText(/Check string, knots and hooks/).waitFor();
    // I = m g D² T²/(16 π² L): 1.35 kg, 0.3 m, 1.2 m, T = 1.48 s gives 0.0138 kg m² (closed form).
    await page.locator('.measure-timings input').fill('29.6 29.5 29.7 29.62');
    await page.getByRole('button', { name: 'Work out the inertia' }).click();
    const row = page.locator('.measure-found tr', { hasText: 'inertia xx' });
    await row.waitFor({ timeout: 30_000 });
    const inertia = Number(await row.locator('b').innerText());
    expect(inertia).toBeGreaterThan(0.0134);
    expect(inertia).toBeLessThan(0.0142);
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('measure-swing');
    await page.getByRole('button', { name: 'Accept into the build' }).click();
    await page.getByRole('tab', { name: 'Numbers of the build' }).click();
    const field = page.getByLabel('Inertia roll');
    await expect.poll(async () => Number(await field.inputValue())).toBeCloseTo(inertia, 3);
    await page.keyboard.press('Escape');
    await page.getByRole('button', { name: /^Undo/ }).click();
    await expect.poll(() => field.inputValue()).toBe('0.0152');
    await opened.close();
  }, 120_000);

  test('a thrust stand’s CSV becomes coefficients; junk is refused and nothing is lost', async () => {
    const stand = path.join(folder, 'stand.csv');
    writeFileSync(
      stand,
      'rpm,Thrust (g),Torque (N·m)\n2200,50,0.010\n3200,110,0.021\n4200,190,0.035\n5200,290,0.052\n6150,410,0.073\n',
    );
    const junk = path.join(folder, 'junk.csv');
    writeFileSync(junk, Buffer.from([0, 1, 2, 3, 255, 0, 17]));
    const opened = await site.open({ at: '#/measure', width: 1024, height: 768, theme: 'dark' });
    const { page } = opened;
    await page.getByRole('tab', { name: 'Thrust stand' }).click();
    await page.locator('.measure input[type="file"]').setInputFiles(stand);
    await page.locator('.measure-found tr', { hasText: 'thrust coefficient' }).waitFor({ timeout: 30_000 });
    await opened.shot('measure-stand-dark');
    await page.locator('.measure input[type="file"]').setInputFiles(junk);
    await page.getByText(/junk\.csv/).waitFor();
    expect(await page.locator('.measure-found tr', { hasText: 'thrust coefficient' }).count()).toBe(1);
    await opened.close();
  }, 120_000);

  test('a log of the bench gives three axes, is accepted; a text that is no log is refused', async () => {
    const rows = ['t_s,roll,pitch,yaw,throttle'];
    for (let k = 0; k <= 1500; k++) {
      const t = k / 50;
      const tones = (list: number[], phase: number) =>
        list.reduce((sum, f, i) => sum + Math.sin(2 * Math.PI * f * t + phase * (i + 1)), 0) / list.length;
      rows.push(
        [
          t.toFixed(3),
          (0.35 * tones([0.4, 0.9, 1.7, 2.9, 4.3], 1)).toFixed(4),
          (0.35 * tones([0.5, 1.1, 1.9, 3.1, 4.7], 2)).toFixed(4),
          (0.5 * tones([0.3, 0.7, 1.3, 2.3], 3)).toFixed(4),
          '0.5',
        ].join(','),
      );
    }
    const sticks = path.join(folder, 'sticks.csv');
    writeFileSync(sticks, rows.join('\n'));
    const log = path.join(folder, 'log.csv');
    execFileSync(
      process.execPath,
      [
        'src/cli/launch.mjs',
        'fly',
        '--build',
        'scenes/sandpiper.build.json',
        '--gains',
        'scenes/sandpiper.gains.json',
        '--hover',
        '--sticks',
        sticks,
        '--duration',
        '30',
        '--out',
        log,
      ],
      { cwd: root, stdio: 'pipe' },
    );
    const opened = await site.open({ at: '#/match' });
    const { page } = opened;
    const picker = page.locator('.match input[type="file"]');
    await picker.setInputFiles({
      name: 'poem.csv',
      mimeType: 'text/csv',
      buffer: Buffer.from('roses are red\nviolets are blue\n'),
    });
    await page
      .getByText(/poem\.csv/)
      .first()
      .waitFor();
    await picker.setInputFiles(log);
    await page.locator('.match-table', { hasText: 'roll' }).waitFor({ timeout: 120_000 });
    expect(await page.locator('.match-table').first().innerText()).toMatch(/roll\s+\d+/);
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('match');
    await page.getByRole('button', { name: 'Accept the corrected build' }).click();
    await page.getByText('The build is corrected').waitFor();
    await opened.close();
  }, 240_000);
});
