/**
 * Installs what is missing before anything else runs: plain JavaScript with no dependency, because nothing is
 * there yet on a fresh machine.
 */
import { spawnSync } from 'node:child_process';
import { createHash } from 'node:crypto';
import { existsSync, readFileSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import { fileURLToPath } from 'node:url';

export const root = path.resolve(path.dirname(fileURLToPath(import.meta.url)), '../..');
const mark = path.join(root, 'node_modules', '.gustbench-installed');

function lockHash() {
  return createHash('sha256')
    .update(readFileSync(path.join(root, 'package-lock.json')))
    .digest('hex');
}

/** Installs the locked packages when they are missing or the lock file changed. */
export function ensurePackages() {
  const wanted = lockHash();
  if (existsSync(mark) && readFileSync(mark, 'utf8') === wanted) return;
  process.stderr.write('installing packages (once, about a minute) …\n');
  const done = spawnSync('npm', ['ci', '--no-audit', '--no-fund'], { cwd: root, stdio: ['ignore', 2, 2] });
  if (done.status !== 0) {
    process.stderr.write(
      'npm ci failed; see the lines above. A network to the package registry is needed once.\n',
    );
    process.exit(done.status ?? 1);
  }
  writeFileSync(mark, wanted);
}

/** A Chromium for the browser tests, or null. */
export function findChromium() {
  const candidates = [
    process.env.CHROMIUM_PATH,
    '/usr/bin/chromium',
    '/usr/bin/chromium-browser',
    '/usr/bin/google-chrome',
    '/Applications/Chromium.app/Contents/MacOS/Chromium',
    '/Applications/Google Chrome.app/Contents/MacOS/Google Chrome',
  ];
  return candidates.find((file) => file !== undefined && existsSync(file)) ?? null;
}

/** Finds Chromium, installing Debian's package when that can be done; says plainly when it cannot. */
export function ensureChromium() {
  const found = findChromium();
  if (found !== null) return found;
  const canInstall = existsSync('/usr/bin/apt-get') && process.getuid?.() === 0;
  if (canInstall) {
    process.stderr.write('installing Chromium from Debian for the browser tests …\n');
    const quiet = {
      stdio: ['ignore', 'ignore', 2],
      env: { ...process.env, DEBIAN_FRONTEND: 'noninteractive' },
    };
    spawnSync('apt-get', ['update', '-qq'], quiet);
    spawnSync('apt-get', ['install', '-y', '-qq', '--no-install-recommends', 'chromium'], quiet);
  }
  const now = findChromium();
  if (now === null) {
    process.stderr.write(
      'No Chromium here: the tests in test/browser are left out. Install it (Debian: apt-get install chromium) ' +
        'or set CHROMIUM_PATH to one, then run npm test again.\n',
    );
  }
  return now;
}
