import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import type { Page } from 'playwright-core';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { root } from '../../src/cli/setup.mjs';
import { CORNERS, parseBuild, type Build } from '../../src/craft/build.ts';
import { AXES, parseGains, type AxisName } from '../../src/craft/gains.ts';
import { OPEN_FIELD } from '../../src/craft/scene.ts';
import { CALM } from '../../src/craft/wind.ts';
import { NEUTRAL_STICKS, type Sticks } from '../../src/flight/pilot.ts';
import { recordCsv, type Recorder } from '../../src/flight/record.ts';
import { runFlight } from '../../src/flight/run.ts';
import { excitationAt_dps, suggestedExcitations } from '../../src/matching/excitation.ts';
import { accessibilityFaults, describeInBrowser } from './harness.ts';

const read = (name: string): unknown => JSON.parse(readFileSync(path.join(root, 'scenes', name), 'utf8'));
const desk = parseBuild(read('sandpiper.build.json'));
const gains = parseGains(read('sandpiper.gains.json'));
/** The craft that flew turns heavier about roll than the build on the desk says. */
const HEAVIER = 1.2;
const { inertia_kgm2 } = desk.airframe;
const flown: Build = parseBuild({
  ...desk,
  airframe: { ...desk.airframe, inertia_kgm2: { ...inertia_kgm2, xx: HEAVIER * inertia_kgm2.xx } },
});
const MANOEUVRE_S = 16;

/** Moored hover; doublets on one axis after the other. */
function fly(axes: readonly AxisName[]): Recorder {
  const manoeuvres = axes.map((axis) => suggestedExcitations(axis, gains.maxRate_dps[axis])[0]);
  const sticks: Sticks = { ...NEUTRAL_STICKS, armed: true, moored: true, throttle: 0.5 };
  const { record, stopped } = runFlight(
    { build: flown, gains, wind: CALM, scene: OPEN_FIELD, seed: 11, start: { kind: 'hover', height_m: 15 } },
    2 + MANOEUVRE_S * axes.length,
    (t_s) => {
      sticks.roll = sticks.pitch = sticks.yaw = 0;
      manoeuvres.forEach((one, i) => {
        const at_s = t_s - 1 - MANOEUVRE_S * i;
        if (at_s < MANOEUVRE_S) sticks[one.axis] = excitationAt_dps(one, at_s) / gains.maxRate_dps[one.axis];
      });
      return sticks;
    },
  );
  expect(stopped).toBeNull();
  return record;
}

/** Heads and order of somebody else's log; rates in rad/s under heads that do not say so. */
function foreignCsv(record: Recorder): string {
  const columns = [
    { head: 'time', name: 't_s', scale: 1e6, digits: 0 },
    ...AXES.map((axis) => ({
      head: `${axis} rate (deg/s)`,
      name: `gyro_${axis}_dps`,
      scale: Math.PI / 180,
      digits: 6,
    })),
    ...AXES.map((axis) => ({
      head: `${axis} setpoint (deg/s)`,
      name: `sp_${axis}_dps`,
      scale: Math.PI / 180,
      digits: 6,
    })),
    ...CORNERS.map((corner, i) => ({
      head: `out ${'ABCD'[i]}`,
      name: `cmd_${corner}_us`,
      scale: 1,
      digits: 2,
    })),
  ].map(({ name, ...rest }) => ({ ...rest, values: record.column(name) }));
  const lines = [columns.map(({ head }) => head).join(';')];
  for (let row = 0; row < record.length; row++) {
    lines.push(columns.map(({ values, scale, digits }) => (scale * values[row]).toFixed(digits)).join(';'));
  }
  return `${lines.join('\n')}\n`;
}

let folder = '';
const file = (name: string) => path.join(folder, name);

beforeAll(() => {
  folder = mkdtempSync(path.join(tmpdir(), 'gustbench-match-'));
  const header = { build: flown, gains, wind: CALM, scene: OPEN_FIELD, seed: 11, faults: [] };
  writeFileSync(file('own.csv'), [...recordCsv(fly(AXES), header)].join(''));
  writeFileSync(file('foreign.csv'), foreignCsv(fly(['roll', 'pitch'])));
  writeFileSync(file('junk.bin.csv'), Buffer.from([0x50, 0x4b, 0, 0, 1, 2, 3, 255, 0, 17]));
});
afterAll(() => rmSync(folder, { recursive: true, force: true }));

const drop = (page: Page, name: string) =>
  page.locator('.match input[type="file"]').first().setInputFiles(file(name));

/** "30.1 ± 0.4" of one axis and column (gain, lag, delay). */
async function numberOf(page: Page, axis: AxisName, column: number): Promise<[number, number]> {
  const row = page.locator('.match-table tbody tr').nth(AXES.indexOf(axis));
  const text = (await row.locator('td').nth(column).innerText()).split('\n')[0];
  const [value, half] = text.split('±').map(Number);
  return [value, half];
}

/** Roll inertia of the build as Measure shows it. */
async function rollInertia(page: Page): Promise<number> {
  await page.goto(`${page.url().split('#')[0]}#/measure`);
  await page.getByRole('tab', { name: 'Numbers of the build' }).click();
  return Number(await page.getByLabel('Inertia roll').inputValue());
}

