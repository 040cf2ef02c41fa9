import { expect, test } from 'vitest';
import { accessibilityFaults, describeInBrowser, type Opened } from './harness.ts';

const PLACES = ['measure', 'shape', 'fly', 'prove', 'match', 'carry'] as const;
const title = (place: string) => place[0].toUpperCase() + place.slice(1);

async function savedNow({ page }: Opened): Promise<void> {
  await page.waitForSelector('.save-state[data-kind="saved"]');
}

/** Opens Work, gives `name` and `content` to its file field. */
async function giveFile({ page }: Opened, name: string, content: string): Promise<void> {
  await page.keyboard.press('Alt+KeyW');
  await page
    .locator('dialog input[type="file"]')
    .setInputFiles({ name, mimeType: 'application/json', buffer: Buffer.from(content) });
}

describeInBrowser('The frame', (site) => {
  test('every place opens by its link and by its key', async () => {
    const opened = await site.open();
    const { page } = opened;
    for (const [i, place] of PLACES.entries()) {
      await page.keyboard.press(`Alt+Digit${i + 1}`);
      await page.waitForFunction((wanted) => document.title.startsWith(wanted), title(place));
      expect(await page.locator('.rail a[aria-current="page"]').innerText()).toBe(title(place));
    }
    for (const place of PLACES) {
      await page.goto(`${site.url}#/${place}`);
      await page.waitForFunction((wanted) => document.title.startsWith(wanted), title(place));
    }
    await opened.close();
  });

  test('the theme follows the system until it is chosen', async () => {
    const opened = await site.open({ theme: 'dark' });
    const { page } = opened;
    const shown = () => page.evaluate(() => document.documentElement.dataset.theme);
    expect(await shown()).toBe('dark');
    await page.emulateMedia({ colorScheme: 'light' });
    await expect.poll(shown).toBe('light');
    await page.keyboard.press('Alt+KeyS');
    await page.getByLabel('Appearance').selectOption('contrast');
    expect(await shown()).toBe('contrast');
    await opened.shot('shell-settings-contrast');
    await opened.close();
  });

  test('place, craft, theme and gains come back after a reload', async () => {
    const opened = await site.open({ at: '#/shape' });
    const { page } = opened;
    await page.locator('#top-craft').selectOption({ label: 'Wren' });
    await page.keyboard.press('Alt+KeyS');
    await page.getByLabel('Appearance').selectOption('dark');
    await page.keyboard.press('Escape');
    await page.keyboard.press('Alt+KeyW');
    await page.getByRole('button', { name: 'Copy A to B' }).click();
    await page.keyboard.press('Escape');
    await savedNow(opened);
    await page.goto(site.url);
    await page.reload();
    await page.waitForSelector('.frame');
    expect(await page.title()).toContain('Shape');
    expect(await page.locator('.save-state').innerText(), 'nothing is unwritten').toBe('saved');
    expect(await page.locator('#top-craft option:checked').innerText()).toBe('Wren');
    expect(await page.locator('[data-item="gains"] option').count()).toBe(2);
    expect(await page.evaluate(() => document.documentElement.dataset.theme)).toBe('dark');
    await opened.close();
  });

  test('an edit is undone and done again by key', async () => {
    const opened = await site.open({ at: '#/carry' });
    const { page } = opened;
    await page.keyboard.press('Alt+KeyW');
    const name = page.getByLabel('Rename');
    await name.fill('Heron');
    await name.press('Enter');
    await page.keyboard.press('Escape');
    const craft = () => page.locator('#top-craft option:checked').innerText();
    expect(await craft()).toBe('Heron');
    await page.keyboard.press('Control+KeyZ');
    expect(await craft()).toBe('Sandpiper');
    await page.keyboard.press('Control+Shift+KeyZ');
    expect(await craft()).toBe('Heron');
    await opened.close();
  });

  test('saved gain sets keep their notes, say how they differ, come back, and every step can be undone', async () => {
    const opened = await site.open({ at: '#/carry' });
    const { page } = opened;
    const save = async (note: string) => {
      await page.getByLabel('Note', { exact: true }).fill(note);
      await page.getByRole('button', { name: 'Save these gains' }).click();
    };
    const changeLoop = async (hertz: string) => {
      await page.keyboard.press('Escape');
      await page.keyboard.press('Alt+Digit2');
      const field = page.getByRole('textbox', { name: 'Loop rate' }).first();
      await field.fill(hertz);
      await field.press('Enter');
      await page.keyboard.press('Alt+KeyW');
    };
    await page.keyboard.press('Alt+KeyW');
    await save('as it came');
    await changeLoop('500');
    const row = page.locator('dialog tr', { hasText: 'as it came' });
    expect(await row.innerText()).toMatch(/loop_Hz\s+400 → 500/);
    await save('faster loop');
    expect(await page.locator('dialog tr', { hasText: 'faster loop' }).innerText()).toContain('nothing');
    await opened.shot('work-history');
    await row.getByRole('button', { name: 'Bring back' }).click();
    await page.keyboard.press('Escape');
    const loop = () => page.locator('[data-item="loop"]').innerText();
    expect(await loop()).toContain('400');
    // Back through every step to where it began, by the button.
    const seen: string[] = [];
    for (let i = 0; i < 4; i++) {
      await page.getByRole('button', { name: 'Undo' }).click();
      seen.push(/\d+/.exec((await loop()).replace('Loop', ''))?.[0] ?? '');
    }
    expect(seen).toEqual(['500', '500', '400', '400']);
    expect(await page.getByRole('button', { name: 'Undo' }).isDisabled()).toBe(true);
    await opened.close();
  });

  test('a wrong file says what is wrong and the old build stays', async () => {
    const opened = await site.open({ at: '#/carry' });
    const { page } = opened;
    await giveFile(
      opened,
      'bad.json',
      '{"format":"gustbench.build/1","name":"Bad","airframe":{"mass_kg":-3}}',
    );
    const notice = page.locator('dialog .notice.error');
    await notice.waitFor();
    expect(await notice.innerText()).toContain('airframe.mass_kg');
    await opened.shot('shell-work-refused');
    for (const junk of [
      '{"format":"gustbench.build/9"}',
      '{"a":',
      '[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[',
      'PK\u0003\u0004 no archive',
    ]) {
      await page.locator('dialog input[type="file"]').setInputFiles({
        name: 'junk.json',
        mimeType: 'application/json',
        buffer: Buffer.from(junk),
      });
      await page.locator('dialog .notice.error', { hasText: 'junk.json' }).waitFor();
    }
    await page.keyboard.press('Escape');
    expect(await page.locator('#top-craft option').allInnerTexts()).toEqual(['Sandpiper', 'Wren']);
    await opened.close();
  });

  test('an exported archive brings everything back under new names', async () => {
    const opened = await site.open({ at: '#/carry' });
    const { page } = opened;
    await page.keyboard.press('Alt+KeyW');
    const [download] = await Promise.all([
      page.waitForEvent('download'),
      page.getByRole('button', { name: 'Export everything' }).click(),
    ]);
    await page.locator('dialog input[type="file"]').setInputFiles(
      await download.path().then(async (file) => {
        const { readFile } = await import('node:fs/promises');
        return { name: 'all.zip', mimeType: 'application/zip', buffer: await readFile(file) };
      }),
    );
    await expect
      .poll(() => page.locator('#top-craft option').allInnerTexts())
      .toEqual(['Sandpiper', 'Wren', 'Sandpiper 2', 'Wren 2']);
    await opened.close();
  });

  test('two windows: an edit in one arrives in the other', async () => {
    const context = await site.newContext();
    const one = await site.open({ context, at: '#/carry' });
    const two = await site.open({ context, at: '#/carry' });
    await one.page.keyboard.press('Alt+KeyW');
    await one.page.getByLabel('Rename').fill('Heron');
    await one.page.getByLabel('Rename').press('Enter');
    await expect.poll(() => two.page.locator('#top-craft option').allInnerTexts()).toContain('Heron');
    await one.close();
    await two.close();
    await context.close();
  });

  test('a place that cannot be loaded says so, the others go on, and it loads later', async () => {
    const opened = await site.open({
      at: '#/measure',
      expectedErrors: /carry-.*\.js|Failed to load resource/,
    });
    const { page } = opened;
    await page.route('**/assets/carry-*.js', (route) => route.abort('failed'));
    await page.keyboard.press('Alt+Digit6');
    await page.getByRole('heading', { name: 'Carry could not be loaded' }).waitFor();
    await opened.shot('shell-place-failed');
    await page.keyboard.press('Alt+Digit2');
    await page.waitForFunction(() => document.title.startsWith('Shape'));
    await page.unroute('**/assets/carry-*.js');
    await page.keyboard.press('Alt+Digit6');
    await page.waitForFunction(() => document.querySelector('.state.failed') === null);
    await opened.close();
  });

  test('the guide leads from the demo to an own craft, stays where it was left, goes and comes back', async () => {
    const opened = await site.open({ width: 1024, height: 768 });
    const { page } = opened;
    const guide = page.getByRole('complementary', { name: 'Guide' });
    const next = () => guide.getByRole('button', { name: 'Next step' }).click();
    await guide.getByText('Guide 1 of 9').waitFor();
    expect(await page.title()).toContain('Fly');
    await next();
    await next();
    await page.waitForFunction(() => document.title.startsWith('Shape'));
    await opened.shot('guide-shape');
    // Elsewhere it says where it goes on.
    await page.keyboard.press('Alt+Digit6');
    await guide.getByRole('button', { name: 'Go to Shape' }).click();
    await next();
    await next();
    await page.waitForFunction(() => document.title.startsWith('Measure'));
    const demo = await page.locator('#top-craft option').allInnerTexts();
    await guide.getByRole('button', { name: 'Start my craft' }).click();
    await guide.getByText('Guide 6 of 9').waitFor();
    expect(await page.locator('#top-craft option:checked').innerText()).toBe('My craft');
    expect(await page.locator('#top-craft option').allInnerTexts()).toEqual([...demo, 'My craft']);
    await savedNow(opened);
    await page.reload();
    await guide.getByText('Guide 6 of 9').waitFor();
    for (const place of ['Shape', 'Fly', 'Carry']) {
      await next();
      await page.waitForFunction((wanted) => document.title.startsWith(wanted), place);
    }
    await guide.getByRole('button', { name: 'Guide done' }).click();
    expect(await guide.count()).toBe(0);
    await savedNow(opened);
    await page.reload();
    await page.waitForSelector('.carry-sheet');
    expect(await guide.count()).toBe(0);
    await page.keyboard.press('Alt+KeyH');
    await page.getByRole('heading', { name: 'Here: Carry' }).waitFor();
    await page.getByRole('button', { name: 'Start the guide' }).click();
    await guide.getByText('Guide 1 of 9').waitFor();
    await opened.close();
  });

  test('an error that nothing caught becomes a message and the page goes on', async () => {
    const opened = await site.open({ at: '#/carry', expectedErrors: /made up for this test/ });
    const { page } = opened;
    await page.evaluate(() => {
      setTimeout(() => {
        throw new Error('made up for this test');
      });
    });
    await page.locator('.notice.error', { hasText: 'made up for this test' }).waitFor();
    await page.keyboard.press('Alt+Digit2');
    await page.waitForFunction(() => document.title.startsWith('Shape'));
    await opened.close();
  });

  test('the frame and Carry work by keyboard alone', async () => {
    const opened = await site.open({ at: '#/carry' });
    const { page } = opened;
    const focused = () =>
      page.evaluate(() => {
        const at = document.activeElement;
        return [at?.getAttribute('aria-label'), at?.textContent, at?.getAttribute('title')].find(Boolean);
      });
    await page.waitForSelector('.carry-sheet');
    await page.keyboard.press('Tab');
    expect(await focused()).toBe('Skip to the place');
    await page.keyboard.press('Enter');
    expect(await focused()).toBe('Carry');
    await page.keyboard.press('Tab');
    expect(await focused()).toMatch(/^Run the sheet/);
    // Back through the whole frame: every step lands somewhere that says its name.
    const seen = new Set<string>();
    for (let i = 0; i < 24; i++) {
      await page.keyboard.press('Shift+Tab');
      const name = await focused();
      expect(name, `step ${i} back`).toBeTruthy();
      seen.add(name ?? '');
    }
    for (const name of ['Help', 'Settings', 'Work', 'Craft', 'Carry', 'Measure', 'Hide guide'])
      expect(
        [...seen].some((one) => one.includes(name)),
        name,
      ).toBe(true);
    const ring = await page.evaluate(() => {
      const link = document.querySelector<HTMLElement>('.rail a');
      link?.focus();
      return link === null ? '' : getComputedStyle(link).outlineStyle;
    });
    expect(ring).not.toBe('none');
    await opened.close();
  });

  test('with reduced motion nothing moves by itself', async () => {
    const opened = await site.open({ at: '#/carry', reducedMotion: true });
    const { page } = opened;
    expect(await page.evaluate(() => document.documentElement.dataset.motion)).toBe('reduced');
    await page.keyboard.press('Alt+KeyH');
    await page.waitForSelector('dialog[open]');
    expect(await page.evaluate(() => document.getAnimations().length)).toBe(0);
    await opened.close();
  });

  test('no place scrolls sideways at 1024 × 768 and on a tablet held upright', async () => {
    const opened = await site.open({ width: 1024, height: 768 });
    const { page } = opened;
    for (const [width, height] of [
      [1024, 768],
      [768, 1024],
    ]) {
      await page.setViewportSize({ width, height });
      for (const [i, place] of PLACES.entries()) {
        await page.keyboard.press(`Alt+Digit${i + 1}`);
        await page.waitForFunction((wanted) => document.title.startsWith(wanted), title(place));
        await page.waitForTimeout(500);
        const over = await page.evaluate(() =>
          [document.documentElement, document.querySelector('#place')].map((box) =>
            box === null ? NaN : box.scrollWidth - box.clientWidth,
          ),
        );
        expect(over, `${place} at ${width} × ${height}`).toEqual([0, 0]);
        await opened.shot(`place-${place}-${width}`);
      }
    }
    await opened.close();
  });

  for (const theme of ['light', 'dark', 'contrast'] as const) {
    test(`nothing serious by axe in any place, ${theme}`, async () => {
      const opened = await site.open(theme === 'contrast' ? {} : { theme });
      const { page } = opened;
      if (theme === 'contrast') {
        await page.keyboard.press('Alt+KeyS');
        await page.getByLabel('Appearance').selectOption('contrast');
        await page.keyboard.press('Escape');
      }
      for (const [i, place] of PLACES.entries()) {
        await page.keyboard.press(`Alt+Digit${i + 1}`);
        await page.waitForFunction((wanted) => document.title.startsWith(wanted), title(place));
        await page.waitForTimeout(700);
        expect(await accessibilityFaults(page), place).toEqual([]);
        await opened.shot(`place-${place}-${theme}`);
      }
      await opened.close();
    });
  }

  for (const theme of ['light', 'dark'] as const) {
    for (const [width, height] of [
      [1440, 900],
      [1024, 768],
      [768, 1024],
    ]) {
      test(`nothing serious by axe and nothing cut off, ${theme}, ${width} × ${height}`, async () => {
        const opened = await site.open({ at: '#/carry', theme, width, height });
        const { page } = opened;
        await savedNow(opened);
        expect(await accessibilityFaults(page)).toEqual([]);
        await opened.shot(`shell-${theme}-${width}`);
        // The dialogs are one column: the widest and the narrowest screen tell all.
        for (const key of width === 1024 ? [] : ['KeyW', 'KeyH', 'KeyS']) {
          await page.keyboard.press(`Alt+${key}`);
          await page.waitForSelector('dialog[open]');
          expect(await accessibilityFaults(page)).toEqual([]);
          await opened.shot(`shell-${theme}-${width}-${key}`);
          await page.keyboard.press('Escape');
        }
        const wide = await page.evaluate(() => document.documentElement.scrollWidth - innerWidth);
        expect(wide).toBeLessThanOrEqual(0);
        await opened.close();
      });
    }
  }
});
