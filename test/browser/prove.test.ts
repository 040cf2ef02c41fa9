import { readFileSync } from 'node:fs';
import type { Page } from 'playwright-core';
import { expect, test } from 'vitest';
import { parseRun } from '../../src/trials/runDescription.ts';
import { accessibilityFaults, describeInBrowser, type Opened } from './harness.ts';

const tab = (page: Page, name: string) => page.getByRole('tab', { name }).click();

/** Workers of the page within reach of the test. */
async function holdWorkers(page: Page): Promise<void> {
  await page.addInitScript(() => {
    const made: Worker[] = [];
    (window as unknown as { made: Worker[] }).made = made;
    window.Worker = class extends Worker {
      constructor(url: string | URL, options?: WorkerOptions) {
        super(url, options);
        if (String(url).includes('trials.worker')) made.push(this);
      }
    };
  });
  await page.reload();
  await page.waitForSelector('main');
}

/** The newest of the trials' workers dies. */
const killWorker = (page: Page) =>
  page.evaluate(() => {
    const { made } = window as unknown as { made: Worker[] };
    made.at(-1)?.dispatchEvent(new ErrorEvent('error', { message: 'killed by the test' }));
  });

/** Both sets, B with another roll gain: through Work's copy and Shape's field it would take longer. */
async function makeB(page: Page): Promise<void> {
  await page.getByRole('button', { name: 'Work', exact: true }).click();
  await page.getByRole('button', { name: /B/ }).first().click();
  await page.keyboard.press('Escape');
}

async function text(opened: Opened, name: string): Promise<string> {
  const download = opened.page.waitForEvent('download');
  await opened.page.getByRole('button', { name }).click();
  return readFileSync(await (await download).path(), 'utf8');
}

/** The craft on the desk, when its name is like this. */
const onDesk = (page: Page, name: RegExp) => page.locator('option:checked', { hasText: name });

/** A sweep of roll P over the all-up mass, small and short. */
async function fillSweep(page: Page, columns: number, rows: number): Promise<void> {
  const form = page.getByRole('form', { name: 'Sweep over one or two numbers' });
  await form.getByLabel('Trial').selectOption('gust-front');
  for (const [axis, path, count] of [
    ['x', 'gains.axes.roll.p_us_per_dps', columns],
    ['y', 'build.airframe.mass_kg', rows],
  ] as const) {
    await form.getByLabel(`${axis}: number`).fill(path);
    await form.getByLabel(`${axis}: number`).press('Tab');
    await form.getByLabel(`${axis} cells`).fill(String(count));
    await form.getByLabel(`${axis} cells`).press('Tab');
  }
}

const cellsDone = async (page: Page): Promise<number> =>
  Number(/(\d+) of \d+ cells/.exec(await page.locator('.prove-map-main').innerText())?.[1] ?? 0);

