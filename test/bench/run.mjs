/** `npm run bench`: bundles each benchmark as the program itself is bundled and runs it; prints ratios. */
import { spawnSync } from 'node:child_process';
import { readdirSync } from 'node:fs';
import path from 'node:path';
import { bundle } from '../../src/cli/launch.mjs';
import { root } from '../../src/cli/setup.mjs';

const wanted = process.argv.slice(2);
const files = readdirSync(path.join(root, 'test/bench'))
  .filter((name) => name.endsWith('.bench.ts'))
  .filter((name) => wanted.length === 0 || wanted.some((word) => name.includes(word)));
const folder = await bundle(files.map((name) => `test/bench/${name}`));
for (const name of files) {
  console.log(`--- ${name}`);
  const file = path.join(folder, 'test/bench', name.replace(/\.ts$/, '.js'));
  spawnSync(process.execPath, [file], { cwd: root, stdio: 'inherit' });
}
