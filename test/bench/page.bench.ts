/**
 * The page's frame rate and punctuality, in headless Chromium: software WebGL at 1280 × 720, and no WebGL at all.
 * Needs a built page (it builds one) and a Chromium; says plainly when there is none.
 */
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { chromium, type Page } from 'playwright-core';
import { build, preview } from 'vite';
import { findChromium } from '../../src/cli/setup.mjs';

const SECONDS = 60;

async function measure(
  url: string,
  executablePath: string,
  flags: string[],
  name: string,
  wanted: number,
): Promise<void> {
  const browser = await chromium.launch({ executablePath, args: ['--no-sandbox', ...flags] });
  const page = await browser.newPage({ viewport: { width: 1280, height: 720 } });
  await page.goto(`${url}#/fly`);
  await page.waitForSelector('.fly-read');
  await page.waitForTimeout(6000);
  await page.keyboard.press('Space');
  await page.keyboard.down('KeyW');
  await page.waitForTimeout(1500);
  await page.keyboard.up('KeyW');
  // Turns and tilts now and then, so that it is not a still picture.
  const flying = setInterval(() => {
    const key = ['KeyA', 'KeyD', 'ArrowLeft', 'ArrowRight'][Math.floor(Math.random() * 4)];
    // A press that is under way when the page closes has nothing left to do.
    page.keyboard.press(key, { delay: 400 }).catch(() => undefined);
  }, 1500);
  const before = await ticks(page);
  const frames = await page.evaluate(
    (seconds) =>
      new Promise<number>((resolve) => {
        let count = 0;
        const start = performance.now();
        const beat = (now: number) => {
          count++;
          if (now - start < seconds * 1000) requestAnimationFrame(beat);
          else resolve(count / ((now - start) / 1000));
        };
        requestAnimationFrame(beat);
      }),
    SECONDS,
  );
  clearInterval(flying);
  const after = await ticks(page);
  console.log(
    `${name}: ${frames.toFixed(1)} frames/s (wanted ${wanted}); ticks on time ${after} % since the start (before the run ${before} %), wanted 99.9`,
  );
  await browser.close();
}

async function ticks(page: Page): Promise<string> {
  return page.locator('.fly-read.machine div', { hasText: 'ticks on time' }).locator('b').innerText();
}

const chromiumPath = findChromium();
if (chromiumPath === null) console.log('left out: no Chromium');
else {
  const outDir = mkdtempSync(path.join(tmpdir(), 'gustbench-page-'));
  await build({ logLevel: 'error', build: { outDir, emptyOutDir: true } });
  const server = await preview({
    logLevel: 'error',
    build: { outDir },
    preview: { port: 0, host: '127.0.0.1' },
  });
  const address = server.httpServer.address();
  const url = address === null || typeof address === 'string' ? '' : `http://127.0.0.1:${address.port}/`;
  await measure(
    url,
    chromiumPath,
    ['--use-gl=angle', '--use-angle=swiftshader', '--enable-unsafe-swiftshader'],
    'software WebGL, 1280 × 720',
    45,
  );
  await measure(url, chromiumPath, ['--disable-3d-apis'], 'no WebGL, 2D canvas', 30);
  await server.close();
  rmSync(outDir, { recursive: true, force: true });
}
