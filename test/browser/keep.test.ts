import { expect, test } from 'vitest';
import type { Page } from 'playwright-core';
import { RandomStream } from '../../src/math/random.ts';
import { describeInBrowser } from './harness.ts';
import { killPage, KillRounds } from './killRounds.ts';

/** The full thousand, and kills of the whole browser: npm run bench -- keep. */
const ROUNDS = 8;

async function renameCraft(page: Page, name: string): Promise<void> {
  await page.keyboard.press('Alt+KeyW');
  await page.getByLabel('Rename').fill(name);
  await page.getByLabel('Rename').press('Enter');
}

const craftName = (page: Page) => page.locator('#top-craft option:checked').textContent();

describeInBrowser('Kept work', (site) => {
  test('what was acknowledged as saved survives the page’s death, whenever it comes', async () => {
    const context = await site.newContext();
    const rounds = new KillRounds(site.url, new RandomStream(20, 'kills'), 'Sandpiper');
    for (let n = 0; n < ROUNDS; n++) await rounds.round(context, killPage);
    const last = await context.newPage();
    await last.goto(site.url);
    await last.waitForSelector('.frame');
    await rounds.look(last);
    const { edits, acknowledged, losses } = rounds.tally;
    console.log(`${ROUNDS} kills, ${acknowledged} of ${edits} edits acknowledged before a kill`);
    expect(losses).toEqual([]);
    expect(acknowledged).toBeGreaterThan(0);
    await context.close();
  });

  test('a change is acknowledged within 300 ms', async () => {
    const opened = await site.open({ at: '#/carry' });
    const { page } = opened;
    await page.waitForSelector('.save-state[data-kind="saved"]');
    const took_ms = await page.evaluate(async () => {
      const select = document.querySelector<HTMLSelectElement>('#top-craft');
      const state = document.querySelector('.save-state');
      if (select === null || state === null) throw new Error('no frame');
      const begun = performance.now();
      select.value = select.options[1].value;
      select.dispatchEvent(new Event('change', { bubbles: true }));
      await new Promise((resolve) => requestAnimationFrame(resolve));
      if (state.getAttribute('data-kind') !== 'pending') throw new Error('the change was not noticed');
      while (state.getAttribute('data-kind') !== 'saved')
        await new Promise((resolve) => setTimeout(resolve, 2));
      return performance.now() - begun;
    });
    console.log(`saved after ${took_ms.toFixed(0)} ms`);
    // 300 ms on a free machine; the bound leaves room for a busy one.
    expect(took_ms).toBeLessThan(3000);
    await opened.close();
  });

  test('without a store the page works, says so and offers an export', async () => {
    const context = await site.newContext();
    await context.addInitScript(() => {
      Object.defineProperty(window, 'indexedDB', { value: undefined });
    });
    const opened = await site.open({ at: '#/carry', context });
    await opened.page.locator('.notice', { hasText: 'not kept' }).waitFor();
    expect(await opened.page.locator('.save-state').getAttribute('data-kind')).toBe('off');
    const [download] = await Promise.all([
      opened.page.waitForEvent('download'),
      opened.page.getByRole('button', { name: 'Export an archive' }).click(),
    ]);
    expect(download.suggestedFilename()).toMatch(/^gustbench-\d{4}-\d\d-\d\d\.zip$/);
    await opened.close();
    await context.close();
  });

  test('a full disk is said plainly, and the work is written once there is room', async () => {
    const context = await site.newContext();
    await context.addInitScript(() => {
      const put = IDBObjectStore.prototype.put;
      Object.assign(window, { full: false });
      IDBObjectStore.prototype.put = function (...rest: Parameters<typeof put>) {
        if ((window as unknown as { full: boolean }).full)
          throw new DOMException('no room', 'QuotaExceededError');
        return put.apply(this, rest);
      };
    });
    const opened = await site.open({ at: '#/carry', context });
    const { page } = opened;
    const setFull = (full: boolean) => page.evaluate((on) => void Object.assign(window, { full: on }), full);
    await page.waitForSelector('.save-state[data-kind="saved"]');
    await setFull(true);
    await renameCraft(page, 'Heron');
    await page.keyboard.press('Escape');
    await page.locator('.notice.error', { hasText: 'no room left' }).waitFor();
    expect(await page.locator('.save-state').getAttribute('data-kind')).toBe('failed');
    expect(await craftName(page)).toBe('Heron');
    await opened.shot('shell-full-disk');
    await setFull(false);
    await page.waitForSelector('.save-state[data-kind="saved"]');
    expect(await page.locator('.notice.error').count()).toBe(0);
    await page.reload();
    await page.waitForSelector('.frame');
    expect(await craftName(page)).toBe('Heron');
    await opened.close();
    await context.close();
  });
});
