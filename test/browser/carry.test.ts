import path from 'node:path';
import { mkdirSync, writeFileSync } from 'node:fs';
import { expect, test } from 'vitest';
import { assembleSheet } from '../../src/carrying/assemble.ts';
import { sheetHtml } from '../../src/carrying/sheet.ts';
import { windFlights, windProof } from '../../src/carrying/windLimit.ts';
import { root } from '../../src/cli/setup.mjs';
import { CONVENTIONS } from '../../src/shaping/conventions.ts';
import { TRIALS } from '../../src/trials/registry.ts';
import { demoBuild, demoGains, longest, madeResult } from '../carrying/made.ts';
import { accessibilityFaults, describeInBrowser } from './harness.ts';

/** Pages of a PDF that Chromium wrote: its page objects stand uncompressed. */
const pagesOf = (pdf: Buffer) => (pdf.toString('latin1').match(/\/Type\s*\/Page(?![a-z])/g) ?? []).length;

function sheet(
  craft: { build: ReturnType<typeof demoBuild>; gains: ReturnType<typeof demoGains> },
  pass: boolean,
) {
  const flights = windFlights(1);
  const answers = flights.map((flight) =>
    madeResult(flight.kind === 'gust' ? `gust-${flight.side}` : flight.trial, pass),
  );
  return sheetHtml(
    assembleSheet({
      ...craft,
      convention: CONVENTIONS[CONVENTIONS.length - 1],
      results: TRIALS.map(({ name }) => madeResult(name, pass)),
      wind: windProof(flights, answers),
      printedAt: '2026-01-02',
    }),
  );
}

describeInBrowser('The printed sheet', (site) => {
  for (const format of ['A4', 'Letter'] as const) {
    test.each([
      ['the demo craft', sheet({ build: demoBuild(), gains: demoGains() }, true)],
      ['the longest names, six notches, every trial outside', sheet(longest(), false)],
    ])(`takes two pages of ${format}: %s`, async (name, html) => {
      const context = await site.newContext();
      const page = await context.newPage();
      await page.setContent(html);
      const pdf = await page.pdf({ format, printBackground: false });
      const shots = path.join(root, 'test/browser/shots');
      mkdirSync(shots, { recursive: true });
      writeFileSync(path.join(shots, `sheet-${format}-${name.slice(4, 8)}.pdf`), pdf);
      expect(pagesOf(pdf)).toBe(2);
      await context.close();
    });
  }
});

describeInBrowser('Carry', (site) => {
  test('trials and wind limit come on the sheet, stay over a reload, and go with other gains', async () => {
    const opened = await site.open({ at: '#/carry' });
    const { page } = opened;
    const sheet = page.frameLocator('.carry-sheet');
    await sheet.getByText('No wind was flown for this sheet').waitFor();
    await page.getByRole('button', { name: /Run the sheet/ }).click();
    await sheet.getByRole('cell', { name: 'Gust from the front' }).waitFor({ timeout: 120_000 });
    await page.getByRole('button', { name: 'Prove the wind limit' }).click();
    // What the limit is, is the trials' business; a stop is enough to know that it runs.
    await page.getByRole('button', { name: /^Stop: Wind limit/ }).click();
    await expect
      .poll(() => page.getByRole('button', { name: 'Prove the wind limit' }).isEnabled())
      .toBe(true);
    // What Prove has flown of the same build and gains is on the sheet too.
    await page.keyboard.press('Alt+Digit4');
    await page.getByRole('button', { name: /^Run Doublet, roll, small/ }).click();
    await page
      .getByText(/1 of 1 /)
      .first()
      .waitFor({ timeout: 60_000 });
    await page.keyboard.press('Alt+Digit6');
    await page.getByText('1 of them from Prove').waitFor();
    await sheet.getByText('Also within their bands (1): Doublet, roll, small.').waitFor();
    await page.waitForSelector('.save-state[data-kind="saved"]');
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('carry');
    await page.reload();
    await sheet.getByRole('cell', { name: 'Gust from the front' }).waitFor();
    await page.keyboard.press('Alt+Digit2');
    const field = page.getByRole('textbox', { name: 'P', exact: true }).first();
    await field.fill('2.8');
    await field.press('Enter');
    await page.keyboard.press('Alt+Digit6');
    await page.getByText('Earlier results were of another build').waitFor();
    await sheet.getByText('No trial was run.').waitFor();
    await page.getByRole('button', { name: 'Undo' }).click();
    await sheet.getByRole('cell', { name: 'Gust from the front' }).waitFor();
    await opened.close();
  }, 240_000);

  test('a link brings craft and gains beside what is there; junk is refused and nothing is overwritten', async () => {
    const context = await site.newContext({ permissions: ['clipboard-read', 'clipboard-write'] });
    const opened = await site.open({ at: '#/carry', context });
    const { page } = opened;
    const crafts = () => page.locator('#top-craft option').allInnerTexts();
    await page.getByRole('button', { name: /Copy a link/ }).click();
    await page.getByText('Copied.').waitFor();
    const link = await page.evaluate(() => navigator.clipboard.readText());
    // In the page that is open, and again in a new one.
    await page.evaluate((hash) => void (location.hash = hash), new URL(link).hash);
    await expect.poll(crafts).toEqual(['Sandpiper', 'Wren', 'Sandpiper 2']);
    await page.getByText(/came from a link as a craft of its own/).waitFor();
    await page.waitForSelector('.save-state[data-kind="saved"]');
    await page.goto('about:blank');
    await page.goto(link);
    await expect
      .poll(async () => (await crafts()).sort())
      .toEqual(['Sandpiper', 'Sandpiper 2', 'Sandpiper 3', 'Wren']);
    expect(new URL(page.url()).hash).toBe('#/measure');
    for (const junk of ['AAAA_junk', '%00%ff', link.slice(link.indexOf('take/') + 5, -40)]) {
      await page.evaluate((hash) => void (location.hash = hash), `#/take/${junk}`);
      await page.locator('.notice.error', { hasText: 'link was not taken; what was there stays' }).waitFor();
      await page.locator('.notice.error').getByRole('button', { name: 'Dismiss' }).click();
    }
    expect((await crafts()).length).toBe(4);
    await opened.close();
    await context.close();
  }, 120_000);

  test('imperial display: Work speaks in pounds', async () => {
    const opened = await site.open({ at: '#/carry', width: 768, height: 1024 });
    const { page } = opened;
    await page.keyboard.press('Alt+KeyS');
    await page.getByLabel('Shown units').selectOption('imperial');
    await page.keyboard.press('Escape');
    await page.keyboard.press('Alt+KeyW');
    await page.locator('dialog').getByText('2.98\u00a0lb').first().waitFor();
    await opened.close();
  });
});
