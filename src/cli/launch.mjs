/**
 * Starts the command line: bundles src/cli/main.ts (a tenth of a second, kept under node_modules by content)
 * and runs it. One bundle runs half as fast again as the same modules loaded one by one.
 */
import { createHash } from 'node:crypto';
import { existsSync, mkdirSync, renameSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import { pathToFileURL } from 'node:url';
import { ensurePackages, root } from './setup.mjs';

/** Bundles `entries` for node into the cache; returns their folder. */
export async function bundle(entries) {
  const { build } = await import('esbuild');
  const result = await build({
    entryPoints: entries.map((entry) => path.join(root, entry)),
    absWorkingDir: root,
    bundle: true,
    minifySyntax: true,
    platform: 'node',
    target: 'node20',
    format: 'esm',
    outdir: 'out',
    outbase: root,
    write: false,
    logLevel: 'silent',
    external: ['mujoco-js', 'vite', 'playwright-core'],
    banner: {
      js: "import { createRequire as makeRequire } from 'node:module'; const require = makeRequire(import.meta.url);",
    },
  });
  const hash = createHash('sha256');
  for (const file of result.outputFiles) hash.update(file.contents);
  const cache = path.join(root, 'node_modules', '.cache', 'gustbench');
  const folder = path.join(cache, hash.digest('hex').slice(0, 16));
  if (!existsSync(folder)) {
    // Written aside and renamed, so that two commands at once never see half a bundle.
    const aside = `${folder}.${process.pid}`;
    for (const file of result.outputFiles) {
      const target = path.join(aside, path.relative(path.join(root, 'out'), file.path));
      mkdirSync(path.dirname(target), { recursive: true });
      writeFileSync(target, file.contents);
    }
    try {
      renameSync(aside, folder);
    } catch (error) {
      if (!existsSync(folder)) throw error;
    }
  }
  return folder;
}

if (process.argv[1] === new URL(import.meta.url).pathname) {
  ensurePackages();
  const folder = await bundle(['src/cli/main.ts']);
  await import(pathToFileURL(path.join(folder, 'src/cli/main.js')).href);
}
