import { describe, expect, test } from 'vitest';
import { z } from 'zod';
import { InputError } from '../../src/craft/problem.ts';
import {
  FAULT_KINDS,
  applyFaults,
  faultSchema,
  noEffects,
  parseFaults,
} from '../../src/disturbance/faults.ts';

const effectsOf = (...faults: object[]): ReturnType<typeof applyFaults> =>
  applyFaults(parseFaults(faults, 4));

/** The first problem of an InputError. */
function problemOf(work: () => unknown): { path: string; allowed: string } {
  try {
    work();
  } catch (error) {
    if (error instanceof InputError) return error.problems[0];
    throw error;
  }
  throw new Error('nothing was refused');
}

describe('faults', () => {
  test('no fault is a healthy craft', () => {
    expect(applyFaults([])).toEqual(noEffects());
    expect([...noEffects().thrustShare, ...noEffects().torqueShare, ...noEffects().imbalance]).toEqual(
      new Array<number>(12).fill(1),
    );
  });

  test('each kind acts where it says, corners in the order FL, FR, RL, RR', () => {
    expect([...effectsOf({ kind: 'weak-motor', corner: 'RL', share: 0.8 }).thrustShare]).toEqual([
      1, 1, 0.8, 1,
    ]);
    expect([...effectsOf({ kind: 'demagnetised-motor', corner: 'FR', share: 0.9 }).torqueShare]).toEqual([
      1, 0.9, 1, 1,
    ]);
    const chipped = effectsOf({ kind: 'chipped-propeller', corner: 'RR', share: 0.9, imbalance: 6 });
    expect([...chipped.thrustShare]).toEqual([1, 1, 1, 0.9]);
    expect([...chipped.imbalance]).toEqual([1, 1, 1, 6]);
    expect(effectsOf({ kind: 'shifted-payload', shift_m: [0.02, 0, -0.01] }).comShift_m).toEqual([
      0.02, 0, -0.01,
    ]);
    const loose = effectsOf({ kind: 'loose-gyro-mount', vibration: 4, resonance_Hz: 80 });
    expect([loose.vibrationScale, loose.mountResonance_Hz, loose.mountDamping]).toEqual([4, 80, 0.1]);
    const late = effectsOf({ kind: 'late-loop', delay_s: 0.004, jitter_s: 0.002, missedTickShare: 0.1 });
    expect([late.extraDelay_s, late.jitter_s]).toEqual([0.004, 0.002]);
    expect(late.missedTickShare).toBeCloseTo(0.1, 12);
    expect(effectsOf({ kind: 'dead-cell' }).deadCells).toBe(1);
  });

  test('faults add up: shares multiply, delays and shifts add', () => {
    const both = effectsOf(
      { kind: 'weak-motor', corner: 'FL', share: 0.8 },
      { kind: 'chipped-propeller', corner: 'FL', share: 0.5, imbalance: 3 },
      { kind: 'late-loop', delay_s: 0.002, missedTickShare: 0.5 },
      { kind: 'late-loop', delay_s: 0.003, missedTickShare: 0.5 },
      { kind: 'shifted-payload', shift_m: [0.01, 0, 0] },
      { kind: 'shifted-payload', shift_m: [0.02, -0.01, 0] },
    );
    expect(both.thrustShare[0]).toBeCloseTo(0.4, 12);
    expect(both.extraDelay_s).toBeCloseTo(0.005, 12);
    expect(both.missedTickShare).toBeCloseTo(0.75, 12);
    expect(both.comShift_m[0]).toBeCloseTo(0.03, 12);
    expect(both.comShift_m[1]).toBeCloseTo(-0.01, 12);
  });

  test('every kind in the registry has a name of its own and a title', () => {
    const names = FAULT_KINDS.map((kind) => kind.kind);
    expect(new Set(names).size).toBe(names.length);
    for (const kind of FAULT_KINDS) expect(kind.title.length).toBeGreaterThan(3);
  });

  test('the schema goes out as JSON Schema, one branch a kind', () => {
    const exported = z.toJSONSchema(faultSchema, { io: 'input' });
    expect(exported.oneOf ?? exported.anyOf).toHaveLength(FAULT_KINDS.length);
  });

  test.each([
    ['an unknown kind', [{ kind: 'gremlin' }], '[0].kind'],
    ['a share above 1', [{ kind: 'weak-motor', corner: 'FL', share: 1.2 }], '[0].share'],
    ['a corner that is none', [{ kind: 'weak-motor', corner: 'XX', share: 0.5 }], '[0].corner'],
    ['a field too many', [{ kind: 'dead-cell', cells: 2 }], '[0].cells'],
    ['not a number', [{ kind: 'late-loop', delay_s: NaN }], '[0].delay_s'],
    ['no list', { kind: 'dead-cell' }, ''],
    ['too many', new Array(21).fill({ kind: 'late-loop' }), ''],
    ['no cell left', new Array(4).fill({ kind: 'dead-cell' }), ''],
  ])('%s is refused by name', (_, raw, path) => {
    const problem = problemOf(() => parseFaults(raw, 4));
    expect(problem.path).toBe(path);
    expect(problem.allowed.length).toBeGreaterThan(3);
  });
});
