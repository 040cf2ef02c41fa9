/**
 * A thousand rounds of edit, kill, reload in a real browser: nothing that was acknowledged as saved may be lost.
 * Most rounds kill the page's process; every twentieth kills the whole browser. GUSTBENCH_ROUNDS=100 for fewer.
 */
import { spawn, type ChildProcess } from 'node:child_process';
import path from 'node:path';
import { chromium, type BrowserContext } from 'playwright-core';
import { findChromium } from '../../src/cli/setup.mjs';
import { RandomStream } from '../../src/math/random.ts';
import { killPage, KillRounds } from '../browser/killRounds.ts';
import { serveBuilt } from './site.ts';

const ROUNDS = Number(process.env.GUSTBENCH_ROUNDS ?? 1000);
const WHOLE_BROWSER_EVERY = 20;

interface Running {
  readonly process: ChildProcess;
  readonly context: BrowserContext;
}

/** A browser of its own on `profile`, which outlives it. */
function launch(executable: string, profile: string): ChildProcess {
  return spawn(
    executable,
    [
      '--headless=new',
      '--no-sandbox',
      '--no-first-run',
      '--remote-debugging-port=0',
      `--user-data-dir=${profile}`,
    ],
    // A process group of its own, so that a kill takes the browser's helpers too.
    { stdio: ['ignore', 'ignore', 'pipe'], detached: true },
  );
}

async function connected(child: ChildProcess): Promise<Running> {
  const address = await new Promise<string>((resolve, reject) => {
    let said = '';
    child.stderr?.on('data', (piece: Buffer) => {
      said += piece.toString();
      const found = /DevTools listening on (ws:\S+)/.exec(said);
      if (found !== null) resolve(found[1]);
    });
    child.once('exit', () => reject(new Error(`the browser ended: ${said}`)));
  });
  const browser = await chromium.connectOverCDP(address, { timeout: 30_000 });
  const [context] = browser.contexts();
  context.setDefaultTimeout(60_000);
  return { process: child, context };
}

/** At once and whole: the browser and every process it started. */
async function killBrowser(child: ChildProcess): Promise<void> {
  if (child.exitCode !== null || child.signalCode !== null) return;
  const gone = new Promise((resolve) => child.once('exit', resolve));
  if (child.pid !== undefined) process.kill(-child.pid, 'SIGKILL');
  await gone;
}

const MOST_STARTS = 3;

/** A browser that does not come up on a busy machine is killed and started again. */
async function startSurely(executable: string, profile: string): Promise<Running> {
  for (let attempt = 1; ; attempt++) {
    const child = launch(executable, profile);
    try {
      return await connected(child);
    } catch (error) {
      await killBrowser(child);
      if (attempt === MOST_STARTS) throw error;
      console.log('the browser did not come up; started again');
    }
  }
}

async function run(executable: string, url: string, profile: string): Promise<void> {
  const rounds = new KillRounds(url, new RandomStream(20, 'kills'), 'Sandpiper');
  let running = await startSurely(executable, profile);
  let browsersKilled = 0;
  const begun = performance.now();
  for (let n = 1; n <= ROUNDS; n++) {
    const whole = n % WHOLE_BROWSER_EVERY === 0;
    try {
      await rounds.round(running.context, whole ? () => killBrowser(running.process) : killPage);
    } catch (error) {
      // A browser that answers no more on a busy machine: another kill, and the next page must find the work.
      console.log(`round ${n} broke off: ${String(error).split('\n')[0]}`);
      await killBrowser(running.process);
    }
    if (running.process.exitCode !== null || running.process.signalCode !== null) {
      browsersKilled++;
      running = await startSurely(executable, profile);
    }
    if (n % 50 === 0) console.log(`${n} rounds, ${Math.round((performance.now() - begun) / 1000)} s`);
  }
  await killBrowser(running.process);
  const { edits, acknowledged, losses } = rounds.tally;
  console.log(
    `${ROUNDS} rounds (${browsersKilled} with the whole browser), ${edits} edits, ${acknowledged} acknowledged before a kill, ${losses.length} lost; ${Math.round((performance.now() - begun) / 1000)} s`,
  );
  for (const loss of losses) console.log(loss);
  if (losses.length > 0) process.exitCode = 1;
}

const executable = findChromium();
if (executable === null) console.log('left out: no Chromium');
else {
  const site = await serveBuilt();
  await run(executable, site.url, path.join(site.folder, 'profile'));
  await site.close();
}
