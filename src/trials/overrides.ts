/**
 * Single numbers of build, gains, wind and the trial's own parameters by path: "gains.axes.roll.d_us_per_dps2",
 * "build.rotors[0].position_m[2]", "wind.mean_mps", "trial.peak_mps". Paths with values are how a sweep's cell,
 * a sample of an uncertain build and a worst case are written down and flown again.
 */
import { parseBuild, type Build } from '../craft/build.ts';
import { parseGains, type Gains } from '../craft/gains.ts';
import { InputError, refuse } from '../craft/problem.ts';
import { parseWind, type Wind } from '../craft/wind.ts';
import type { ParameterValues, Trial } from './trial.ts';

export type Overrides = Readonly<Record<string, number>>;

/** What is flown: the files, and the wind where it takes the place of the trial's own. */
export interface Subject {
  readonly build: Build;
  readonly gains: Gains;
  readonly wind?: Wind | null;
}

/** What a trial flies after all overrides. */
export interface Resolved {
  readonly build: Build;
  readonly gains: Gains;
  readonly wind: Wind;
  readonly parameters: ParameterValues;
}

const ROOTS = ['build', 'gains', 'wind', 'trial'] as const;
type Root = (typeof ROOTS)[number];
type Node = Record<string, unknown>;

/**
 * Subject and parameters with `overrides` put in, each touched file validated once, after all of them.
 * @throws InputError when a path leads to no number, or a value is not allowed there.
 */
export function resolve(
  trial: Trial,
  subject: Subject,
  overrides: Overrides = {},
  file = 'overrides',
): Resolved {
  const paths = Object.keys(overrides);
  const parameters = parametersOf(trial, overrides, file);
  const wind = subject.wind ?? trial.wind(parameters);
  const touched = (root: Root) => paths.filter((path) => rootOf(path, file) === root);
  const changed = <T>(root: Root, value: T, parse: (raw: unknown, file: string) => T): T => {
    const own = touched(root);
    if (own.length === 0) return value;
    const copy = structuredClone(value) as Node;
    for (const path of own) put(copy, path, overrides[path], file);
    return parseChanged(() => parse(copy, file), root, own, copy, file);
  };
  return {
    build: changed('build', subject.build, parseBuild),
    gains: changed('gains', subject.gains, parseGains),
    wind: changed('wind', wind, parseWind),
    parameters,
  };
}

/** The number now at `path`; NaN where an optional one is absent. @throws InputError when there is no such place. */
export function valueAt(trial: Trial, subject: Subject, path: string, file = 'overrides'): number {
  const root = rootOf(path, file);
  const parameters = parametersOf(trial, {}, file);
  if (root === 'trial')
    return parametersOf(trial, { [path]: parameters[keysOf(path)[1]] }, file)[keysOf(path)[1]];
  const wind = subject.wind ?? trial.wind(parameters);
  const whole = { build: subject.build, gains: subject.gains, wind }[root] as unknown as Node;
  const [parent, last] = parentOf(whole, path, file);
  return Object.hasOwn(parent, last) ? numberAt(parent, last, path, file) : NaN;
}

/** Paths of all numbers of the subject, its wind and the trial, to choose from. */
export function numberPaths(trial: Trial, subject: Subject): string[] {
  const paths: string[] = [];
  const visit = (value: unknown, path: string): void => {
    if (typeof value === 'number') paths.push(path);
    else if (Array.isArray(value)) value.forEach((one, i) => visit(one, `${path}[${i}]`));
    else if (typeof value === 'object' && value !== null)
      for (const [key, one] of Object.entries(value)) visit(one, `${path}.${key}`);
  };
  visit(subject.gains, 'gains');
  visit(subject.build, 'build');
  visit(subject.wind ?? trial.wind(parametersOf(trial, {}, 'trial')), 'wind');
  for (const name of Object.keys(trial.parameters)) paths.push(`trial.${name}`);
  return paths;
}

function keysOf(path: string): string[] {
  return path.split(/[.[\]]+/).filter((key) => key !== '');
}

function rootOf(path: string, file: string): Root {
  const root = ROOTS.find((name) => path.startsWith(`${name}.`));
  if (root === undefined) {
    throw refuse(
      file,
      'path',
      path,
      'a path that begins with build., gains., wind. or trial., such as gains.axes.roll.d_us_per_dps2',
    );
  }
  return root;
}

function parametersOf(trial: Trial, overrides: Overrides, file: string): ParameterValues {
  const values: Record<string, number> = {};
  for (const [name, { value }] of Object.entries(trial.parameters)) values[name] = value;
  for (const [path, value] of Object.entries(overrides)) {
    if (!path.startsWith('trial.')) continue;
    const name = path.slice('trial.'.length);
    if (!Object.hasOwn(trial.parameters, name)) throw noSuchPath(path, trial.parameters, file);
    const { least, most } = trial.parameters[name];
    if (!(value >= least && value <= most))
      throw refuse(file, path, value, `a number from ${least} to ${most}`);
    values[name] = value;
  }
  return values;
}

function noSuchPath(path: string, known: object, file: string): InputError {
  const names = Object.keys(known);
  const list = names.length === 0 ? 'no fields' : names.slice(0, 12).join(', ');
  return refuse(file, 'path', path, `the path of a number; known at this place: ${list}`);
}

function parentOf(whole: Node, path: string, file: string): [parent: Node, last: string] {
  const keys = keysOf(path).slice(1);
  const last = keys.pop();
  let at: unknown = whole;
  for (const key of keys) {
    if (!Object.hasOwn(Object(at) as object, key)) throw noSuchPath(path, Object(at) as object, file);
    at = (at as Node)[key];
  }
  if (last === undefined || typeof at !== 'object' || at === null || last === '__proto__') {
    throw noSuchPath(path, Object(at) as object, file);
  }
  // A list has the places it has; only objects may gain a field that was left out.
  if (Array.isArray(at) && !Object.hasOwn(at, last)) throw noSuchPath(path, at, file);
  return [at as Node, last];
}

function numberAt(parent: Node, last: string, path: string, file: string): number {
  const value = parent[last];
  if (typeof value === 'number') return value;
  throw typeof value === 'object' && value !== null
    ? noSuchPath(path, value, file)
    : refuse(file, 'path', path, 'the path of a number, not of a text or a switch');
}

function put(whole: Node, path: string, value: number, file: string): void {
  const [parent, last] = parentOf(whole, path, file);
  if (Object.hasOwn(parent, last)) numberAt(parent, last, path, file);
  parent[last] = value;
}

/** Parses; a field that the schema does not know was a wrong path, not a wrong file. */
function parseChanged<T>(parse: () => T, root: Root, paths: readonly string[], copy: Node, file: string): T {
  try {
    return parse();
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    const wrong = paths.find((path) =>
      error.problems.some((one) => `${root}.${one.path}` === path && one.allowed === 'no field of this name'),
    );
    if (wrong !== undefined) {
      const [parent, last] = parentOf(copy, wrong, file);
      const { [last]: _added, ...known } = parent;
      throw noSuchPath(wrong, known, file);
    }
    throw new InputError(
      error.file,
      error.problems.map((one) => ({ ...one, path: one.path === '' ? root : `${root}.${one.path}` })),
    );
  }
}
