/**
 * Browser tests' common ground: the built page served on a free port, a Chromium on it, its console watched,
 * pictures and accessibility checks. Without a Chromium every test here is skipped, with a line that says so.
 */
import { createHash } from 'node:crypto';
import {
  cpSync,
  existsSync,
  mkdirSync,
  readdirSync,
  readFileSync,
  renameSync,
  rmSync,
  statSync,
} from 'node:fs';
import { createRequire } from 'node:module';
import path from 'node:path';
import {
  chromium,
  type Browser,
  type BrowserContext,
  type BrowserContextOptions,
  type Page,
} from 'playwright-core';
import { build, preview, type PreviewServer } from 'vite';
import { afterAll, beforeAll, describe } from 'vitest';
import { findChromium, root } from '../../src/cli/setup.mjs';

const SHOTS = path.join(root, 'test/browser/shots');
const SITES = path.join(root, 'node_modules/.cache/gustbench/sites');
/** A page with every widget and plot, built beside the program for the tests only. */
export const GALLERY = 'test/browser/gallery/index.html';
/** A page with the flight view alone, on an invented path. */
export const VIEW_PAGE = 'test/browser/view/index.html';
const SOURCES = [
  'index.html',
  'vite.config.ts',
  'package-lock.json',
  'src',
  'scenes',
  'public',
  'test/browser/gallery',
  'test/browser/view',
];

export interface OpenOptions {
  /** Where to go, "#/fly"; default the front. */
  readonly at?: string;
  readonly width?: number;
  readonly height?: number;
  readonly theme?: 'light' | 'dark';
  readonly reducedMotion?: boolean;
  /** Messages of the console that this test expects. */
  readonly expectedErrors?: RegExp;
  /** Share storage with another page: pass its context. */
  readonly context?: BrowserContext;
}

/** One page under test. */
export interface Opened {
  readonly page: Page;
  readonly context: BrowserContext;
  /** Console errors, uncaught errors and failed requests so far that were not expected. */
  readonly errors: readonly string[];
  /** Picture under test/browser/shots/ (not kept in the repository). */
  shot(name: string): Promise<void>;
  /** Ends the page. @throws when anything unexpected stood in the console. */
  close(): Promise<void>;
}

export interface Site {
  readonly url: string;
  readonly browser: Browser;
  open(options?: OpenOptions): Promise<Opened>;
  newContext(options?: BrowserContextOptions): Promise<BrowserContext>;
}

/**
 * A block of browser tests: `tests` gets a site that is up by the time a test runs. `flags` go to Chromium
 * ("--disable-3d-apis").
 */
export function describeInBrowser(
  title: string,
  tests: (site: Site) => void,
  flags: readonly string[] = [],
): void {
  const executable = findChromium();
  if (executable === null) {
    describe.skip(`${title} (left out: no Chromium; install it or set CHROMIUM_PATH)`, () =>
      tests(absentSite()));
    return;
  }
  describe(title, () => {
    let server: PreviewServer | null = null;
    let browser: Browser | null = null;
    let url = '';
    beforeAll(async () => {
      const outDir = await builtSite();
      server = await preview({
        root,
        configFile: path.join(root, 'vite.config.ts'),
        logLevel: 'error',
        build: { outDir },
        preview: { port: 0, host: '127.0.0.1', open: false },
      });
      const address = server.httpServer.address();
      if (address === null || typeof address === 'string') throw new Error('the preview server has no port');
      url = `http://127.0.0.1:${address.port}/`;
      browser = await chromium.launch({ executablePath: executable, args: ['--no-sandbox', ...flags] });
    }, 180_000);
    afterAll(async () => {
      await browser?.close();
      await server?.close();
    });
    const running = (): Browser => {
      if (browser === null) throw new Error('the browser is not up yet; use the site inside a test');
      return browser;
    };
    tests({
      get url() {
        return url;
      },
      get browser() {
        return running();
      },
      open: (options = {}) => openPage(running(), url, options),
      newContext: (options = {}) => running().newContext(options),
    });
  });
}

function absentSite(): Site {
  const absent = (): never => {
    throw new Error('no Chromium');
  };
  return { url: '', browser: undefined as never, open: absent, newContext: absent };
}

