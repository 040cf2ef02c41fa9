import { gzipSync } from 'node:zlib';
import { expect, test } from 'vitest';
import { describeInBrowser } from './harness.ts';

describeInBrowser('Offline and size', (site) => {
  test('after one visit the page opens with the network cut', async () => {
    const opened = await site.open({
      at: '#/measure',
      expectedErrors: /ERR_INTERNET_DISCONNECTED|Failed to fetch/,
    });
    const { page, context } = opened;
    await expect
      .poll(
        () => page.evaluate(async () => (await navigator.serviceWorker.getRegistration())?.active?.state),
        { timeout: 30_000 },
      )
      .toBe('activated');
    // The precache is complete once the worker is active.
    await expect.poll(() => page.evaluate(async () => (await caches.keys()).length)).toBeGreaterThan(0);
    await context.setOffline(true);
    await page.reload();
    await page.waitForSelector('.rail', { timeout: 30_000 });
    await page.keyboard.press('Alt+Digit3');
    await page.waitForSelector('.fly-read', { timeout: 30_000 });
    await context.setOffline(false);
    await opened.close();
  }, 90_000);

  test('first load stays within 350 kB of compressed script, the flight’s worker included', async () => {
    const page = await (await site.newContext({ serviceWorkers: 'block' })).newPage();
    const scripts = new Map<string, number>();
    page.on('response', (response) => {
      if (!/\.js(\?|$)/.test(response.url())) return;
      void response.body().then(
        (body) => scripts.set(response.url(), gzipSync(body).length),
        () => undefined,
      );
    });
    await page.goto(`${site.url}#/fly`);
    await page.waitForSelector('.fly-read');
    await page.waitForTimeout(1500);
    const total = [...scripts.values()].reduce((sum, bytes) => sum + bytes, 0);
    expect(scripts.size).toBeGreaterThan(1);
    expect(
      total / 1000,
      [...scripts].map(([url, bytes]) => `${url.split('/').at(-1)} ${bytes}`).join(', '),
    ).toBeLessThan(350);
    await page.context().close();
  }, 90_000);
});
