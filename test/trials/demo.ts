/** The demo crafts of scenes/, as trials take them. */
import { readFileSync } from 'node:fs';
import path from 'node:path';
import { parseBuild } from '../../src/craft/build.ts';
import { parseGains } from '../../src/craft/gains.ts';
import { root } from '../../src/cli/setup.mjs';
import type { Subject } from '../../src/trials/overrides.ts';

const raw = (name: string): unknown => JSON.parse(readFileSync(path.join(root, 'scenes', name), 'utf8'));

export function demo(name: 'sandpiper' | 'wren'): Subject {
  return { build: parseBuild(raw(`${name}.build.json`)), gains: parseGains(raw(`${name}.gains.json`)) };
}
