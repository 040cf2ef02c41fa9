/** The built page on a free port, for the benchmarks and the manual's pictures. */
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { build, preview } from 'vite';

export interface BuiltSite {
  readonly url: string;
  /** Of this run alone, gone after `close`. */
  readonly folder: string;
  close(): Promise<void>;
}

export async function serveBuilt(): Promise<BuiltSite> {
  const folder = mkdtempSync(path.join(tmpdir(), 'gustbench-site-'));
  const outDir = path.join(folder, 'site');
  await build({ logLevel: 'error', build: { outDir, emptyOutDir: true } });
  const server = await preview({
    logLevel: 'error',
    build: { outDir },
    preview: { port: 0, host: '127.0.0.1' },
  });
  const address = server.httpServer.address();
  if (address === null || typeof address === 'string') throw new Error('the preview server has no port');
  return {
    url: `http://127.0.0.1:${address.port}/`,
    folder,
    close: async () => {
      await server.close();
      rmSync(folder, { recursive: true, force: true });
    },
  };
}
