import { expect, test } from 'vitest';
import { accessibilityFaults, describeInBrowser } from './harness.ts';

describeInBrowser('Shape and Prove', (site) => {
  test('Shape: margins follow a gain, starting gains come, the map fills', async () => {
    const opened = await site.open({ at: '#/shape' });
    const { page } = opened;
    const margin = () =>
      page.locator('.shape-margins div', { hasText: 'phase margin' }).locator('b').innerText();
    await page.waitForSelector('.shape-margins');
    const before = await margin();
    const field = page
      .getByRole('textbox', { name: 'P', exact: true })
      .or(page.getByRole('spinbutton', { name: 'P', exact: true }))
      .first();
    await field.fill('2.8');
    await field.press('Enter');
    await expect.poll(margin).not.toBe(before);
    await page.keyboard.press('Control+KeyZ');
    await page.getByRole('button', { name: 'Propose starting gains' }).click();
    await page.getByText(/roll: limited by/).waitFor({ timeout: 60_000 });
    await page.getByRole('button', { name: 'Put them in B' }).click();
    await expect.poll(() => page.locator('.shape-margins').innerText()).toMatch(/B \d/);
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('shape-ab');
    await opened.close();
  }, 120_000);

  test('Shape at 1024×768 in the dark', async () => {
    const opened = await site.open({ at: '#/shape', width: 1024, height: 768, theme: 'dark' });
    await opened.page.waitForSelector('.shape-margins');
    await opened.page.waitForTimeout(1200);
    await opened.shot('shape-dark-1024');
    await opened.close();
  }, 60_000);

  test('Prove: one trial runs in a worker, opens to its scores and is kept over a reload', async () => {
    const opened = await site.open({ at: '#/prove' });
    const { page } = opened;
    await page.waitForSelector('.prove');
    await page.getByRole('button', { name: /^Run Gust from the front/ }).click();
    await page.getByRole('button', { name: 'Gust from the front', exact: true }).click();
    await page.locator('.prove-scores').waitFor({ timeout: 30_000 });
    expect(await page.locator('.prove-scores').innerText()).toMatch(/tilt/);
    await page.waitForSelector('.save-state[data-kind="saved"]');
    await page.reload();
    await expect.poll(() => page.getByText(/1 of 1 trials within/).count()).toBe(1);
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('prove');
    await opened.close();
  }, 120_000);

  test('Prove: the map of D shows each layer in its own unit', async () => {
    const opened = await site.open({ at: '#/prove' });
    const { page } = opened;
    await page.getByRole('button', { name: 'Fill the map' }).click();
    const map = page.getByLabel(/D against its cutoff: /).first();
    await map.waitFor();
    const unitUnderPointer = async () => {
      await map.hover({ position: { x: 300, y: 150 } });
      return (await page.locator('.prove').innerText())
        .match(/(?:gust excursion|motor activity)[^\n]*\d[^\n]*/g)
        ?.join();
    };
    await expect.poll(unitUnderPointer, { timeout: 60_000 }).toMatch(/motor activity.* µs rms/);
    await page.getByLabel('Layer').selectOption('excursion');
    await expect
      .poll(unitUnderPointer, { timeout: 60_000 })
      .toMatch(/gust excursion \(peak rate\) [\d.]+ deg\/s(?! rms)/);
    await map.scrollIntoViewIfNeeded();
    await opened.shot('prove-map');
    await opened.close();
  }, 180_000);
});
