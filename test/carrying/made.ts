/** Results as trials give them, made up: for what the sheet does with them. */
import { readFileSync } from 'node:fs';
import path from 'node:path';
import { root } from '../../src/cli/setup.mjs';
import { parseBuild } from '../../src/craft/build.ts';
import { parseGains } from '../../src/craft/gains.ts';
import { trialByName } from '../../src/trials/registry.ts';
import type { TrialResult } from '../../src/trials/trial.ts';

const scene = (name: string): Record<string, unknown> =>
  JSON.parse(readFileSync(path.join(root, 'scenes', name), 'utf8')) as Record<string, unknown>;

export const demoBuild = (craft = 'sandpiper') => parseBuild(scene(`${craft}.build.json`));
export const demoGains = (craft = 'sandpiper') => parseGains(scene(`${craft}.gains.json`));

/** A build and gains with everything as long as the files allow. */
export function longest() {
  const build = parseBuild({ ...scene('sandpiper.build.json'), name: 'Wide name '.repeat(12).trim() });
  const gains = parseGains({
    ...scene('sandpiper.gains.json'),
    name: 'Another long name '.repeat(6).trim(),
    notches: Array.from({ length: 6 }, (_, n) => ({ centre_Hz: 101.25 + 10 * n, q: 3.375 })),
  });
  return { build, gains };
}

/** A result of `trial` with every score inside or outside its band. */
export function madeResult(trial: string, pass: boolean, seed = 1): TrialResult {
  const { title, parameters, scores, traceSignals } = trialByName(trial);
  return {
    trial,
    title,
    seed,
    parameters: Object.fromEntries(Object.entries(parameters).map(([name, { value }]) => [name, value])),
    scores: scores.map(({ name, unit, band, source }) => {
      const open = band.most === undefined && band.least === undefined;
      const edge = band.most ?? band.least ?? 1;
      const beyond = band.most === undefined ? 0.5 * edge : 1.2345 * edge;
      return { name, unit, value: pass ? edge : beyond, applies: true, band, source, pass: pass || open };
    }),
    pass,
    stopped: null,
    note: null,
    traceSignals,
  };
}
