/** The build file: read, checked for form and for physical plausibility. */
import { buildSchema, type Build } from './buildSchema.ts';
import { parseWith } from './fields.ts';
import { checkPlausible } from './plausible.ts';

export { BUILD_FORMAT, buildSchema, CORNERS, isElectric } from './buildSchema.ts';
export type { Build, Corner } from './buildSchema.ts';

/**
 * Validates a build: form, then physical plausibility.
 * @throws InputError naming path, value and what is allowed, for every problem of the first kind found.
 */
export function parseBuild(raw: unknown, file = 'build'): Build {
  const build = parseWith(buildSchema, raw, file);
  checkPlausible(build, file);
  return build;
}
