/**
 * `npm run pictures`: takes the manual's pictures anew, one a place, from the demo craft in headless Chromium,
 * and writes them small to src/app/static/manual/. Look at them before they are kept.
 */
import { mkdirSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import { chromium, type Browser, type Page } from 'playwright-core';
import { findChromium, root } from '../../src/cli/setup.mjs';
import { serveBuilt } from '../bench/site.ts';

const FOLDER = path.join(root, 'src/app/static/manual');
const SIZE = { width: 1200, height: 750 };
/** Of WebP: text stays readable, a picture stays below 100 kB. */
const QUALITY = 0.72;

/** What has to happen on the page before a place's picture is taken. */
const SCENES: Readonly<Record<string, (page: Page) => Promise<void>>> = {
  measure: async (page) => {
    await page.getByRole('tab', { name: 'Swing test' }).click();
  },
  shape: async (page) => {
    await page.waitForSelector('.shape-margins');
  },
  fly: async (page) => {
    await page.waitForSelector('.fly-read');
    await page.waitForTimeout(3000);
    await page.keyboard.press('Space');
    await page.keyboard.press('KeyW', { delay: 1800 });
    await page.keyboard.press('ArrowUp', { delay: 900 });
    await page.keyboard.press('KeyD', { delay: 600 });
  },
  prove: async (page) => {
    for (const trial of ['Gust from the front', 'Gust from the right', 'Hover, noise floor']) {
      await page
        .getByRole('button', { name: new RegExp(`^Run ${trial}`) })
        .first()
        .click();
      await page.waitForTimeout(4000);
    }
  },
  match: async () => undefined,
  carry: async (page) => {
    await page.waitForSelector('.carry-sheet');
  },
};

async function take(browser: Browser, url: string, place: string): Promise<void> {
  const page = await browser.newPage({ viewport: SIZE, colorScheme: 'light' });
  page.setDefaultTimeout(60_000);
  await page.goto(`${url}#/${place}`);
  await page.getByRole('button', { name: 'Hide guide' }).click();
  await SCENES[place](page);
  await page.waitForTimeout(1500);
  const file = path.join(FOLDER, `${place}.webp`);
  const bytes = await asWebp(page, await page.screenshot());
  writeFileSync(file, bytes);
  console.log(`${path.relative(root, file)} ${Math.round(bytes.length / 1000)} kB`);
  await page.close();
}

/** The browser's own encoder makes a WebP of a PNG. */
async function asWebp(page: Page, png: Buffer): Promise<Buffer> {
  const text = await page.evaluate(
    async ({ data, quality }) => {
      const picture = await createImageBitmap(await (await fetch(data)).blob());
      const canvas = document.createElement('canvas');
      canvas.width = picture.width;
      canvas.height = picture.height;
      canvas.getContext('2d')?.drawImage(picture, 0, 0);
      return canvas.toDataURL('image/webp', quality);
    },
    { data: `data:image/png;base64,${png.toString('base64')}`, quality: QUALITY },
  );
  return Buffer.from(text.slice(text.indexOf(',') + 1), 'base64');
}

async function main(executablePath: string): Promise<void> {
  const site = await serveBuilt();
  mkdirSync(FOLDER, { recursive: true });
  const browser = await chromium.launch({ executablePath, args: ['--no-sandbox'] });
  const wanted = process.argv.slice(2);
  for (const place of Object.keys(SCENES)) {
    if (wanted.length === 0 || wanted.includes(place)) await take(browser, site.url, place);
  }
  await browser.close();
  await site.close();
}

const chromiumPath = findChromium();
if (chromiumPath === null) {
  console.error('No Chromium: set CHROMIUM_PATH to one.');
  process.exitCode = 1;
} else await main(chromiumPath);
