import { expect, test } from 'vitest';
import { describeInBrowser } from './harness.ts';

describeInBrowser('The frame', (site) => {
  test('every place opens by its link', async () => {
    const opened = await site.open();
    await opened.page.waitForTimeout(500);
    await opened.shot('shell-first');
    expect(await opened.page.title()).toContain('Gustbench');
    await opened.close();
  });
});
