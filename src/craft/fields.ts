/**
 * Field kinds shared by all file schemas, and the one place where a schema meets raw input. A field states
 * its range and unit once; the error, the JSON Schema and the page's limits all come from that.
 */
import { z } from 'zod';
import { InputError, refuse, showValue, type Problem } from './problem.ts';

/** A finite number in [min, max] with its unit. */
export function quantity(min: number, max: number, unit: string) {
  const error = `a number from ${min} to ${max}${unit === '' ? '' : ` ${unit}`}`;
  return z
    .number({ error })
    .min(min, { error })
    .max(max, { error })
    .meta({ description: unit === '' ? undefined : `in ${unit}` });
}

/** A finite number in (0, max]: zero itself is refused. */
export function positive(max: number, unit: string) {
  const error = `a number above 0, up to ${max}${unit === '' ? '' : ` ${unit}`}`;
  return z.number({ error }).positive({ error }).max(max, { error });
}

export function vector(min: number, max: number, unit: string) {
  const item = quantity(min, max, unit);
  return z.tuple([item, item, item], { error: `three numbers from ${min} to ${max} ${unit}` });
}

export function choice<const T extends readonly [string, ...string[]]>(options: T) {
  return z.enum(options, { error: `one of ${options.map((option) => `"${option}"`).join(', ')}` });
}

export function title() {
  const error = 'a text of 1 to 120 characters';
  return z.string({ error }).min(1, { error }).max(120, { error });
}

/** "gustbench.build/1" and nothing else; another version is named in the error. */
export function formatTag<const T extends string>(tag: T) {
  return z.literal(tag, { error: `"${tag}"` });
}

function joinPath(path: readonly PropertyKey[]): string {
  return path.reduce<string>(
    (text, key) =>
      typeof key === 'number' ? `${text}[${key}]` : text === '' ? String(key) : `${text}.${String(key)}`,
    '',
  );
}

function valueAt(root: unknown, path: readonly PropertyKey[]): unknown {
  return path.reduce<unknown>(
    (value, key) =>
      typeof value === 'object' && value !== null ? (value as Record<PropertyKey, unknown>)[key] : undefined,
    root,
  );
}

function problemsOf(issues: readonly z.core.$ZodIssue[], raw: unknown): Problem[] {
  return issues.flatMap((issue): Problem[] => {
    if (issue.code === 'unrecognized_keys') {
      return issue.keys.map((key) => ({
        path: joinPath([...issue.path, key]),
        value: showValue(valueAt(raw, [...issue.path, key])),
        allowed: 'no field of this name',
      }));
    }
    return [
      { path: joinPath(issue.path), value: showValue(valueAt(raw, issue.path)), allowed: issue.message },
    ];
  });
}

/**
 * Validates `raw` against `schema`.
 * @throws InputError with every problem, each with path, value and what is allowed.
 */
export function parseWith<S extends z.ZodType>(schema: S, raw: unknown, file: string): z.output<S> {
  const result = schema.safeParse(raw);
  if (result.success) return result.data;
  throw new InputError(file, problemsOf(result.error.issues, raw));
}

/** Largest JSON text that is read at all: no build, gains, wind or scene comes near it. */
export const LARGEST_JSON_BYTES = 4_000_000;

/**
 * JSON text to a value.
 * @throws InputError when the text is too long, not JSON, or cut off.
 */
export function parseJson(text: string, file: string): unknown {
  if (text.length > LARGEST_JSON_BYTES) {
    throw refuse(file, '', `${text.length} characters`, `at most ${LARGEST_JSON_BYTES} characters of JSON`);
  }
  try {
    return JSON.parse(text.replace(/^\uFEFF/, '')) as unknown;
  } catch (error) {
    const reason = error instanceof Error ? error.message : String(error);
    throw refuse(file, '', reason, 'a complete JSON object');
  }
}
