/** Build and gains in the fragment of a link: deflated JSON in URL-safe base64. Nothing goes over a network. */
import { deflateSync, inflateSync, strFromU8, strToU8 } from 'fflate';
import { parseBuild, type Build } from '../../../craft/build.ts';
import { parseGains, type Gains } from '../../../craft/gains.ts';
import { refuse } from '../../../craft/problem.ts';
import { parseGuardedJson } from '../../storage/guardedJson.ts';

const LINK_PREFIX = '#/take/';
/** Longer links are cut by some programs that pass them on. */
export const LONGEST_LINK = 6000;
/** Nothing honest is longer; a bomb is refused before it is unpacked. */
const LONGEST_TAKEN = 4 * LONGEST_LINK;
const LONGEST_TEXT = 400_000;

export function linkFor(base: string, build: Build, gains: Gains): string | null {
  const packed = deflateSync(strToU8(JSON.stringify({ build, gains })), { level: 9 });
  let binary = '';
  for (const byte of packed) binary += String.fromCharCode(byte);
  const text = btoa(binary).replace(/\+/g, '-').replace(/\//g, '_').replace(/=+$/, '');
  const link = `${base}${LINK_PREFIX}${text}`;
  return link.length > LONGEST_LINK ? null : link;
}

/**
 * What a link holds; null when the fragment is no such link.
 * @throws InputError for junk: not base64, not deflate, too long when inflated, not a build and gains.
 */
export function takeLink(fragment: string): { build: Build; gains: Gains } | null {
  if (!fragment.startsWith(LINK_PREFIX)) return null;
  const text = fragment.slice(LINK_PREFIX.length);
  if (text.length > LONGEST_TAKEN)
    throw refuse('link', '', `${text.length} characters`, `at most ${LONGEST_TAKEN} characters`);
  const raw = parseGuardedJson(unpack(text), 'link');
  if (
    typeof raw !== 'object' ||
    raw === null ||
    !Object.hasOwn(raw, 'build') ||
    !Object.hasOwn(raw, 'gains')
  ) {
    throw refuse('link', '', 'other content', 'a build and gains');
  }
  const { build, gains } = raw as { build: unknown; gains: unknown };
  return { build: parseBuild(build, 'link: build'), gains: parseGains(gains, 'link: gains') };
}

function unpack(text: string): string {
  try {
    const binary = atob(text.replace(/-/g, '+').replace(/_/g, '/'));
    const bytes = Uint8Array.from(binary, (char) => char.charCodeAt(0));
    // A fixed room for the result: more than that is refused instead of being unpacked.
    return strFromU8(inflateSync(bytes, { out: new Uint8Array(LONGEST_TEXT) }));
  } catch {
    throw refuse('link', '', `${text.length} characters`, 'a link made by this program, whole');
  }
}
