/**
 * A thousand rounds of edit, kill, reload in a real browser: nothing that was acknowledged as saved may be lost.
 * Most rounds kill the page's process; every twentieth kills the whole browser. GUSTBENCH_ROUNDS=100 for fewer.
 */
import { spawn, type ChildProcess } from 'node:child_process';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { chromium, type BrowserContext, type Page } from 'playwright-core';
import { build, preview } from 'vite';
import { findChromium } from '../../src/cli/setup.mjs';
import { RandomStream } from '../../src/math/random.ts';
import { killPage, KillRounds } from '../browser/killRounds.ts';

const ROUNDS = Number(process.env.GUSTBENCH_ROUNDS ?? 1000);
const WHOLE_BROWSER_EVERY = 20;

interface Running {
  readonly process: ChildProcess;
  readonly context: BrowserContext;
}

/** A browser of its own on `profile`, which outlives it. */
async function startBrowser(executable: string, profile: string): Promise<Running> {
  const child = spawn(
    executable,
    [
      '--headless=new',
      '--no-sandbox',
      '--no-first-run',
      '--remote-debugging-port=0',
      `--user-data-dir=${profile}`,
    ],
    { stdio: ['ignore', 'ignore', 'pipe'] },
  );
  const address = await new Promise<string>((resolve, reject) => {
    let said = '';
    child.stderr?.on('data', (piece: Buffer) => {
      said += piece.toString();
      const found = /DevTools listening on (ws:\S+)/.exec(said);
      if (found !== null) resolve(found[1]);
    });
    child.once('exit', () => reject(new Error(`the browser ended: ${said}`)));
  });
  const browser = await chromium.connectOverCDP(address, { timeout: 120_000 });
  const [context] = browser.contexts();
  context.setDefaultTimeout(120_000);
  return { process: child, context };
}

async function killBrowser({ process }: Running): Promise<void> {
  const gone = new Promise((resolve) => process.once('exit', resolve));
  process.kill('SIGKILL');
  await gone;
}

async function run(executable: string, url: string, profile: string): Promise<void> {
  const rounds = new KillRounds(url, new RandomStream(20, 'kills'), 'Sandpiper');
  let running = await startBrowser(executable, profile);
  let browsersKilled = 0;
  const begun = performance.now();
  for (let n = 1; n <= ROUNDS; n++) {
    if (n % WHOLE_BROWSER_EVERY !== 0) await rounds.round(running.context, killPage);
    else {
      await rounds.round(running.context, async (_page: Page) => killBrowser(running));
      browsersKilled++;
      running = await startBrowser(executable, profile);
    }
    if (n % 50 === 0) console.log(`${n} rounds, ${Math.round((performance.now() - begun) / 1000)} s`);
  }
  await killBrowser(running);
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
  const folder = mkdtempSync(path.join(tmpdir(), 'gustbench-keep-'));
  const outDir = path.join(folder, 'site');
  await build({ logLevel: 'error', build: { outDir, emptyOutDir: true } });
  const server = await preview({
    logLevel: 'error',
    build: { outDir },
    preview: { port: 0, host: '127.0.0.1' },
  });
  const address = server.httpServer.address();
  const url = address === null || typeof address === 'string' ? '' : `http://127.0.0.1:${address.port}/`;
  await run(executable, url, path.join(folder, 'profile'));
  await server.close();
  rmSync(folder, { recursive: true, force: true });
}
