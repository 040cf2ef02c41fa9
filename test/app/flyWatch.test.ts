import { describe, expect, it } from 'vitest';
import { faultsOf, NO_FAULTS } from '../../src/app/places/fly/faultChoices.ts';
import { Watch } from '../../src/app/places/fly/watch.ts';
import { parseFaults } from '../../src/disturbance/faults.ts';
import { SIGNAL_NAMES, signalIndex } from '../../src/flight/signals.ts';

/** A row in level flight, with some signals set. */
function row(set: Record<string, number> = {}): Float64Array {
  const all = new Float64Array(SIGNAL_NAMES.length);
  all[signalIndex('qw')] = 1;
  for (const [name, value] of Object.entries(set)) all[signalIndex(name)] = value;
  return all;
}

function look(watch: Watch, set: Record<string, number>, activity: number, seconds: number): void {
  for (let k = 0; k < Math.round(seconds * 50); k++) watch.look(row(set), activity, 0.02);
}

describe('what a person is told at once', () => {
  it('a command that stands at its limit is named after a moment, one that touches it is not', () => {
    const watch = new Watch();
    look(watch, { saturated_RL: 1 }, 0, 0.1);
    expect(watch.concern.value).toBeNull();
    look(watch, { saturated_RL: 1 }, 0, 0.6);
    expect(watch.concern.value).toEqual({ kind: 'saturated', corners: ['RL'] });
    look(watch, {}, 0, 1);
    expect(watch.concern.value).toBeNull();
  });

  it('idling on the ground is no saturation; lying tipped is told', () => {
    const watch = new Watch();
    look(watch, { saturated_FL: -1, touching: 1 }, 0, 2);
    expect(watch.concern.value).toBeNull();
    look(watch, { touching: 1, qw: Math.SQRT1_2, qx: Math.SQRT1_2 }, 0, 1);
    expect(watch.concern.value).toEqual({ kind: 'tipped' });
  });

  it('a struck propeller comes before everything else', () => {
    const watch = new Watch();
    look(watch, { struck_FR: 1, saturated_FL: 1 }, 0.2, 2);
    expect(watch.concern.value).toEqual({ kind: 'struck', corners: ['FR'] });
  });

  it('motors scream above 3 % of the command range, once it lasts (the bench’s own word, no source)', () => {
    const watch = new Watch();
    look(watch, {}, 0.035, 0.5);
    expect(watch.concern.value).toBeNull();
    look(watch, {}, 0.035, 0.7);
    expect(watch.concern.value).toEqual({ kind: 'screaming' });
    look(watch, {}, 0.02, 0.1);
    expect(watch.roughness.value).toBe('rough');
    look(watch, {}, 0.01, 0.1);
    expect(watch.roughness.value).toBe('quiet');
    look(watch, { touching: 1 }, 0.2, 3);
    expect(watch.concern.value).toBeNull();
  });
});

describe('faults of the panel', () => {
  it('none are none, and all of them are faults the flight takes', () => {
    expect(faultsOf(NO_FAULTS)).toEqual([]);
    const all = faultsOf({
      weakCorner: 'FL',
      weakShare: 0.7,
      chippedCorner: 'RR',
      imbalance: 10,
      shiftForward_mm: 12,
      shiftRight_mm: -3,
      looseMount: 4,
      late_ms: 2,
      jitter_ms: 1,
      deadCell: true,
    });
    expect(all.map((fault) => fault.kind)).toEqual([
      'weak-motor',
      'chipped-propeller',
      'shifted-payload',
      'loose-gyro-mount',
      'late-loop',
      'dead-cell',
    ]);
    expect(parseFaults(JSON.parse(JSON.stringify(all)), 4)).toEqual(all);
    expect(all[2]).toMatchObject({ shift_m: [0.012, -0.003, 0] });
  });
});
