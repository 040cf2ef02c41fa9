import type { Page } from 'playwright-core';
import { expect, test } from 'vitest';
import { areaIn } from '../../src/app/plots/frame.ts';
import { accessibilityFaults, describeInBrowser } from './harness.ts';

const FLOWN_MS = 120_000;

async function field(page: Page, label: string, value: string): Promise<void> {
  const input = page.getByRole('textbox', { name: label, exact: true }).first();
  await input.fill(value);
  await input.press('Enter');
}

/** Pixels by which a part of the place is wider than its room. */
function sideways(page: Page): Promise<number> {
  return page.evaluate(() =>
    Math.max(
      ...[...document.querySelectorAll('.shape, .shape-side, .shape-plots')].map(
        (part) => part.scrollWidth - part.clientWidth,
      ),
    ),
  );
}

describeInBrowser('Shape', (site) => {
  test('P, then I, then D: each stage is flown, a row is taken, undo brings the old gains back', async () => {
    const opened = await site.open({ at: '#/shape', width: 1440, height: 900 });
    const { page } = opened;
    await page.getByText('By hand: P, then I, then D, flown').click();
    const p = page.getByRole('textbox', { name: 'P', exact: true }).first();
    const before = await p.inputValue();
    await page.getByRole('button', { name: 'Fly P', exact: true }).click();
    const rows = page.locator('.shape-walk tbody tr');
    await rows.first().waitFor({ timeout: FLOWN_MS });
    expect(await rows.count()).toBe(4);
    const label = (await rows.nth(2).locator('th').innerText()).replace('P ', '');
    await rows.nth(2).getByRole('button', { name: 'Take, on to I' }).click();
    await page.locator('.shape-walk tbody th', { hasText: /^I / }).first().waitFor({ timeout: FLOWN_MS });
    expect(Number(await p.inputValue())).toBeCloseTo(Number(label), 6);
    await rows.nth(1).getByRole('button', { name: 'Take, on to D' }).click();
    await page.locator('.shape-walk tbody th', { hasText: /^D / }).first().waitFor({ timeout: FLOWN_MS });
    await page.locator('.shape-walk').scrollIntoViewIfNeeded();
    expect(await sideways(page)).toBeLessThanOrEqual(0);
    await opened.shot('shape-walk');
    expect(await accessibilityFaults(page)).toEqual([]);
    for (let k = 0; k < 2; k++) await page.getByRole('button', { name: 'Undo' }).click();
    await expect.poll(() => p.inputValue()).toBe(before);
    await opened.close();
  });

  test('the flight is laid over the lines and agrees; another gain takes it off again', async () => {
    const opened = await site.open({ at: '#/shape', width: 1440, height: 900 });
    const { page } = opened;
    await page.getByRole('button', { name: 'Check against the flight' }).click();
    await page
      .getByText(/the flight agrees with the linear model within 0\.\d+ dB/)
      .waitFor({ timeout: FLOWN_MS });
    await page.getByText('Coherence of the flown check').first().waitFor();
    await opened.shot('shape-flown');
    expect(await accessibilityFaults(page)).toEqual([]);
    await field(page, 'P', '1.2');
    await expect.poll(() => page.getByText(/the flight agrees/).count()).toBe(0);
    await page.getByRole('combobox', { name: 'Trimmed' }).selectOption('forward');
    await page.getByText(/The check flies a hover/).waitFor();
    await opened.close();
  });

  test('further measures come, with both loops closed too; yaw says why it has none', async () => {
    const opened = await site.open({ at: '#/shape', width: 1024, height: 768, theme: 'dark' });
    const { page } = opened;
    const cell = (name: string) =>
      page
        .locator('.shape-measures tr', { has: page.locator(`th:text-is("${name}")`) })
        .locator('td')
        .first();
    await expect
      .poll(async () => Number(await cell('bandwidth').innerText()), { timeout: 20_000 })
      .toBeGreaterThan(1);
    expect(Number(await cell('self-levelling: phase margin').innerText())).toBeGreaterThan(20);
    expect(Number(await cell('heat by noise, a motor').innerText())).toBeGreaterThan(0);
    expect(await sideways(page)).toBeLessThanOrEqual(0);
    await opened.shot('shape-top-dark');
    await page.locator('.shape-measures').scrollIntoViewIfNeeded();
    await opened.shot('shape-measures-dark');
    await page.getByRole('tab', { name: 'yaw' }).click();
    await expect.poll(() => cell('self-levelling: rise').innerText(), { timeout: 20_000 }).toBe('—');
    await page.getByText(/yaw keeps its rate/).waitFor();
    await opened.close();
  });

  test('a quieter limit on the motors lowers the proposed gains, and is kept', async () => {
    const opened = await site.open({ at: '#/shape', width: 1440, height: 900 });
    const { page } = opened;
    const propose = async (): Promise<number> => {
      await page.getByRole('button', { name: 'Propose starting gains' }).click();
      const line = page.locator('p.small', { hasText: /^Starting gains: P/ });
      await line.waitFor({ timeout: FLOWN_MS });
      return Number(await line.locator('b').first().innerText());
    };
    const first = await propose();
    await page.getByText('Limits they must keep').click();
    await field(page, 'Noise at motors', '0.4');
    await page.locator('p.small', { hasText: /^Starting gains: P/ }).waitFor({ state: 'detached' });
    expect(await propose()).toBeLessThan(0.9 * first);
    await page
      .getByText(/limited by .*noise at the motors/)
      .first()
      .waitFor();
    await opened.shot('shape-limits');
    await page.waitForTimeout(800);
    await page.reload();
    await page.getByText('Limits they must keep').click();
    expect(await page.getByRole('textbox', { name: 'Noise at motors', exact: true }).inputValue()).toBe(
      '0.4',
    );
    await opened.close();
  });

  test('my own convention: constants there and back, typed in its units, a time without P says why', async () => {
    const opened = await site.open({ at: '#/shape', width: 1440, height: 900 });
    const { page } = opened;
    await page.getByText('Firmware units', { exact: true }).click();
    await page.getByRole('combobox', { name: 'Convention' }).selectOption('own');
    await page.getByRole('combobox', { name: 'Rate in' }).selectOption('rad/s');
    await page.getByRole('combobox', { name: 'Output in' }).selectOption('share');
    await page.getByRole('combobox', { name: 'I written as' }).selectOption('time');
    await field(page, 'P stored ×', '1000');
    const constants = page.locator('.shape-constants');
    const inUnits = constants.getByRole('textbox', { name: 'P', exact: true });
    // 1.4 µs per deg/s is 1.4 · 57.29578 / 1000 of the span per rad/s, stored a thousand times that.
    expect(Number(await inUnits.inputValue())).toBeCloseTo(1.4 * (180 / Math.PI), 2);
    await inUnits.fill('100');
    await inUnits.press('Enter');
    const own = page.getByRole('textbox', { name: 'P', exact: true }).first();
    await expect.poll(async () => Number(await own.inputValue())).toBeCloseTo(100 / (180 / Math.PI), 4);
    expect(Number(await inUnits.inputValue())).toBe(100);
    expect(await sideways(page)).toBeLessThanOrEqual(0);
    await opened.shot('shape-own');
    await page.getByText(/Found in simulation: no clearance/).scrollIntoViewIfNeeded();
    await opened.shot('shape-own-foot');
    expect(await accessibilityFaults(page)).toEqual([]);
    await field(page, 'P', '0');
    await page.getByText(/an integral time needs P above 0/).waitFor();
    await opened.close();
  });

  test('the point of the map moves by hand and by keys; another point is flown', async () => {
    const opened = await site.open({ at: '#/shape', width: 1440, height: 900 });
    const { page } = opened;
    const map = page.locator('.shape-map canvas').first();
    await map.scrollIntoViewIfNeeded();
    const box = await map.boundingBox();
    if (box === null) throw new Error('no map');
    const p = page.getByRole('textbox', { name: 'P', exact: true }).first();
    const area = areaIn(box.width, box.height);
    // The map spans four times the saved gains: the point stands at a quarter of it.
    const at = (x: number, y: number): [number, number] => [
      box.x + area.left + x * area.width,
      box.y + area.top + (1 - y) * area.height,
    ];
    await page.mouse.move(...at(0.25, 0.25));
    await page.mouse.down();
    await page.mouse.move(...at(0.4, 0.25), { steps: 5 });
    await page.mouse.up();
    await expect.poll(async () => Number(await p.inputValue())).toBeCloseTo(1.6 * 1.4, 1);
    const dragged = Number(await p.inputValue());
    await page.locator('.shape-map [role=slider]').focus();
    await page.keyboard.press('ArrowRight');
    await expect.poll(async () => Number(await p.inputValue())).toBeGreaterThan(dragged);
    await opened.shot('shape-map');
    await page.mouse.click(box.x + 0.3 * box.width, box.y + 0.6 * box.height);
    await page.waitForSelector('.fly-read');
    expect(page.url()).toContain('#/fly');
    await opened.close();
  });
});
