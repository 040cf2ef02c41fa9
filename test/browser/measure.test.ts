import { mkdtempSync, rmSync, truncateSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import type { Page } from 'playwright-core';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { RandomStream } from '../../src/math/random.ts';
import { accessibilityFaults, describeInBrowser } from './harness.ts';

/** A speed that goes from 3000 to 6000 rev/min and back with 45 and 70 ms of lag, in closed form; 1 kHz. */
function spinupCsv(): string {
  const lines = ['t_s,rpm'];
  for (let i = 0; i < 2000; i++) {
    const t = i / 1000;
    const up = 6000 - 3000 * Math.exp(-Math.max(0, t - 0.4) / 0.045);
    const speed = t < 0.4 ? 3000 : t < 1.2 ? up : 3000 + 3000 * Math.exp(-(t - 1.2) / 0.07);
    lines.push(`${t.toFixed(3)},${(speed + 15 * Math.sin(41 * i * i)).toFixed(1)}`);
  }
  return `${lines.join('\n')}\n`;
}

/** Noise, a line at 70 Hz and its second at 140 Hz, as of two blades at 4200 rev/min; 500 Hz, 60 s. */
function stillCsv(): string {
  const lines = ['t_s,gyro_roll_dps,gyro_pitch_dps,gyro_yaw_dps'];
  const random = new RandomStream(5, 'still');
  for (let i = 0; i < 30_000; i++) {
    const t = i / 500;
    const line = 0.8 * Math.sin(2 * Math.PI * 70 * t) + 0.4 * Math.sin(2 * Math.PI * 140 * t);
    lines.push(
      [t, ...[1, 1, 1].map(() => line + 0.1 * random.gaussian())].map((v) => v.toFixed(4)).join(','),
    );
  }
  return `${lines.join('\n')}\n`;
}

let folder = '';
const file = (name: string) => path.join(folder, name);

/** C_T 0.11 and 0.05 of C_P by n² and D⁵, 10 inches, sea level; row 9's thrust is misread. Heads say nothing. */
function standCsv(): string {
  const D = 0.254;
  const lines = ['a,b,c'];
  for (let row = 1; row <= 24; row++) {
    const n = (2000 + 250 * row) / 60;
    const noise = 1 + 0.004 * Math.sin(7 * row);
    const thrust_N = 0.11 * 1.225 * n * n * D ** 4 * noise * (row === 9 ? 1.3 : 1);
    const torque_Nm = (0.05 / (2 * Math.PI)) * 1.225 * n * n * D ** 5 * noise;
    lines.push([n * 60, thrust_N / 0.00980665, torque_Nm * 1000].map((value) => value.toFixed(3)).join(','));
  }
  return `${lines.join('\n')}\n`;
}

beforeAll(() => {
  folder = mkdtempSync(path.join(tmpdir(), 'gustbench-measure-'));
  writeFileSync(file('stand.csv'), standCsv());
  writeFileSync(file('spinup.csv'), spinupCsv());
  writeFileSync(file('still.csv'), stillCsv());
  writeFileSync(file('junk.csv'), Buffer.from([0x50, 0x4b, 0, 0, 1, 2, 3, 255, 0, 17]));
  // Sparse: no room on the disk.
  writeFileSync(file('huge.csv'), 'rpm,thrust (g)\n');
  truncateSync(file('huge.csv'), 700_000_000);
});
afterAll(() => rmSync(folder, { recursive: true, force: true }));

const tab = (page: Page, name: string) => page.getByRole('tab', { name, exact: true }).click();

async function type(page: Page, label: string, value: string, at = 0): Promise<void> {
  const field = page.getByRole('textbox', { name: label, exact: true }).nth(at);
  await field.fill(value);
  await field.press('Enter');
}

const built = async (page: Page, label: string): Promise<number> => {
  await tab(page, 'Numbers of the build');
  return Number(await page.getByLabel(label).inputValue());
};

describeInBrowser('Measure', (site) => {
  test('arms and turns are set for all four corners at once, or for one', async () => {
    const opened = await site.open({ at: '#/measure' });
    const { page } = opened;
    await tab(page, 'Numbers of the build');
    const at = (name: string) => page.getByRole('textbox', { name, exact: true });
    const turns = (name: string) => page.getByRole('combobox', { name, exact: true });
    await at('FL forward').fill('0.2');
    await at('FL forward').press('Enter');
    await expect.poll(() => at('RR forward').inputValue()).toBe('−0.2');
    expect(await at('FR forward').inputValue()).toBe('0.2');
    await turns('FL turns').selectOption('ccw');
    await expect.poll(() => turns('RR turns').inputValue()).toBe('ccw');
    expect(await turns('FR turns').inputValue()).toBe('cw');
    await page.getByText('Mirrored: one edit moves all four').click();
    await at('RR forward').fill('-0.19');
    await at('RR forward').press('Enter');
    await expect.poll(() => at('RR forward').inputValue()).toBe('−0.19');
    expect(await at('RL forward').inputValue()).toBe('−0.2');
    await at('FL forward').scrollIntoViewIfNeeded();
    await opened.shot('measure-rotors');
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.close();
  }, 60_000);

  test('two scales give mass and centre, accepted with what is known, and Undo takes all of it back', async () => {
    const opened = await site.open({ at: '#/measure' });
    const { page } = opened;
    const before = await built(page, 'All-up mass');
    await tab(page, 'Balance');
    await page.getByText('Nothing weighed yet').waitFor();
    await page
      .getByText(/propellers off/i)
      .first()
      .waitFor();
    await type(page, 'Reading, nose', '0.9');
    await type(page, 'Reading, tail', '0.7');
    // 0.15 m · (0.9 − 0.7) / 1.6 by hand.
    const row = page.getByRole('row', { name: /centre of mass forward/ });
    expect(await row.locator('td').first().innerText()).toMatch(/^0\.01875/);
    expect(await row.locator('td').nth(1).innerText()).toMatch(/^± 0\.000\d/);
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('measure-balance');
    await page.getByRole('button', { name: 'Accept into the build' }).click();
    await page.getByText(/Undo takes it back/).waitFor();
    expect(await built(page, 'All-up mass')).toBeCloseTo(1.6, 6);
    await page.keyboard.press('Escape');
    await page.getByRole('button', { name: /^Undo/ }).click();
    // One step: build and what is known of it go back together.
    await expect.poll(() => built(page, 'All-up mass')).toBeCloseTo(before, 6);
    // A misread balance point is refused by name.
    await tab(page, 'Balance');
    await page.getByLabel('How').selectOption('edge-x');
    await page.getByLabel(/^Balance points/).fill('12 x4');
    await page.getByText(/positions_m.*at least one balance point/).waitFor();
    await page.getByLabel(/^Balance points/).fill('12 14 13');
    await page
      .getByRole('row', { name: /centre of mass forward/ })
      .getByText('0.013')
      .waitFor();
    await opened.close();
  }, 120_000);

  test('parts give the inertia by the parallel-axis rule and stay when one comes back', async () => {
    const opened = await site.open({ at: '#/measure', width: 1024, height: 768, theme: 'dark' });
    const { page } = opened;
    await tab(page, 'Parts');
    await page.getByText('No parts yet.').waitFor();
    for (const [i, y] of [0.2, -0.2].entries()) {
      await page.getByRole('button', { name: 'Add a part' }).click();
      await page.getByLabel('Shape').nth(i).selectOption('point');
      await type(page, 'Mass', '0.5', i);
      await type(page, 'Middle right, y', String(y), i);
      await type(page, 'Middle forward, x', String(y), i);
    }
    await page.getByRole('button', { name: 'Add a part' }).click();
    // Two points at 0.2 m: 2 · 0.5 · 0.04 about x; the box adds m (b² + c²)/12 of 0.1 kg, 0.05 and 0.03 m.
    const xx = 0.04 + (0.1 * (0.05 ** 2 + 0.03 ** 2)) / 12;
    const row = page.getByRole('row', { name: /^inertia xx/ });
    expect(Number((await row.locator('td b').innerText()).replace('−', '-'))).toBeCloseTo(xx, 4);
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('measure-parts-dark');
    await page.getByLabel('Shape').nth(2).selectOption('cylinder');
    await page.getByLabel('Cylinder along').selectOption('x');
    await tab(page, 'Balance');
    await tab(page, 'Parts');
    expect(await page.getByLabel('Cylinder along').inputValue()).toBe('x');
    await page
      .getByRole('button', { name: /^Remove/ })
      .last()
      .click();
    expect(await page.getByRole('button', { name: /^Remove/ }).count()).toBe(2);
    await opened.close();
  }, 120_000);

  test('a stand file whose heads say nothing is mapped by hand and kept; huge files and junk are refused', async () => {
    const opened = await site.open({ at: '#/measure' });
    const { page } = opened;
    const drop = (name: string) => page.locator('.measure input[type="file"]').setInputFiles(file(name));
    await tab(page, 'Thrust stand');
    await drop('stand.csv');
    await page.getByText(/stand\.csv: speed: missing; allowed: a column of rotor speed/).waitFor();
    await page.getByLabel('column: rotor speed').selectOption('a');
    await page.getByLabel('column: thrust').selectOption('b');
    await page.getByLabel('column: torque').selectOption('c');
    await page.getByLabel('unit: torque').selectOption('mN·m');
    // Newtons would make a C_T of 11: refused, and what is shown can be mended.
    await page.getByLabel('unit: thrust').selectOption('N');
    const again = page.getByRole('button', { name: 'Work it out with these columns' });
    await again.click();
    await page
      .getByText(/reads like g, not N/)
      .first()
      .waitFor();
    await page.getByLabel('unit: thrust').selectOption('g');
    await again.click();
    const row = page.getByRole('row', { name: /^thrust coefficient/ });
    await row.waitFor();
    await expect.poll(async () => Number(await row.locator('td b').innerText())).toBeCloseTo(0.11, 2);
    await page.getByText(/stand\.csv, row 9:/).waitFor();
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('measure-stand');
    // Nothing of a huge file is read; what was there stays.
    await drop('huge.csv');
    await page.getByText('huge.csv: 700 MB; allowed: up to 20 MB here').waitFor();
    await drop('junk.csv');
    await page.getByText(/junk\.csv.*binary data/).waitFor();
    expect(await row.count()).toBe(1);
    await page.getByRole('button', { name: 'Accept into the build' }).click();
    await page.getByText(/Undo takes it back/).waitFor();
    // The same heads again: as corrected.
    await tab(page, 'Spin-up');
    await tab(page, 'Thrust stand');
    await drop('stand.csv');
    await page.getByText('As corrected for the last file with these heads.').waitFor();
    await row.waitFor();
    expect(await built(page, 'Thrust coefficient')).toBeCloseTo(0.11, 2);
    await page.keyboard.press('Escape');
    await page.getByRole('button', { name: /^Undo/ }).click();
    await opened.close();
  }, 120_000);

  test('a spin-up is drawn with its fit, a gyro record with spectrum and Allan deviation', async () => {
    const opened = await site.open({ at: '#/measure', width: 1024, height: 768, theme: 'dark' });
    const { page } = opened;
    const drop = (name: string) => page.locator('.measure input[type="file"]').setInputFiles(file(name));
    await tab(page, 'Spin-up');
    await drop('spinup.csv');
    const lag = page.getByRole('row', { name: /^lag / }).first();
    await lag.waitFor();
    await expect.poll(async () => Number(await lag.locator('td b').innerText())).toBeCloseTo(0.045, 2);
    await page.getByText('Speed over time, spinup.csv').first().waitFor();
    await opened.shot('measure-spinup-dark');
    await tab(page, 'Gyro at rest and idle');
    await drop('still.csv');
    await page.getByText('Allan deviation', { exact: true }).first().waitFor();
    await page.getByText('Gyro noise density, turns of the rotor marked').first().waitFor();
    expect(await accessibilityFaults(page)).toEqual([]);
    await page.locator('.measure figure').first().scrollIntoViewIfNeeded();
    await opened.shot('measure-still-dark');
    expect(await page.locator('.measure').innerText()).not.toMatch(/NaN/);
    await opened.close();
  }, 100_000);
});
