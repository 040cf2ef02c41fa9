/** Shared by the measuring tests: the message of a refusal, and how often an interval holds the truth. */
import { readFileSync } from 'node:fs';
import { InputError } from '../../src/craft/problem.ts';
import type { Estimate } from '../../src/measuring/estimate.ts';

export function refusal(run: () => unknown): string {
  try {
    run();
  } catch (error) {
    if (error instanceof InputError) return error.message;
    throw error;
  }
  throw new Error('was accepted');
}

export const holds = (estimate: Estimate, truth: number): boolean =>
  Math.abs(estimate.value - truth) <= 1.96 * estimate.sigma;

export interface Reference {
  readonly swings: readonly {
    readonly method: 'bifilar' | 'compound';
    readonly I: number;
    readonly m: number;
    readonly D?: number;
    readonly L?: number;
    readonly d?: number;
    readonly amplitude_deg: number;
    readonly period_s: number;
  }[];
  readonly welch: { readonly rate_Hz: number; readonly segment: number; readonly density: readonly number[] };
  readonly step: {
    readonly t: readonly number[];
    readonly y: readonly number[];
    readonly lag_s: number;
    readonly lagSigma_s: number;
    readonly onset_s: number;
  };
  readonly student: readonly (readonly [number, number])[];
}

const read = (name: string): string =>
  readFileSync(new URL(`../reference/measuring/${name}`, import.meta.url), 'utf8');

/** Computed by SciPy; make_measuring.py beside it. */
export const reference = (): Reference => JSON.parse(read('measuring.json')) as Reference;

/** UIUC Propeller Data Site, Volume 1 (Brandt and Selig, AIAA 2011-1255), static run kt0835. */
export const uiucStatic = (): string => read('propeller_10x4.7_static.csv');

/** NIST SP 1065 section 12.4: the 1000 numbers of its test suite, n' = 16807 n mod 2147483647, over 2147483647. */
export function nistSequence(count: number): number[] {
  const numbers = [1234567890];
  while (numbers.length < count) numbers.push((16807 * numbers[numbers.length - 1]) % 2147483647);
  return numbers.map((value) => value / 2147483647);
}