async function openPage(browser: Browser, url: string, options: OpenOptions): Promise<Opened> {
  const { width = 1440, height = 900, theme = 'light' } = options;
  const own = options.context === undefined;
  const context =
    options.context ??
    (await browser.newContext({
      viewport: { width, height },
      colorScheme: theme,
      reducedMotion: options.reducedMotion === true ? 'reduce' : 'no-preference',
      acceptDownloads: true,
    }));
  const page = await context.newPage();
  const errors: string[] = [];
  const note = (text: string) => {
    if (options.expectedErrors?.test(text) !== true) errors.push(text);
  };
  page.on('console', (message) => {
    if (message.type() === 'error') note(`${message.text()} (${message.location().url})`);
  });
  page.on('pageerror', (error) => note(`uncaught: ${error.stack ?? error.message}`));
  page.on('requestfailed', (request) => {
    if (request.failure()?.errorText !== 'net::ERR_ABORTED') note(`request failed: ${request.url()}`);
  });
  await page.goto(`${url}${options.at ?? ''}`);
  await page.waitForSelector('main');
  return {
    page,
    context,
    errors,
    shot: async (name) => {
      mkdirSync(SHOTS, { recursive: true });
      await page.screenshot({ path: path.join(SHOTS, `${name}.png`) });
    },
    close: async () => {
      await page.close();
      if (own) await context.close();
      if (errors.length > 0) throw new Error(`the page's console was not clean:\n${errors.join('\n')}`);
    },
  };
}

interface AxeViolation {
  readonly id: string;
  readonly impact: string | null;
  readonly help: string;
  readonly nodes: readonly { readonly html: string; readonly failureSummary?: string }[];
}

/** What axe-core calls serious or critical on the page as it stands, one text each. */
export async function accessibilityFaults(page: Page): Promise<string[]> {
  const source = readFileSync(createRequire(import.meta.url).resolve('axe-core/axe.min.js'), 'utf8');
  await page.evaluate(source);
  const violations = await page.evaluate(async () => {
    const axe = (window as unknown as { axe: { run: () => Promise<{ violations: AxeViolation[] }> } }).axe;
    return (await axe.run()).violations;
  });
  return violations
    .filter(({ impact }) => impact === 'serious' || impact === 'critical')
    .map(
      ({ id, help, nodes }) =>
        `${id}: ${help}\n${nodes.map((node) => `  ${node.html}\n  ${node.failureSummary ?? ''}`).join('\n')}`,
    );
}

/** Builds the page once for each state of the sources; further test files find it ready. */
async function builtSite(): Promise<string> {
  const folder = path.join(SITES, sourceHash());
  if (existsSync(path.join(folder, 'index.html'))) return folder;
  const aside = `${folder}.${process.pid}`;
  await build({
    root,
    configFile: path.join(root, 'vite.config.ts'),
    logLevel: 'error',
    build: {
      outDir: aside,
      emptyOutDir: true,
      rollupOptions: { input: ['index.html', GALLERY, VIEW_PAGE].map((page) => path.join(root, page)) },
    },
  });
  dropOldSites();
  try {
    renameSync(aside, folder);
  } catch {
    // Another test file was first; or the folder cannot be renamed over: use what is there.
    if (!existsSync(path.join(folder, 'index.html'))) cpSync(aside, folder, { recursive: true });
    rmSync(aside, { recursive: true, force: true });
  }
  return folder;
}

const OLD_AFTER_MS = 30 * 60_000;

function dropOldSites(): void {
  for (const name of readdirSync(SITES)) {
    const folder = path.join(SITES, name);
    if (Date.now() - statSync(folder).mtimeMs > OLD_AFTER_MS)
      rmSync(folder, { recursive: true, force: true });
  }
}

function sourceHash(): string {
  const hash = createHash('sha256');
  const visit = (file: string): void => {
    if (!existsSync(file)) return;
    const stat = statSync(file);
    if (stat.isDirectory())
      readdirSync(file)
        .sort()
        .forEach((name) => visit(path.join(file, name)));
    else hash.update(`${file}:${stat.size}:${stat.mtimeMs}\n`);
  };
  for (const source of SOURCES) visit(path.join(root, source));
  return hash.digest('hex').slice(0, 16);
}
