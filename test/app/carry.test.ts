import { deflateSync, strToU8 } from 'fflate';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { linkFor, takeLink } from '../../src/app/places/carry/shareLink.ts';
import {
  carriedFor,
  isOutOfDate,
  joined,
  keyOf,
  knownOnSheet,
  provenFor,
} from '../../src/app/places/carry/kept.ts';
import { windFlights, windProof } from '../../src/carrying/windLimit.ts';
import { VERSION } from '../../src/flight/record.ts';
import { InputError } from '../../src/craft/problem.ts';
import { demoBuild, demoGains, madeResult } from '../carrying/made.ts';

const build = demoBuild();
const gains = demoGains();
const packed = (text: string) => `#/take/${Buffer.from(deflateSync(strToU8(text))).toString('base64url')}`;

describe('a link with build and gains', () => {
  test('brings both back exactly, and stays short', () => {
    const link = linkFor('http://localhost/', build, gains) ?? '';
    expect(link.length).toBeLessThan(2500);
    expect(takeLink(link.slice(link.indexOf('#')))).toEqual({ build, gains });
  });

  test('is none when the address names a place', () => {
    expect(takeLink('#/fly')).toBeNull();
    expect(takeLink('')).toBeNull();
  });

  test.each([
    ['no base64', '#/take/@@@@'],
    ['no deflate', '#/take/AAAA_junk'],
    ['nothing', '#/take/'],
    ['a cut link', (linkFor('', build, gains) ?? '').slice(0, 400)],
    ['other JSON', packed('[1,2,3]')],
    ['no gains', packed(JSON.stringify({ build }))],
    [
      'a mass that cannot be',
      packed(JSON.stringify({ build: { ...build, airframe: { ...build.airframe, mass_kg: -1 } }, gains })),
    ],
    ['a huge number', packed(`{"build":{"mass":1e999},"gains":{}}`)],
    ['a key that reaches a prototype', packed('{"build":{"__proto__":{"a":1}},"gains":{}}')],
    ['deep nesting', packed(`{"build":${'['.repeat(5000)}${']'.repeat(5000)},"gains":{}}`)],
    ['a bomb', packed(' '.repeat(30_000_000))],
    ['a longer address than any of ours', `#/take/${'A'.repeat(100_000)}`],
  ])('is refused by name: %s', (_, fragment) => {
    expect(() => takeLink(fragment)).toThrow(InputError);
    expect(() => takeLink(fragment)).toThrow(/link/);
  });

  test('of any characters is refused or read, never a crash', () => {
    fc.assert(
      fc.property(fc.string({ maxLength: 200 }), (text) => {
        try {
          takeLink(`#/take/${text}`);
        } catch (error) {
          expect(error).toBeInstanceOf(InputError);
        }
      }),
      { numRuns: 200 },
    );
  });
});

describe('what is kept for the sheet', () => {
  const flights = windFlights(1);
  const wind = windProof(
    flights,
    flights.map((f) => madeResult(f.kind === 'gust' ? `gust-${f.side}` : f.trial, true)),
  );
  const own = { key: keyOf(build, gains), results: [madeResult('gust-front', true)], wind };
  const others = { ...gains, loop_Hz: 500 };

  test('stands on the sheet of the same build and gains, after a copy through JSON', () => {
    expect(carriedFor(JSON.parse(JSON.stringify(own)), build, gains)).toEqual(own);
    expect(isOutOfDate(own, build, gains)).toBe(false);
  });

  test('of other gains is left off, and said', () => {
    expect(carriedFor(own, build, others)).toMatchObject({ results: [], wind: null });
    expect(isOutOfDate(own, build, others)).toBe(true);
  });

  const proven = {
    of: { build, gainsA: others, gainsB: gains, wind: null, seed: 3, version: VERSION },
    a: { 'gust-front': madeResult('gust-front', false, 3) },
    b: { 'gust-rear': madeResult('gust-rear', true, 3), broken: { trial: 'broken' } },
  };

  test('Prove’s results come from the side whose gains they are, broken ones left out', () => {
    expect(provenFor(proven, build, gains).map(({ trial }) => trial)).toEqual(['gust-rear']);
    expect(provenFor(proven, build, others).map(({ trial }) => trial)).toEqual(['gust-front']);
    expect(provenFor(proven, { ...build, name: 'Another' }, gains)).toEqual([]);
    expect(joined(own.results, proven.a['gust-front'] ? [proven.a['gust-front']] : [])).toEqual(own.results);
  });

  test('flights in the wind on the desk in place of the trials’ own do not count', () => {
    const inWind = { ...proven, of: { ...proven.of, wind: { mean_mps: 3 } } };
    expect(provenFor(inWind, build, gains)).toEqual([]);
    const older = { ...proven, of: { ...proven.of, version: '0.0.1' } };
    expect(provenFor(older, build, gains)).toEqual([]);
  });

  test.each([
    undefined,
    null,
    7,
    'text',
    [],
    {},
    { key: 3 },
    { key: 'x', results: 'no', wind: { gust: 1 } },
    { of: null, a: {} },
  ])('junk is as nothing: %j', (junk) => {
    expect(carriedFor(junk, build, gains)).toMatchObject({ results: [], wind: null });
    expect(provenFor(junk, build, gains)).toEqual([]);
    expect(knownOnSheet(junk)).toEqual({});
  });

  test('uncertainties are taken by name, as short texts', () => {
    expect(
      knownOnSheet({
        known: { 'all-up mass': '± 0.2 %', 'gyro noise': 4, other: 'x', 'inertia roll': 'y'.repeat(900) },
      }),
    ).toEqual({
      'all-up mass': '± 0.2 %',
      'inertia roll': 'y'.repeat(60),
    });
  });
});
