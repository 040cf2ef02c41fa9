import { readFileSync } from 'node:fs';
import type { Page } from 'playwright-core';
import { expect, test } from 'vitest';
import { accessibilityFaults, describeInBrowser, type Opened } from './harness.ts';

/** A named number of the read-out under the view. */
async function readOut(page: Page, name: string): Promise<number> {
  const text = await page
    .locator('.fly-read div', { has: page.locator(`dt:text-is("${name}")`) })
    .locator('b')
    .innerText();
  return Number(text);
}

/** Waits for the first rows of the flight, so that a key press reaches a craft that is there. */
async function ready({ page }: Opened): Promise<void> {
  await page.waitForSelector('.fly-read');
  await expect.poll(() => readOut(page, 'battery'), { timeout: 30_000 }).toBeGreaterThan(10);
}

/** Arms and lifts by keys until the craft is above `height_m`. */
async function lift(opened: Opened, height_m: number): Promise<void> {
  const { page } = opened;
  await page.keyboard.press('Space');
  await page.keyboard.down('KeyW');
  await expect.poll(() => readOut(page, 'height'), { timeout: 40_000 }).toBeGreaterThan(height_m);
  await page.keyboard.up('KeyW');
}

const SOFTWARE = ['--use-gl=angle', '--use-angle=swiftshader', '--enable-unsafe-swiftshader'];

