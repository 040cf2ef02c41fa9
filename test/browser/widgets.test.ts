import { expect, test } from 'vitest';
import { accessibilityFaults, describeInBrowser, GALLERY } from './harness.ts';

describeInBrowser('Widgets and plots', (site) => {
  for (const theme of ['light', 'dark'] as const) {
    test(`look and are read as meant, ${theme}`, async () => {
      const opened = await site.open({ at: GALLERY, theme, height: 1750 });
      await opened.page.waitForTimeout(600);
      await opened.shot(`gallery-${theme}`);
      expect(await accessibilityFaults(opened.page)).toEqual([]);
      await opened.close();
    });
  }

  test('the tape draws a frame in a few milliseconds at 1280 pixels', async () => {
    const opened = await site.open({ at: GALLERY });
    const cost = await opened.page.evaluate(() =>
      (
        window as unknown as {
          measureTape: (
            width: number,
            frames: number,
          ) => { median_ms: number; worst_ms: number; first_ms: number };
        }
      ).measureTape(1280, 200),
    );
    console.log(`tape at 1280 px: ${JSON.stringify(cost)}`);
    // 2 ms is the aim on a free core; this bound only catches drawing everything anew each frame.
    expect(cost.median_ms).toBeLessThan(8);
    await opened.close();
  });
});
