/** `npm test`: installs what is missing (packages, Chromium where it can), then runs every test. */
import { spawnSync } from 'node:child_process';
import path from 'node:path';
import { ensureChromium, ensurePackages, root } from '../src/cli/setup.mjs';

ensurePackages();
const chromium = ensureChromium();
const env = { ...process.env, ...(chromium === null ? {} : { CHROMIUM_PATH: chromium }) };
const vitest = path.join(root, 'node_modules', 'vitest', 'vitest.mjs');
const done = spawnSync(process.execPath, [vitest, 'run', ...process.argv.slice(2)], {
  cwd: root,
  stdio: 'inherit',
  env,
});
process.exit(done.status ?? 1);