describeInBrowser('Match', (site) => {
  test('a record with doublets corrects the roll inertia of the build, and undo takes it back', async () => {
    const opened = await site.open({ at: '#/match' });
    const { page } = opened;
    await page.getByText('Before anything').waitFor();
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('match-front');
    await drop(page, 'own.csv');
    await page.getByRole('heading', { name: 'What the log says' }).waitFor({ timeout: 120_000 });
    for (const axis of AXES) {
      for (const column of [1, 2, 3]) {
        const [value, half] = await numberOf(page, axis, column);
        // A delay of yaw may hide behind the lead of the rotors' reaction.
        if (axis !== 'yaw' || column !== 3) expect(value, `${axis} ${column}`).toBeGreaterThan(0);
        expect(half, `${axis} ${column}`).toBeGreaterThan(0);
      }
    }
    await opened.shot('match-results');
    await page.getByRole('button', { name: 'Fly them' }).click();
    await page
      .getByText(/the simulation follows/)
      .first()
      .waitFor({ timeout: 120_000 });
    expect(await accessibilityFaults(page)).toEqual([]);
    await page.locator('.match-replay').scrollIntoViewIfNeeded();
    await page.locator('.match-replay figure').nth(1).scrollIntoViewIfNeeded();
    await opened.shot('match-replay');
    await page.getByRole('button', { name: 'Accept the corrected build' }).click();
    await page.getByText(/Shape and Prove now run on it/).waitFor();
    const corrected = await rollInertia(page);
    // The simulated craft that flew was made with this inertia.
    expect(corrected / inertia_kgm2.xx).toBeGreaterThan(1.15);
    expect(corrected / inertia_kgm2.xx).toBeLessThan(1.25);
    await page.keyboard.press('Escape');
    // The sheet says that the log is what it is known from.
    await page.goto(`${page.url().split('#')[0]}#/carry`);
    await page
      .frameLocator('.carry-sheet')
      .getByText(/±[\d.]+ % \(matched to a flight log\)/)
      .first()
      .waitFor({ timeout: 30_000 });
    await page.getByRole('button', { name: /^Undo/ }).click();
    await expect.poll(() => rollInertia(page)).toBeCloseTo(inertia_kgm2.xx, 6);
    // The match is still there when one comes back.
    await page.goto(`${page.url().split('#')[0]}#/match`);
    await page.getByRole('heading', { name: 'What the log says' }).waitFor();
    await opened.close();
  }, 240_000);

  test('a foreign log is mapped, rad/s is noticed and offered, an axis at rest has no numbers', async () => {
    const opened = await site.open({ at: '#/match', width: 1024, height: 768, theme: 'dark' });
    const { page } = opened;
    await drop(page, 'foreign.csv');
    await page.getByRole('heading', { name: 'Which column is what?' }).waitFor();
    const go = page.getByRole('button', { name: 'Read and match' });
    expect(await go.isDisabled()).toBe(true);
    for (const [i, corner] of CORNERS.entries()) {
      await page.getByLabel(`column: motor ${corner}`).selectOption(`out ${'ABCD'[i]}`);
    }
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('match-columns-dark');
    await go.click();
    const offer = page.getByRole('button', { name: /^Take all/ });
    await page.getByRole('heading', { name: 'What the log says' }).waitFor({ timeout: 120_000 });
    await offer.waitFor();
    await opened.shot('match-offers-dark');
    await offer.click();
    await offer.waitFor({ state: 'detached', timeout: 120_000 });
    await page.locator('.match-why', { hasText: 'yaw' }).waitFor({ timeout: 120_000 });
    const [gain, half] = await numberOf(page, 'roll', 1);
    expect(gain).toBeGreaterThan(5);
    expect(half).toBeLessThan(0.1 * gain);
    expect(await page.locator('.match-table tbody tr').nth(2).locator('td').nth(1).innerText()).toMatch(/^–/);
    expect(await accessibilityFaults(page)).toEqual([]);
    await opened.shot('match-results-dark');

    // Junk is refused; what was there stays.
    await drop(page, 'junk.bin.csv');
    await page.getByText(/junk\.bin\.csv.*binary data/).waitFor();
    expect((await numberOf(page, 'roll', 1))[0]).toBe(gain);
    // The same heads again: mapped as confirmed.
    await page.getByRole('button', { name: 'Another log' }).first().click();
    await drop(page, 'foreign.csv');
    await page.getByText(/As confirmed for the last file/).waitFor();
    expect(await page.getByLabel('unit: rate roll').inputValue()).toBe('rad/s');
    await opened.close();
  }, 240_000);

  test('excitation for the firmware: too large a turn is refused with what is allowed; C and table', async () => {
    const opened = await site.open({ at: '#/match' });
    const { page } = opened;
    const part = page.getByRole('region', { name: 'Doublets and sweep for your firmware' });
    await part
      .getByLabel('C function')
      .getByText(/float roll_excitation_dps/)
      .waitFor();
    const amplitude = part.getByRole('textbox', { name: 'Amplitude' });
    await amplitude.fill('140');
    await amplitude.press('Enter');
    await part.getByText(/at most \d+ deg\/s here/).waitFor();
    await amplitude.fill('40');
    await amplitude.press('Enter');
    await part.getByLabel('Given as').selectOption('table');
    await part.getByText(/t_s,setpoint_dps/).waitFor();
    await opened.close();
  }, 120_000);
});
