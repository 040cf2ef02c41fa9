/**
 * Rounds of edit, kill, reload: random edits at random moments, then the page dies without a word, and the next
 * one must find what was acknowledged as saved, or a later edit. One class, for the test and the long run.
 */
import type { BrowserContext, Page } from 'playwright-core';
import type { RandomStream } from '../../src/math/random.ts';

/** A save follows an edit within 300 ms: kills fall before, during and after it. */
const LONGEST_WAIT_MS = 220;
const MOST_EDITS = 3;

export interface RoundTally {
  readonly rounds: number;
  readonly edits: number;
  /** Edits that the page had called saved before it was killed. */
  readonly acknowledged: number;
  /** What a page found that it must not have found; empty when nothing was lost. */
  readonly losses: readonly string[];
}

export class KillRounds {
  private rounds = 0;
  private edits = 0;
  private acknowledgements = 0;
  private readonly losses: string[] = [];
  /** Names that the next page may find: the last one acknowledged and those given after it. */
  private possible: string[];

  constructor(
    private readonly url: string,
    private readonly random: RandomStream,
    firstName: string,
  ) {
    this.possible = [firstName];
  }

  get tally(): RoundTally {
    return {
      rounds: this.rounds,
      edits: this.edits,
      acknowledged: this.acknowledgements,
      losses: this.losses,
    };
  }

  /** One life of a page, to be ended by `kill`. */
  async round(context: BrowserContext, kill: (page: Page) => Promise<void>): Promise<void> {
    const page = await context.newPage();
    await page.goto(`${this.url}#/match`);
    await page.waitForSelector('.frame');
    await this.look(page);
    await page.keyboard.press('Alt+KeyW');
    const edits = 1 + Math.floor(this.random.uniform() * MOST_EDITS);
    for (let i = 0; i < edits; i++) {
      const name = `Craft ${this.rounds}-${i}`;
      await page.getByLabel('Rename').fill(name);
      await page.getByLabel('Rename').press('Enter');
      this.possible.push(name);
      this.edits++;
      await page.waitForTimeout(this.random.uniform() * LONGEST_WAIT_MS);
      await this.noteIfSaved(page, name);
    }
    this.rounds++;
    await kill(page);
  }

  /** Compares what the page opened with to what it may have. */
  async look(page: Page): Promise<void> {
    const found = (await page.locator('#top-craft option:checked').textContent()) ?? '';
    if (!this.possible.includes(found)) {
      this.losses.push(`round ${this.rounds}: found “${found}”, not one of ${this.possible.join(', ')}`);
    }
    this.possible = [found];
  }

  private async noteIfSaved(page: Page, name: string): Promise<void> {
    const kind = await page.locator('.save-state').getAttribute('data-kind');
    if (kind !== 'saved') return;
    this.possible = [name];
    this.acknowledgements++;
  }
}

/** Ends a page's process at once: no unload, no last save. */
export async function killPage(page: Page): Promise<void> {
  const session = await page.context().newCDPSession(page);
  const crashed = new Promise((resolve) => page.once('crash', resolve));
  session.send('Page.crash').catch(() => undefined);
  await crashed;
  await page.close();
}
