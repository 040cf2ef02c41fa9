/** Fields of build, gains and wind by dotted path: "gains.axes.roll.d_us_per_dps2", "build.rotors[0].position_m[2]". */
import { parseBuild, type Build } from '../craft/build.ts';
import { parseGains, type Gains } from '../craft/gains.ts';
import { refuse } from '../craft/problem.ts';
import { CALM, parseWind, type Wind } from '../craft/wind.ts';

export interface Subject {
  readonly build: Build;
  readonly gains: Gains;
  readonly wind: Wind | null;
}

function keysOf(path: string): string[] {
  return path.split(/[.[\]]+/).filter((key) => key !== '');
}

/**
 * The subject with the number at `path` set, validated anew.
 * @throws InputError when there is no such number, or the value is not allowed there.
 */
export function withField(subject: Subject, path: string, value: number, file = 'sweep'): Subject {
  const keys = keysOf(path);
  const whole: Record<string, unknown> = structuredClone({
    build: subject.build,
    gains: subject.gains,
    wind: subject.wind ?? CALM,
  });
  const last = keys.pop();
  let at: unknown = whole;
  for (const key of keys) {
    at = Object.hasOwn(Object(at), key) ? (at as Record<string, unknown>)[key] : undefined;
  }
  if (last === undefined || typeof at !== 'object' || at === null || !Object.hasOwn(at, last)) {
    throw refuse(
      file,
      'path',
      path,
      'the path of a number in build, gains or wind, such as gains.axes.roll.d_us_per_dps2',
    );
  }
  const place = at as Record<string, unknown>;
  if (typeof place[last] !== 'number') {
    throw refuse(file, 'path', path, 'the path of a number, not of a text, list or object');
  }
  place[last] = value;
  const touchedWind = keysOf(path)[0] === 'wind';
  return {
    build: keysOf(path)[0] === 'build' ? parseBuild(whole.build, file) : subject.build,
    gains: keysOf(path)[0] === 'gains' ? parseGains(whole.gains, file) : subject.gains,
    wind: touchedWind ? parseWind(whole.wind, file) : subject.wind,
  };
}
