/** The flight view in a real browser: WebGL in software, the 2D canvas, and the way from one to the other. */
import { loadavg } from 'node:os';
import type { Page } from 'playwright-core';
import { expect, test } from 'vitest';
import { describeInBrowser, VIEW_PAGE, type Opened, type Site } from './harness.ts';

interface Stats {
  readonly fps: number;
  readonly scale: number;
  readonly renderer: 'webgl' | 'canvas';
  readonly frames: number;
  readonly time_s: number;
}

const SOFTWARE = ['--use-gl=angle', '--use-angle=swiftshader', '--enable-unsafe-swiftshader'];
const NO_WEBGL = ['--disable-3d-apis'];

const stats = (page: Page): Promise<Stats> =>
  page.evaluate(() => (window as unknown as { bench: { stats(): Stats } }).bench.stats());

/** The view page with some frames drawn. */
async function openView(
  site: Site,
  query: string,
  size: readonly [number, number] = [1440, 900],
): Promise<Opened> {
  const opened = await site.open({ at: `${VIEW_PAGE}#${query}`, width: size[0], height: size[1] });
  await opened.page.waitForFunction(
    () => ((window as unknown as { bench?: { stats(): Stats } }).bench?.stats().frames ?? 0) > 8,
    undefined,
    { timeout: 60_000 },
  );
  return opened;
}

/** Mean difference of two pictures over all channels, 0 to 255. */
async function difference(page: Page, one: Buffer, other: Buffer): Promise<number> {
  return page.evaluate(
    async (images) => {
      const pixels = await Promise.all(
        images.map(async (base64) => {
          const image = new Image();
          image.src = `data:image/png;base64,${base64}`;
          await image.decode();
          const canvas = document.createElement('canvas');
          // At a quarter of the size: what lies one pixel beside counts little.
          canvas.width = image.width / 4;
          canvas.height = image.height / 4;
          const pen = canvas.getContext('2d');
          if (pen === null) throw new Error('no canvas');
          pen.drawImage(image, 0, 0, canvas.width, canvas.height);
          return pen.getImageData(0, 0, canvas.width, canvas.height).data;
        }),
      );
      let sum = 0;
      for (let i = 0; i < pixels[0].length; i++) sum += Math.abs(pixels[0][i] - pixels[1][i]);
      return sum / pixels[0].length;
    },
    [one.toString('base64'), other.toString('base64')],
  );
}

const SIGHTS = [
  ['bridge-light', 'scene=estuary-bridge&at=9', 1440, 900],
  ['quarry-free', 'scene=quarry-face&at=12&camera=free&zoom=9&turn=-0.5', 1024, 768],
  ['hall-wren-dark', 'scene=sports-hall&craft=wren&at=5&turn=2.6&theme=dark', 1024, 768],
] as const;

describeInBrowser(
  'the flight view with WebGL in software',
  (site) => {
    test.each(SIGHTS)(
      '%s: the 2D canvas shows what WebGL shows',
      async (name, query, width, height) => {
        const webgl = await openView(site, `${query}&bare=1`, [width, height]);
        expect((await stats(webgl.page)).renderer).toBe('webgl');
        const one = await webgl.page.screenshot();
        await webgl.shot(`view-${name}-webgl`);
        await webgl.close();
        const canvas = await openView(site, `${query}&bare=1&canvas=1`, [width, height]);
        expect((await stats(canvas.page)).renderer).toBe('canvas');
        const other = await canvas.page.screenshot();
        await canvas.shot(`view-${name}-canvas`);
        // Two bare sights of the same site from other places differ by 20 and more.
        expect(await difference(canvas.page, one, other), 'mean difference of 255').toBeLessThan(4);
        await canvas.close();
      },
      120_000,
    );

    test('a longer arm shows', async () => {
      const withArm = async (arm: string) => {
        const opened = await openView(site, `scene=estuary-bridge&at=9&bare=1&canvas=1&arm=${arm}`);
        const picture = await opened.page.screenshot();
        return { opened, picture };
      };
      const short = await withArm('1');
      const long = await withArm('1.5');
      expect(await difference(long.opened.page, short.picture, long.picture)).toBeGreaterThan(0.5);
      await short.opened.close();
      await long.opened.close();
    }, 120_000);

    test('when the graphics driver gives up, the canvas goes on', async () => {
      const opened = await site.open({
        at: `${VIEW_PAGE}#scene=estuary-bridge`,
        expectedErrors: /context lost/i,
      });
      const { page } = opened;
      await expect.poll(async () => (await stats(page)).frames, { timeout: 60_000 }).toBeGreaterThan(8);
      await page.evaluate(() =>
        document
          .querySelector('canvas')
          ?.getContext('webgl2')
          ?.getExtension('WEBGL_lose_context')
          ?.loseContext(),
      );
      await expect.poll(async () => (await stats(page)).renderer).toBe('canvas');
      const { frames } = await stats(page);
      await expect
        .poll(async () => (await stats(page)).frames, { timeout: 30_000 })
        .toBeGreaterThan(frames + 5);
      expect(await page.locator('canvas').count()).toBe(1);
      await opened.close();
    }, 120_000);

    test('resolution follows the rate, and it flies on', () => rate(site, 'webgl'), 120_000);
  },
  SOFTWARE,
);

describeInBrowser(
  'the flight view without any WebGL',
  (site) => {
    test('draws on the 2D canvas and flies', () => rate(site, 'canvas'), 120_000);
  },
  NO_WEBGL,
);

/** Frames a second over a few seconds at 1280 × 720: a bound for life only, the figure goes to the log. */
async function rate(site: Site, renderer: Stats['renderer']): Promise<void> {
  const opened = await openView(site, 'scene=estuary-bridge', [1280, 720]);
  await opened.page.waitForTimeout(2500);
  const from = await stats(opened.page);
  await opened.page.waitForTimeout(3000);
  const to = await stats(opened.page);
  const fps = (to.frames - from.frames) / (to.time_s - from.time_s);
  expect(to.renderer).toBe(renderer);
  expect(to.scale).toBeGreaterThanOrEqual(0.4);
  console.log(
    `${renderer}: ${fps.toFixed(1)} frames/s at ${to.scale.toFixed(2)} of the resolution, load ${loadavg()[0].toFixed(1)}`,
  );
  expect(fps).toBeGreaterThan(4);
  await opened.close();
}
