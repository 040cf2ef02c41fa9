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
import { describeInBrowser } from './harness.ts';

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
