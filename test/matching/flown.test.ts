/** The whole way: a flight of the bench's own simulation, its record matched, replayed; manoeuvres as C. */
import { spawnSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { root } from '../../src/cli/setup.mjs';
import { AXES, type AxisName } from '../../src/craft/gains.ts';
import { InputError } from '../../src/craft/problem.ts';
import { parseBuild } from '../../src/craft/build.ts';
import { CALM } from '../../src/craft/wind.ts';
import { OPEN_FIELD } from '../../src/craft/scene.ts';
import { recordCsv } from '../../src/flight/record.ts';
import { runFlight } from '../../src/flight/run.ts';
import { NEUTRAL_STICKS } from '../../src/flight/pilot.ts';
import { RECORD_SIGNALS } from '../../src/flight/signals.ts';
import {
  excitationAt_dps,
  excitationC,
  excitationDuration_s,
  excitationTable,
  largestTurn_deg,
  parseExcitation,
  suggestedExcitations,
  type Excitation,
} from '../../src/matching/excitation.ts';
import { LOG_GUIDE } from '../../src/matching/guide.ts';
import type { FlightLog } from '../../src/matching/log.ts';
import { matchLog } from '../../src/matching/matchLog.ts';
import { modelPlant } from '../../src/matching/modelPlant.ts';
import { blobSource, openLog, readLog } from '../../src/matching/readLog.ts';
import { replayLog } from '../../src/matching/replay.ts';
import { demoBuild, demoGains } from '../physics/builds.ts';
import { flyThreeAxes, FOREIGN_COLUMNS, foreignCsv } from './logs.ts';

const build = demoBuild('sandpiper');
const gains = demoGains('sandpiper');
let folder = '';
let record = '';
let log: FlightLog;

/** Doublets on one axis after the other, moored in still air. */
beforeAll(async () => {
  folder = mkdtempSync(path.join(tmpdir(), 'gustbench-match-'));
  const doublets = AXES.map((axis) => ({ ...suggestedExcitations(axis, gains.maxRate_dps[axis])[0], axis }));
  const sticks = { ...NEUTRAL_STICKS, armed: true, moored: true };
  const { record: flown } = runFlight(
    { build, gains, wind: CALM, seed: 4, start: { kind: 'hover', height_m: 8 } },
    42,
    (t) => {
      const turn = Math.min(2, Math.floor(t / 14));
      AXES.forEach((axis, i) => {
        sticks[axis] =
          i === turn ? excitationAt_dps(doublets[i], t - 14 * turn) / gains.maxRate_dps[axis] : 0;
      });
      return sticks;
    },
    RECORD_SIGNALS,
  );
  const header = { build, gains, wind: CALM, scene: OPEN_FIELD, seed: 4, faults: [] };
  record = [...recordCsv(flown, header)].join('');
  const source = blobSource(new Blob([record]), 'record.csv');
  const proposal = await openLog(source);
  log = await readLog(source, proposal, proposal.columns, { range: build.esc });
}, 120_000);
afterAll(() => rmSync(folder, { recursive: true, force: true }));

function run(...args: string[]) {
  const done = spawnSync(process.execPath, ['src/cli/launch.mjs', 'match', ...args], {
    cwd: root,
    encoding: 'utf8',
    maxBuffer: 1 << 28,
  });
  return { code: done.status, out: done.stdout, err: done.stderr };
}

function file(name: string, content: string): string {
  const place = path.join(folder, name);
  writeFileSync(place, content);
  return place;
}

describe('a record of the bench', () => {
  it('needs no columns and gives the plant of the nonlinear craft, yaw with the rotors’ own reaction', () => {
    const { axes } = matchLog(log, build);
    const model = modelPlant(build, gains.computeDelay_s);
    for (const axis of ['roll', 'pitch'] as const) {
      // The closed form leaves the inflow out, which takes a few per cent of the gain.
      const { estimates } = axes[axis];
      expect(
        Math.abs((estimates?.gain_dps2_per_us.value ?? NaN) / model[axis].gain_dps2_per_us - 1),
        axis,
      ).toBeLessThan(0.1);
      expect(Math.abs((estimates?.lag_s.value ?? NaN) / model[axis].lag_s - 1), axis).toBeLessThan(0.2);
      expect(axes[axis].fit_pct, axis).toBeGreaterThan(80);
    }
    const yaw = axes.yaw.fit;
    expect(Math.abs((yaw?.lead_s?.value ?? NaN) / model.yaw.lead_s - 1), 'lead J_r/(dQ/dΩ)').toBeLessThan(
      0.1,
    );
    expect(
      Math.abs((yaw?.gain_dps2_per_us.value ?? NaN) / model.yaw.gain_dps2_per_us - 1),
      'yaw',
    ).toBeLessThan(0.1);
    expect(axes.roll.note).toMatch(/Vibration of .* once per turn of the rotors/);
  }, 240_000);

  it('replays: the build that flew follows its own log; one with half as much roll inertia again does not', () => {
    const part = { from_s: 0, to_s: 14, seed: 9 };
    const own = replayLog(log, build, gains, part).axes.roll;
    const { airframe } = build;
    const heavy = parseBuild({
      ...build,
      airframe: {
        ...airframe,
        inertia_kgm2: { ...airframe.inertia_kgm2, xx: 1.5 * airframe.inertia_kgm2.xx },
      },
    });
    const other = replayLog(log, heavy, gains, part).axes.roll;
    expect(own?.fit_pct).toBeGreaterThan(80);
    expect(other?.residualRms_dps).toBeGreaterThan(1.4 * (own?.residualRms_dps ?? Infinity));
    expect(other?.says).toMatch(/1 to 12 Hz: gain, lag or delay/);
    expect(() => replayLog(log, build, gains, { from_s: 3, to_s: 3.2 })).toThrow(InputError);
  }, 120_000);
});

describe('match on the command line', () => {
  it('prints one JSON object with the agreed keys and writes a build that can be read again', () => {
    const out = path.join(folder, 'corrected.json');
    const result = run(
      '--build',
      'scenes/sandpiper.build.json',
      '--log',
      file('record.csv', record),
      '--json',
      '--out',
      out,
    );
    expect(result.code, result.err).toBe(0);
    const { axes, correctedBuild } = JSON.parse(result.out) as {
      axes: Record<AxisName, Record<string, { value: number; sigma: number }> & { note: string }>;
      correctedBuild: unknown;
    };
    for (const axis of AXES) {
      expect(Object.keys(axes[axis])).toEqual(
        expect.arrayContaining(['gain_dps2_per_us', 'lag_s', 'delay_s', 'fit_pct', 'usable_s', 'note']),
      );
      for (const key of ['gain_dps2_per_us', 'lag_s', 'delay_s']) {
        expect(Number.isFinite(axes[axis][key].value), `${axis} ${key}`).toBe(true);
        expect(axes[axis][key].sigma, `${axis} ${key}`).toBeGreaterThan(0);
      }
    }
    expect(parseBuild(JSON.parse(readFileSync(out, 'utf8')))).toEqual(parseBuild(correctedBuild));
  }, 240_000);

  it('with a columns file, an axis that was not excited has null in place of every number', () => {
    const flown = flyThreeAxes(7, (axis) =>
      axis === 'yaw' ? { setpoint_dps: () => 0 } : { duration_s: 20 },
    );
    const foreign = file('foreign.csv', foreignCsv(flown, build));
    const columns = file('columns.json', JSON.stringify(FOREIGN_COLUMNS));
    const result = run(
      '--build',
      'scenes/sandpiper.build.json',
      '--log',
      foreign,
      '--columns',
      columns,
      '--json',
    );
    expect(result.code, result.err).toBe(0);
    const { yaw, roll } = (JSON.parse(result.out) as { axes: Record<AxisName, Record<string, unknown>> })
      .axes;
    for (const [key, value] of Object.entries(yaw)) if (key !== 'note') expect(value, key).toBeNull();
    expect(yaw.note).toMatch(/Not excited/);
    expect(roll.gain_dps2_per_us).not.toBeNull();
  }, 240_000);

  it.each([
    ['a poem', 'roses are red\nviolets are blue\n', /poem\.csv: line 1: .*; allowed: a log/],
    [
      'foreign heads without columns',
      'time,a,b\n1,2,3\n2,3,4\n',
      /heads: "time, a, b"; allowed: .*--columns FILE/,
    ],
    ['a head line alone', 't_s,gyro_roll_dps,u_roll_us\n', /a head line alone/],
  ])('refuses %s with exit 2 and one line', (_name, text, message) => {
    const result = run('--build', 'scenes/sandpiper.build.json', '--log', file('poem.csv', text), '--json');
    expect(result.code).toBe(2);
    expect(result.out).toBe('');
    expect(result.err.trim().split('\n').length, result.err).toBe(1);
    expect(result.err).toMatch(message);
    expect(result.err).not.toMatch(/\.ts:\d+/);
  });

  it('a log that is not there, and a folder in its place, are said so', () => {
    expect(run('--build', 'scenes/sandpiper.build.json', '--log', path.join(folder, 'none.csv')).err).toMatch(
      /ENOENT; allowed|"ENOENT"; allowed/,
    );
    expect(run('--build', 'scenes/sandpiper.build.json', '--log', folder).err).toMatch(/not a file/);
  });
});

describe('manoeuvres for the firmware', () => {
  const compiler = spawnSync('cc', ['--version']).status === 0;

  it.runIf(compiler)('the C code gives what the function gives, and ends when the stick moves', () => {
    for (const one of AXES.flatMap((axis) => suggestedExcitations(axis, 220))) {
      const source = `${excitationC(one)}
#include <stdio.h>
#include <stdlib.h>
int main(int argc, char **argv) { for (int i = 2; i < argc; i++) printf("%.9g\\n", (double)${one.axis}_excitation_dps(strtof(argv[i], 0), strtof(argv[1], 0))); return 0; }
`;
      const place = file(`${one.axis}_${one.kind}.c`, source);
      const program = place.replace(/\.c$/, '');
      const built = spawnSync(
        'cc',
        ['-std=c99', '-Wall', '-Wextra', '-Werror', place, '-o', program, '-lm'],
        { encoding: 'utf8' },
      );
      expect(built.status, built.stderr).toBe(0);
      const duration_s = excitationDuration_s(one);
      const times = Array.from({ length: 240 }, (_, k) => ((k - 3) * duration_s) / 230 + 0.00137);
      const said = spawnSync(program, ['0', ...times.map(String)], { encoding: 'utf8' })
        .stdout.trim()
        .split('\n')
        .map(Number);
      times.forEach((t, k) => {
        // Single precision.
        expect(
          Math.abs(said[k] - excitationAt_dps(one, t)),
          `${one.axis} ${one.kind} at ${t} s`,
        ).toBeLessThan(0.002 * one.amplitude_dps);
      });
      expect(said.some((value) => Math.abs(value) > 0.5 * one.amplitude_dps)).toBe(true);
      const stopped = spawnSync(program, ['20', ...times.map(String)], { encoding: 'utf8' })
        .stdout.trim()
        .split('\n')
        .map(Number);
      expect(stopped.every((value) => value === 0)).toBe(true);
    }
  });

  it('names its cautions, in the code and in the guide', () => {
    const code = excitationC(suggestedExcitations('roll', 220)[0]);
    for (const word of ['propellers OFF', 'Kill switch', 'clear area', 'aviation rules', 'eye protection'])
      expect(code).toContain(word);
    const said = LOG_GUIDE.cautions.join(' ');
    for (const word of ['Kill switch', 'clear area', 'eye protection', 'Propellers off', 'aviation rules'])
      expect(said).toContain(word);
    for (const axis of AXES)
      expect(LOG_GUIDE.steps.some((step) => step.title.toLowerCase().startsWith(axis))).toBe(true);
  });

  it('a doublet brings the craft back: its integral is zero; the table holds the same values', () => {
    const [one] = suggestedExcitations('pitch', 220);
    const rows = excitationTable(one, 1000)
      .trim()
      .split('\n')
      .slice(1)
      .map((line) => line.split(',').map(Number));
    const turned = rows.reduce((sum, [, value]) => sum + value / 1000, 0);
    expect(Math.abs(turned)).toBeLessThan(one.amplitude_dps * 0.002 * 15);
    for (const [t, value] of rows.filter((_, k) => k % 97 === 0))
      expect(value).toBeCloseTo(excitationAt_dps(one, t), 3);
  });

  it('suggestions keep the tilt below 30 degrees; too large a one is refused with the size that would do', () => {
    for (const one of [...suggestedExcitations('roll', 400), ...suggestedExcitations('pitch', 100)]) {
      expect(largestTurn_deg(one)).toBeLessThanOrEqual(30);
      expect(() => parseExcitation(one)).not.toThrow();
    }
    const wild: Excitation = {
      kind: 'sweep',
      axis: 'roll',
      amplitude_dps: 120,
      from_Hz: 0.5,
      to_Hz: 10,
      duration_s: 20,
      taper_s: 1,
    };
    expect(() => parseExcitation(wild)).toThrow(/amplitude_dps: 120; allowed: at most 47 deg\/s here/);
    expect(() => parseExcitation({ ...wild, amplitude_dps: 20, to_Hz: 1, from_Hz: 2 })).toThrow(
      /to_Hz: 1; allowed: above from_Hz/,
    );
  });
});
