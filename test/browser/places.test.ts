import { expect, test } from 'vitest';
import { accessibilityFaults, describeInBrowser } from './harness.ts';

describeInBrowser('Shape at a glance', (site) => {
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
});