describeInBrowser('Prove', (site) => {
  test('a trial runs, a band is edited and the verdict turns, the report and the run description say so', async () => {
    const opened = await site.open({ at: '#/prove' });
    const { page } = opened;
    expect(await accessibilityFaults(page)).toEqual([]);
    await page.getByRole('button', { name: 'Run Gust from the front' }).click();
    await page.getByText('1 of 1 trials within their bands').waitFor({ timeout: 60_000 });
    await page.getByRole('button', { name: 'Gust from the front', exact: true }).click();
    await page.locator('.prove-traces figure').first().waitFor({ timeout: 60_000 });
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('prove-trial');
    const field = page.getByLabel('most of peak tilt');
    await field.fill('0.1');
    await field.press('Enter');
    await page.getByText('0 of 1 trials within their bands').waitFor();
    await page.getByText('1 band edited').waitFor();
    const report = await text(opened, 'Report as HTML');
    expect(report).toContain('set by the user');
    expect(report).toContain('0 of 1 trials within');
    const run = parseRun(JSON.parse(await text(opened, 'Run description')));
    expect(run.bands).toEqual({ 'gust-front': { 'peak tilt': { most: 0.1 } } });
    // What is not a number changes nothing and is said.
    await field.fill('tall');
    await field.press('Enter');
    await page.getByText(/"tall" is not a number/).waitFor();
    // Kept over a reload; the way back is one button.
    await page.waitForTimeout(400);
    await page.reload();
    await page.getByText('0 of 1 trials within their bands').waitFor();
    await page.getByRole('button', { name: 'Gust from the front', exact: true }).click();
    await page.getByRole('button', { name: 'Back to the default', exact: true }).click();
    await page.getByText('1 of 1 trials within their bands').waitFor();
    await opened.close();
  }, 180_000);

  test('a sweep goes on after a reload in its middle; what cannot be swept is refused; cells are compared and flown', async () => {
    const opened = await site.open({ at: '#/prove' });
    const { page } = opened;
    await tab(page, 'Maps');
    await fillSweep(page, 1000, 1000);
    const start = page.getByRole('button', { name: 'Start the sweep' });
    await start.click();
    await page.getByText(/1000000 cells.*; allowed: at most 40000 cells in all/).waitFor();
    const path = page.getByLabel('x: number');
    await path.fill('gains.axes.roll.q');
    await path.press('Tab');
    await page
      .getByText(/gains\.axes\.roll\.q.*; allowed: the path of a number; known at this place: p_us/)
      .waitFor();
    await fillSweep(page, 6, 5);
    expect(await accessibilityFaults(page)).toEqual([]);
    await start.click();
    await expect.poll(() => cellsDone(page), { timeout: 60_000 }).toBeGreaterThan(2);
    await page.getByRole('button', { name: 'Hold' }).click();
    await page.waitForTimeout(900);
    const before = await cellsDone(page);
    expect(before).toBeGreaterThan(2);
    expect(before).toBeLessThan(30);
    await page.reload();
    await expect.poll(() => cellsDone(page), { timeout: 30_000 }).toBe(before);
    await page.getByRole('button', { name: 'Fly the missing cells' }).click();
    await page.getByText('30 of 30 cells').waitFor({ timeout: 120_000 });
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('prove-sweep');

    await page.getByLabel('A click on a cell').selectOption('pick');
    const box = await page.locator('.plot-body.map canvas').boundingBox();
    if (box === null) throw new Error('no map');
    await page.mouse.click(box.x + 0.3 * box.width, box.y + 0.3 * box.height);
    await page.mouse.click(box.x + 0.8 * box.width, box.y + 0.6 * box.height);
    const compare = page.getByRole('region', { name: 'Cells side by side' });
    await compare.getByText('cell 2', { exact: true }).first().waitFor();
    await compare.locator('.prove-traces figure').first().waitFor({ timeout: 60_000 });
    expect(await accessibilityFaults(page)).toEqual([]);
    await compare.scrollIntoViewIfNeeded();
    await opened.shot('prove-compare');
    const run = parseRun(JSON.parse(await text(opened, 'Sweep as run description')));
    expect(run.sweep).toMatchObject({ trial: 'gust-front', x: { count: 6 }, y: { count: 5 } });

    // Another mass comes as a craft of its own; undo brings the old one back.
    await page.getByRole('button', { name: 'Fly cell 2' }).click();
    await page.waitForURL(/#\/fly/);
    await onDesk(page, /cell of a sweep/).waitFor({ state: 'attached' });
    await page.keyboard.press('Control+z');
    await expect.poll(() => onDesk(page, /cell of a sweep/).count()).toBe(0);
    await opened.close();
  }, 240_000);

  test('the map of D and cutoff is one click, held while somebody flies; a worker that dies is replaced', async () => {
    const opened = await site.open({ at: '#/prove', width: 1024, height: 768, theme: 'dark' });
    const { page } = opened;
    await holdWorkers(page);
    await tab(page, 'Maps');
    await page.getByRole('button', { name: 'D × cutoff map' }).click();
    await expect.poll(() => cellsDone(page), { timeout: 60_000 }).toBeGreaterThan(20);
    await killWorker(page);
    await page.goto(`${page.url().split('#')[0]}#/fly`);
    await page.waitForTimeout(600);
    await page.goto(`${page.url().split('#')[0]}#/prove`);
    await expect.poll(() => cellsDone(page), { timeout: 60_000 }).toBeGreaterThan(60);
    // Each layer is read out in its own unit.
    const map = page.locator('.plot-body.map canvas');
    const readOut = async () => {
      await map.hover({ position: { x: 200, y: 150 } });
      return page.locator('.prove-map-main').innerText();
    };
    await expect.poll(readOut).toMatch(/gust excursion [\d.]+ deg\/s(?! rms)/);
    await page.getByLabel('Layer').selectOption('motor activity');
    await expect.poll(readOut).toMatch(/motor activity [\d.]+ µs rms/);
    await opened.shot('prove-map-dark');
    await page.getByRole('button', { name: 'Stop', exact: true }).last().click();
    await page.getByText(/a worker stopped and was replaced/).waitFor();
    await page.getByRole('button', { name: 'Fly the missing cells' }).waitFor();
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.close();
  }, 240_000);

  test('a spread says its share with an interval, what matters and the worst, which is flown again', async () => {
    const opened = await site.open({ at: '#/prove' });
    const { page } = opened;
    await tab(page, 'Spread');
    const samples = page.getByRole('textbox', { name: 'Samples' });
    await samples.fill('20');
    await samples.press('Enter');
    await page.getByRole('button', { name: 'Fly 20 samples' }).click();
    await page.getByText(/% of 20 samples fall outside a band \(95 %: .* to .* %, Wilson\)/).waitFor({
      timeout: 120_000,
    });
    await page.locator('.prove-traces figure').first().waitFor({ timeout: 60_000 });
    expect(await page.locator('.prove-correlation').count()).toBe(6);
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('prove-spread');
    await page.getByRole('button', { name: 'Fly the worst sample' }).click();
    await page.waitForURL(/#\/fly/);
    await onDesk(page, /worst sample/).waitFor({ state: 'attached' });
    await opened.close();
  }, 180_000);

  test('a session by hand flies both sets in hidden order and shows ratings side by side at its end', async () => {
    const opened = await site.open({ at: '#/prove' });
    const { page } = opened;
    await tab(page, 'By hand');
    await page.getByText(/Two gain sets are needed/).waitFor();
    await makeB(page);
    const field = async (name: string, value: string) => {
      const box = page.getByRole('textbox', { name });
      await box.fill(value);
      await box.press('Enter');
    };
    await field('Flights of each set', '1');
    await field('Length of a flight', '3');
    await page.getByRole('button', { name: 'Begin a session' }).click();
    for (const n of [1, 2]) {
      await page.getByText(`Flight ${n} of 2`).waitFor();
      await page.getByRole('button', { name: 'Fly', exact: true }).click();
      await page.getByRole('timer').waitFor();
      await page.waitForTimeout(300);
      await page.keyboard.down('ArrowRight');
      await page.waitForTimeout(500);
      await page.keyboard.up('ArrowRight');
      if (n === 1) await opened.shot('prove-hand-flight');
      await page.getByText(/How was it\?/).waitFor({ timeout: 60_000 });
      await page.getByRole('button', { name: 'Yes' }).click();
      await page.getByRole('button', { name: 'No', exact: true }).click();
      if (n === 1) expect(await accessibilityFaults(page)).toEqual([]);
      await page.getByLabel('Note, in a few words').fill(`flight ${n}`);
      await opened.shot('prove-hand-rating');
      await page.getByRole('button', { name: n === 1 ? /^7/ : /^8/ }).click();
    }
    await page.getByText(/Order flown: (A, B|B, A)/).waitFor();
    const table = page.getByRole('table', { name: 'Ratings' });
    expect(await table.locator('tbody tr').count()).toBe(4);
    const rms = Number(await table.locator('tbody tr').first().locator('td').nth(3).innerText());
    expect(rms).toBeGreaterThan(0.02);
    expect(await page.getByText('NaN').count()).toBe(0);
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('prove-hand-result');
    await opened.close();
  }, 180_000);
});