describeInBrowser(
  'Fly with software WebGL',
  (site) => {
    test('a newcomer arms, lifts, tilts, meets a gust, lands and saves the record', async () => {
      const opened = await site.open({ at: '#/fly' });
      const { page } = opened;
      await ready(opened);
      await lift(opened, 1.5);
      await page.keyboard.down('ArrowUp');
      await expect.poll(() => readOut(page, 'tilt'), { timeout: 20_000 }).toBeGreaterThan(5);
      await page.keyboard.up('ArrowUp');
      await page.keyboard.press('KeyG');
      await opened.shot('fly-flying');
      await page.keyboard.down('KeyS');
      await expect.poll(() => readOut(page, 'height'), { timeout: 40_000 }).toBeLessThan(0.25);
      await page.keyboard.up('KeyS');
      await page.keyboard.press('Space');
      const download = page.waitForEvent('download');
      await page.getByRole('button', { name: 'Save record' }).click();
      const file = await (await download).path();
      const text = readFileSync(file, 'utf8');
      expect(text.startsWith('# gustbench.record/1\n')).toBe(true);
      const heads = text.split('\n').find((line) => !line.startsWith('#')) ?? '';
      expect(heads.split(',').slice(0, 5)).toEqual([
        't_s',
        'sp_roll_dps',
        'sp_pitch_dps',
        'sp_yaw_dps',
        'throttle',
      ]);
      expect(text.split('\n').length).toBeGreaterThan(500);
      await opened.close();
    }, 180_000);

    test('pause, tick by tick, drag the tape back and fly on from there', async () => {
      const opened = await site.open({ at: '#/fly', width: 1024, height: 768 });
      const { page } = opened;
      await ready(opened);
      await lift(opened, 1);
      await page.keyboard.press('KeyP');
      const now = () =>
        page
          .locator('.fly-read:not(.machine)')
          .evaluate(() => document.querySelector('.tape-paper')?.getAttribute('aria-valuenow'));
      await page.waitForTimeout(400);
      const height = await readOut(page, 'height');
      await page.waitForTimeout(400);
      expect(await readOut(page, 'height'), 'paused').toBe(height);
      const paper = page.locator('.tape-paper');
      const box = await paper.boundingBox();
      if (box === null) throw new Error('no tape');
      await page.mouse.move(box.x + box.width * 0.5, box.y + 30);
      await page.mouse.down();
      await page.mouse.move(box.x + box.width * 0.65, box.y + 30, { steps: 5 });
      await page.mouse.up();
      await expect.poll(() => readOut(page, 'height')).toBeLessThan(height);
      await page.getByRole('button', { name: 'Fly on from here' }).click();
      await page.waitForTimeout(1500);
      await expect.poll(() => page.getByRole('button', { name: 'Fly on from here' }).count()).toBe(0);
      expect(await now()).not.toBeNull();
      await opened.shot('fly-1024');
      await opened.close();
    }, 180_000);

    test('gains set in the panel act in flight, are undone, and wrong files leave the flight alone', async () => {
      const opened = await site.open({ at: '#/fly', theme: 'dark' });
      const { page } = opened;
      await ready(opened);
      await lift(opened, 1);
      const field = page
        .locator('.fly-panel .lil-gui .lil-controller', { hasText: 'D µs' })
        .first()
        .locator('input');
      const saved = await field.inputValue();
      await page.waitForTimeout(1500);
      const quiet = await readOut(page, 'motor noise');
      await field.fill('0.12');
      await field.press('Enter');
      // The read-out is of the last second, and how rough it is depends on the air met meanwhile.
      await expect
        .poll(() => readOut(page, 'motor noise'), { timeout: 15_000 })
        .toBeGreaterThan(Math.max(15, 2 * quiet));
      await page
        .getByText(/^(rough|screaming)$/)
        .first()
        .waitFor({ timeout: 15_000 });
      await opened.shot('fly-screaming-dark');
      await page.locator('body').click({ position: { x: 5, y: 700 } });
      await page.keyboard.press('Control+KeyZ');
      await expect.poll(() => field.inputValue()).toBe(saved);
      await page.keyboard.press('Alt+KeyW');
      await page.locator('dialog input[type="file"]').setInputFiles({
        name: 'x.build.json',
        mimeType: 'application/json',
        buffer: Buffer.from('{"format":"gustbench.build/1","name":1e308}'),
      });
      await page.keyboard.press('Escape');
      const before = await readOut(page, 'height');
      expect(before).toBeGreaterThan(0.3);
      await opened.close();
    }, 180_000);

    test('a gamepad that is unplugged in flight: plain notice, sticks neutral', async () => {
      const opened = await site.open({ at: '#/fly' });
      const { page } = opened;
      await page.evaluate(() => {
        const pad = {
          id: 'Test pad',
          connected: true,
          mapping: 'standard',
          axes: [0, 0, 0.9, 0],
          buttons: [],
          index: 0,
        };
        Object.assign(window, { testPad: pad });
        navigator.getGamepads = () => [pad as unknown as Gamepad];
      });
      await ready(opened);
      await expect
        .poll(() => page.getByRole('button', { name: 'Self-levelling' }).getAttribute('aria-pressed'))
        .toBe('false');
      await page.getByRole('button', { name: 'Sticks …' }).click();
      await page.getByText('Found: Test pad').waitFor();
      await page.keyboard.press('Escape');
      await page.evaluate(() =>
        Object.assign((window as unknown as { testPad: { connected: boolean } }).testPad, {
          connected: false,
        }),
      );
      await page.getByText(/Test pad was unplugged/).waitFor();
      await opened.close();
    }, 120_000);

    test('nothing serious for a screen reader; tablet in portrait works', async () => {
      const opened = await site.open({ at: '#/fly', width: 768, height: 1024 });
      await ready(opened);
      expect(await accessibilityFaults(opened.page)).toEqual([]);
      await opened.shot('fly-portrait');
      await opened.close();
    }, 120_000);
  },
  SOFTWARE,
);

describeInBrowser(
  'Fly without any WebGL',
  (site) => {
    test('the same flight on the 2D canvas, and it says so', async () => {
      const opened = await site.open({ at: '#/fly' });
      const { page } = opened;
      await ready(opened);
      await page.getByText('No WebGL here').waitFor();
      await lift(opened, 1.5);
      await opened.shot('fly-canvas');
      await opened.close();
    }, 180_000);
  },
  ['--disable-3d-apis'],
);
