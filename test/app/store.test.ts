import { describe, expect, test } from 'vitest';
import { Store } from '../../src/app/store/store.ts';
import { demoScenes, firstDocument } from '../../src/app/store/demos.ts';
import { freeName } from '../../src/app/store/document.ts';
import { JobList } from '../../src/app/store/jobs.ts';
import { readable, shownUnit, withUnit } from '../../src/app/store/units.ts';
import { windInWords } from '../../src/app/shell/windWords.ts';
import { hashOf, placeInHash } from '../../src/app/shell/route.ts';
import { differences } from '../../src/app/store/differences.ts';
import { en } from '../../src/app/texts/en.ts';
import { parseWind } from '../../src/craft/wind.ts';

const fresh = () => new Store(firstDocument());
const rollP = (store: Store) => store.gains.value.axes.roll.p_us_per_dps;
function setRollP(store: Store, p_us_per_dps: number) {
  return store.setGains(
    (g) => ({ ...g, axes: { ...g.axes, roll: { ...g.axes.roll, p_us_per_dps } } }),
    'roll P',
  );
}

describe('the store', () => {
  test('starts with the demo crafts, the Sandpiper on the desk in calm air at the bridge', () => {
    const store = fresh();
    expect(store.crafts.value.map((craft) => craft.build.name)).toEqual(['Sandpiper', 'Wren']);
    expect(store.build.value.name).toBe('Sandpiper');
    expect(store.scene.value.name).toBe('estuary-bridge');
    expect(store.wind.value.mean_mps).toBe(0);
    expect(demoScenes().at(-1)?.name).toBe('open-field');
  });

  test('an edit marks the gains as changed; undo, redo and save take the mark away and bring it back', () => {
    const store = fresh();
    const before = rollP(store);
    expect(store.gainsChanged.value).toBe(false);
    expect(setRollP(store, 2)).toEqual([]);
    expect(store.gainsChanged.value).toBe(true);
    expect(store.undoLabels.value.undo).toBe('roll P');
    store.undo();
    expect(rollP(store)).toBe(before);
    expect(store.gainsChanged.value).toBe(false);
    store.redo();
    expect(rollP(store)).toBe(2);
    store.saveGains('first try');
    expect(store.gainsChanged.value).toBe(false);
    expect(store.gainSet.value.history.map(({ note }) => note)).toEqual(['first try']);
    store.undo();
    expect(store.gainsChanged.value).toBe(true);
  });

  test('a drag of a slider is one step; another label, or a pause, begins a new one', () => {
    const store = fresh();
    const before = rollP(store);
    for (const value of [1.1, 1.2, 1.3]) setRollP(store, value);
    store.setGains((g) => ({ ...g, outputLimit_us: 300 }), 'output limit');
    setRollP(store, 1.4);
    store.sealEdit();
    setRollP(store, 1.5);
    const seen: number[] = [];
    for (let i = 0; i < 4; i++) {
      store.undo();
      seen.push(rollP(store));
    }
    expect(seen).toEqual([1.4, 1.3, 1.3, before]);
    expect(store.undoLabels.value.undo).toBeNull();
    store.undo();
    expect(rollP(store)).toBe(before);
  });

  test('what the parsers refuse changes nothing, is returned and is told once', () => {
    const store = fresh();
    const document = store.document();
    const problems = setRollP(store, NaN);
    expect(problems.map(({ path }) => path)).toEqual(['axes.roll.p_us_per_dps']);
    setRollP(store, 1e308);
    expect(store.document()).toEqual(document);
    expect(store.undoLabels.value.undo).toBeNull();
    expect(store.notices.current.value).toHaveLength(1);
    expect(store.notices.current.value[0].details[0]).toContain('1e+308');
    store.setGains((g) => ({ ...g, loop_Hz: 1 }), 'loop', { quiet: true });
    expect(store.notices.current.value).toHaveLength(1);
    expect(
      store.setBuild((b) => ({ ...b, airframe: { ...b.airframe, mass_kg: 40 } }), 'mass', { quiet: true }),
    ).not.toEqual([]);
    expect(store.document()).toEqual(document);
  });

  test('B is a set of its own; dropping it brings the side back to A', () => {
    const store = fresh();
    const before = rollP(store);
    store.copyToB();
    store.chooseSide('B');
    setRollP(store, 3);
    expect([store.gainsA.value.axes.roll.p_us_per_dps, store.gainsB.value?.axes.roll.p_us_per_dps]).toEqual([
      before,
      3,
    ]);
    store.dropB();
    expect(store.side.value).toBe('A');
    expect(rollP(store)).toBe(before);
    store.undo();
    expect(store.gainsB.value?.axes.roll.p_us_per_dps).toBe(3);
  });

  test('a scene brings its wind, in one step', () => {
    const store = fresh();
    const quarry = store.scenes.value.find(({ name }) => name === 'quarry-face');
    if (quarry === undefined) throw new Error('no quarry');
    store.setScene(quarry, 'site');
    expect(store.wind.value).toEqual(quarry.wind);
    store.undo();
    expect([store.scene.value.name, store.wind.value.mean_mps]).toEqual(['estuary-bridge', 0]);
  });

  test('added crafts get free names; the last craft cannot be removed', () => {
    const store = fresh();
    const more = firstDocument().crafts;
    store.addCrafts(more, 'import');
    expect(store.crafts.value.map(({ build }) => build.name)).toEqual([
      'Sandpiper',
      'Wren',
      'Sandpiper 2',
      'Wren 2',
    ]);
    expect(store.build.value.name).toBe('Sandpiper 2');
    store.undo();
    expect(store.build.value.name).toBe('Sandpiper');
    const [first, second] = store.crafts.value;
    expect(store.removeCraft(first.id, 'remove')).toBe(true);
    expect(store.build.value.name).toBe('Wren');
    expect(store.removeCraft(second.id, 'remove')).toBe(false);
    store.undo();
    expect(store.build.value.name).toBe('Sandpiper');
  });

  test('a file offered to a place waits with a dot and is taken once', () => {
    const store = fresh();
    const log = new File(['t\n0'], 'log.csv');
    store.offerFile('match', log);
    expect(store.waiting.value).toEqual({ match: 'log.csv' });
    expect(store.takeOffered('prove')).toBeNull();
    expect(store.takeOffered('match')).toBe(log);
    expect(store.takeOffered('match')).toBeNull();
    expect(store.waiting.value).toEqual({});
  });
});

