/**
 * Problems with input, as data: which file, which field, what stood there, what is allowed. Formatted for a
 * person only at the edge (command line, page).
 */
export interface Problem {
  /** Path of the field, "airframe.inertia_kgm2.xx" or "rotors[2].spin"; empty for the whole file. */
  readonly path: string;
  /** What stood there, shortened for display. */
  readonly value: string;
  /** What is allowed, a phrase: "a number from 0.01 to 100 kg". */
  readonly allowed: string;
}

/** Input that cannot be used. Carries every problem found, never only a text. */
export class InputError extends Error {
  constructor(
    readonly file: string,
    readonly problems: readonly Problem[],
  ) {
    super(describeProblem(file, problems[0] ?? { path: '', value: '', allowed: 'valid input' }));
    this.name = 'InputError';
  }
}

/** One line: file, field, value, what is allowed. */
export function describeProblem(file: string, problem: Problem): string {
  const field = problem.path === '' ? 'content' : problem.path;
  return `${file}: ${field}: ${problem.value === '' ? 'missing' : problem.value}; allowed: ${problem.allowed}`;
}

/** A single-problem InputError. */
export function refuse(file: string, path: string, value: unknown, allowed: string): InputError {
  return new InputError(file, [{ path, value: showValue(value), allowed }]);
}

/** A value as a person would recognise it, at most 60 characters. */
export function showValue(value: unknown): string {
  if (value === undefined) return '';
  const text = typeof value === 'number' ? String(value) : (JSON.stringify(value) ?? String(value));
  return text.length > 60 ? `${text.slice(0, 57)}...` : text;
}
