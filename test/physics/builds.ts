/** Builds for tests: the demo craft with single fields changed, and a bare body without aerodynamics. */
import { readFileSync } from 'node:fs';
import { parseBuild, type Build } from '../../src/craft/build.ts';
import { parseGains, type Gains } from '../../src/craft/gains.ts';

function read(name: string): unknown {
  return JSON.parse(readFileSync(new URL(`../../scenes/${name}`, import.meta.url), 'utf8'));
}

export const demoBuild = (name: 'sandpiper' | 'wren'): Build => parseBuild(read(`${name}.build.json`));
export const demoGains = (name: 'sandpiper' | 'wren'): Gains => parseGains(read(`${name}.gains.json`));
export const rawDemo = (file: string): unknown => read(file);

/** The Sandpiper with other airframe fields and no centre-of-mass offset. */
export function withAirframe(change: Partial<Build['airframe']>): Build {
  const build = demoBuild('sandpiper');
  return { ...build, airframe: { ...build.airframe, centreOfMass_m: [0, 0, 0], ...change } };
}

/** An air so thin that it does nothing. */
export const VACUUM_KGPM3 = 1e-15;