describe('background work', () => {
  test('time left follows from the pace so far, and says nothing too early', () => {
    let now = 0;
    const jobs = new JobList(() => now);
    const handle = jobs.start('map');
    const [job] = jobs.current.value;
    now = 500;
    handle.progress(0.01);
    expect(job.left_s.value).toBeNull();
    now = 10_000;
    handle.progress(0.25);
    expect(job.left_s.value).toBeCloseTo(30, 9);
    handle.progress(7);
    expect(job.share.value).toBe(1);
    handle.end();
    expect(jobs.current.value).toEqual([]);
  });
});

describe('words and numbers', () => {
  test.each([
    [{}, 'calm'],
    [{ mean_mps: 7 }, '7\u00a0m/s'],
    [{ mean_mps: 7, turbulence: { model: 'MIL-F-8785C', windAt20ft_mps: 7.7 } }, '7\u00a0m/s, gusty'],
    [{ turbulence: { model: 'MIL-F-8785C', windAt20ft_mps: 3 } }, 'calm, light turbulence'],
    [{ mean_mps: 15, turbulence: { model: 'MIL-F-8785C', windAt20ft_mps: 15.5 } }, '15\u00a0m/s, rough'],
    [{ gusts: [{ start_s: 1, rise_s: 1, peak_mps: 4, from_deg: 0 }] }, 'calm, 1 gust set'],
  ])('wind %j reads "%s"', (wind, words) => {
    expect(windInWords(parseWind({ format: 'gustbench.wind/1', ...wind }), 'metric', en.wind)).toBe(words);
  });

  test('imperial units are those of the 1959 agreement', () => {
    expect(withUnit(1.35, 'kg', 'imperial', 4)).toBe('2.976\u00a0lb');
    expect(withUnit(10, 'm/s', 'imperial', 4)).toBe('22.37\u00a0mph');
    expect(withUnit(120, 'm', 'imperial', 4)).toBe('393.7\u00a0ft');
    expect(withUnit(1, 'N', 'imperial', 4)).toBe('0.2248\u00a0lbf');
    expect(shownUnit('µs per deg/s', 'imperial')).toEqual({ unit: 'µs per deg/s', factor: 1 });
  });

  test.each([
    [0, '0'],
    [-0.25, '−0.25'],
    [1013.25, '1013'],
    [123456, '123456'],
    [0.00001234, '1.23e−5'],
    [NaN, '–'],
  ])('%d reads %s', (value, text) => expect(readable(value)).toBe(text));

  test('links name places and nothing else', () => {
    expect(placeInHash('#/fly')).toBe('fly');
    expect(placeInHash('#/fly?seed=4')).toBe('fly');
    expect(placeInHash('#/cellar')).toBeNull();
    expect(placeInHash('#__proto__')).toBeNull();
    expect(placeInHash(hashOf('carry'))).toBe('carry');
  });

  test('differences name the leaves that changed', () => {
    expect(differences({ a: { b: 1, c: [1, 2] }, d: 1 }, { a: { b: 2, c: [1, 2, 3] } })).toEqual([
      { path: 'a.b', before: '1', after: '2' },
      { path: 'd', before: '1', after: '–' },
      { path: 'a.c.2', before: '–', after: '3' },
    ]);
  });

  test('a free name is the wanted one or the next number', () => {
    expect(freeName('Heron', ['Wren'])).toBe('Heron');
    expect(freeName('Wren', ['Wren', 'Wren 2'])).toBe('Wren 3');
  });
});
