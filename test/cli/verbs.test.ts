/** The command line as a person or a script meets it: the agreed interface, exit codes, one-line errors. */
import { spawnSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { root } from '../../src/cli/setup.mjs';

const BUILD = 'scenes/sandpiper.build.json';
const GAINS = 'scenes/sandpiper.gains.json';
let folder = '';
beforeAll(() => {
  folder = mkdtempSync(path.join(tmpdir(), 'gustbench-cli-'));
});
afterAll(() => rmSync(folder, { recursive: true, force: true }));

function run(...args: string[]) {
  const done = spawnSync(process.execPath, ['src/cli/launch.mjs', ...args], {
    cwd: root,
    encoding: 'utf8',
    maxBuffer: 1 << 28,
  });
  return { code: done.status, out: done.stdout, err: done.stderr };
}

function file(name: string, content: unknown): string {
  const place = path.join(folder, name);
  writeFileSync(place, typeof content === 'string' ? content : JSON.stringify(content));
  return place;
}

/** Bad input: exit 2 and one line, no stack, nothing on standard output. */
function expectRefusal(result: ReturnType<typeof run>, message: RegExp): void {
  expect(result.code).toBe(2);
  expect(result.out).toBe('');
  expect(result.err.trim().split('\n').length, result.err).toBe(1);
  expect(result.err).toMatch(message);
  expect(result.err).not.toMatch(/ at .*\.(ts|js|mjs):\d+/);
}

describe('fly', () => {
  it('writes the agreed record, and the same seed gives the same bytes', () => {
    const at = (name: string, seed: string) => {
      const out = path.join(folder, name);
      const result = run(
        'fly',
        '--build',
        BUILD,
        '--gains',
        GAINS,
        '--scene',
        'scenes/estuary-bridge.scene.json',
        '--hover',
        '--duration',
        '2',
        '--seed',
        seed,
        '--out',
        out,
        '--json',
      );
      expect(result.code).toBe(0);
      expect(JSON.parse(result.out)).toMatchObject({ ticks: 800, stopped: null });
      return readFileSync(out, 'utf8');
    };
    const text = at('a.csv', '5');
    expect(text).toBe(at('b.csv', '5'));
    expect(text).not.toBe(at('c.csv', '6'));
    const lines = text.trimEnd().split('\n');
    const heads = lines.find((line) => !line.startsWith('#'))?.split(',') ?? [];
    expect(heads).toEqual([
      ...[
        't_s',
        'sp_roll_dps',
        'sp_pitch_dps',
        'sp_yaw_dps',
        'throttle',
        'rate_roll_dps',
        'rate_pitch_dps',
        'rate_yaw_dps',
      ],
      ...[
        'gyro_roll_dps',
        'gyro_pitch_dps',
        'gyro_yaw_dps',
        'cmd_FL_us',
        'cmd_FR_us',
        'cmd_RL_us',
        'cmd_RR_us',
      ],
      ...['speed_FL_rpm', 'speed_FR_rpm', 'speed_RL_rpm', 'speed_RR_rpm', 'north_m', 'east_m', 'down_m'],
      ...[
        'vn_mps',
        've_mps',
        'vd_mps',
        'qw',
        'qx',
        'qy',
        'qz',
        'wind_n_mps',
        'wind_e_mps',
        'wind_d_mps',
        'battery_V',
        'current_A',
      ],
    ]);
    expect(lines.filter((line) => !line.startsWith('#')).length).toBe(801);
    for (const line of lines.slice(-20))
      for (const cell of line.split(',')) expect(Number.isFinite(Number(cell))).toBe(true);
  }, 60_000);

  it('flies sticks from a file in free air', () => {
    const sticks = file(
      'sticks.csv',
      't_s,roll,pitch,yaw,throttle\n0,0,0,0,0.46\n0.5,0,0,0,0.46\n0.52,0.3,0,0,0.46\n2,0.3,0,0,0.46\n',
    );
    const out = path.join(folder, 'rolled.csv');
    expect(
      run(
        'fly',
        '--build',
        BUILD,
        '--gains',
        GAINS,
        '--free',
        '--sticks',
        sticks,
        '--duration',
        '1.2',
        '--out',
        out,
      ).code,
    ).toBe(0);
    const rows = readFileSync(out, 'utf8')
      .split('\n')
      .filter((line) => /^\d/.test(line))
      .map((line) => line.split(',').map(Number));
    const last = rows.at(-1) ?? [];
    expect(last[1]).toBeCloseTo(66, 5);
    expect(Math.abs(last[5] - 66), 'roll rate follows').toBeLessThan(8);
  }, 60_000);

  it.each([
    [
      ['--build', 'nowhere.json', '--gains', GAINS, '--duration', '1'],
      /nowhere\.json: content: "ENOENT"; allowed: a file that can be read/,
    ],
    [
      ['--build', GAINS, '--gains', GAINS, '--duration', '1'],
      /sandpiper\.gains\.json: format: .*allowed: "gustbench\.build\/1"/,
    ],
    [
      ['--build', BUILD, '--gains', GAINS, '--duration', '-3'],
      /command line: --duration: "-3"; allowed: a number from 0\.01/,
    ],
    [
      ['--build', BUILD, '--gains', GAINS, '--duration', '1', '--hover', '--free'],
      /one of --hover and --free/,
    ],
    [
      ['--build', BUILD, '--gains', GAINS, '--duration', '1', '--colour', 'red'],
      /command line: unknown option '--colour'/,
    ],
    [['--build', BUILD, '--duration', '1'], /required option '--gains <file>'/],
  ])(
    'refuses %j in one line',
    (args, message) => {
      expectRefusal(run('fly', ...args), message);
    },
    60_000,
  );

  it('refuses truncated, binary and huge files', () => {
    const cut = file('cut.json', readFileSync(path.join(root, BUILD), 'utf8').slice(0, 300));
    expectRefusal(
      run('fly', '--build', cut, '--gains', GAINS, '--duration', '1'),
      /cut\.json: content: .*a complete JSON object/,
    );
    const junk = file('junk.json', `\0\0${'x'.repeat(50)}`);
    expectRefusal(run('fly', '--build', junk, '--gains', GAINS, '--duration', '1'), /binary data/);
    const huge = file('huge.json', `"${'x'.repeat(5_000_000)}"`);
    expectRefusal(run('fly', '--build', huge, '--gains', GAINS, '--duration', '1'), /at most 4000000 bytes/);
  }, 60_000);
});

describe('shape', () => {
  it('with --plant gives the agreed keys; a P-only integrator with lag has its closed-form phase margin', () => {
    const axis = { p_us_per_dps: 1, i_us_per_deg: 0, d_us_per_dps2: 0, feedforward_us_per_dps: 0 };
    const gains = file('p.json', {
      format: 'gustbench.gains/1',
      loop_Hz: 8000,
      computeDelay_s: 0.001,
      axes: { roll: axis, pitch: axis, yaw: axis },
    });
    const result = run(
      'shape',
      '--plant',
      '{"gain_dps2_per_us":30,"lag_s":0.02,"delay_s":0.002}',
      '--gains',
      gains,
      '--json',
    );
    expect(result.code).toBe(0);
    const { roll } = JSON.parse(result.out) as Record<
      string,
      Record<string, unknown> & { step: object; plant: object }
    >;
    for (const key of [
      'stable',
      'gainMargin_dB',
      'phaseMargin_deg',
      'delayMargin_ms',
      'crossover_Hz',
      'maxSensitivity',
      'polesMaxRadius',
      'noiseAtMotor_us_rms',
    ]) {
      expect(roll).toHaveProperty(key);
    }
    expect(Object.keys(roll.step)).toEqual(['rise_s', 'overshoot_pct', 'settle_s']);
    expect(roll.plant).toEqual({ gain_dps2_per_us: 30, lag_s: 0.02, delay_s: 0.002 });
    // |L| = 1: K²p² = ω²(1 + ω²τ²); PM = 90° − arctan ωτ − ω(Td + 1 ms + half a tick), near-continuous at 8 kHz.
    const w2 = (-1 + Math.sqrt(1 + 4 * 0.02 ** 2 * 30 ** 2)) / (2 * 0.02 ** 2);
    const w = Math.sqrt(w2);
    const margin = 90 - (180 / Math.PI) * (Math.atan(w * 0.02) + w * (0.003 + 0.5 / 8000));
    expect(roll.phaseMargin_deg).toBeCloseTo(margin, 1);
    expect((roll.crossover_Hz as number) * 2 * Math.PI).toBeCloseTo(w, 2);
  }, 60_000);

  it('--start proposes a gains file that is stable on the build it came from', () => {
    const started = run('shape', '--start', '--build', BUILD, '--gains', GAINS);
    expect(started.code).toBe(0);
    const gains = file('start.json', started.out);
    const result = run('shape', '--build', BUILD, '--gains', gains, '--json');
    const report = JSON.parse(result.out) as Record<
      'roll' | 'pitch' | 'yaw',
      { stable: boolean; maxSensitivity: number; phaseMargin_deg: number }
    >;
    for (const axis of ['roll', 'pitch', 'yaw'] as const) {
      expect(report[axis].stable).toBe(true);
      expect(report[axis].maxSensitivity).toBeLessThan(1.65);
      expect(report[axis].phaseMargin_deg).toBeGreaterThan(44);
    }
  }, 60_000);

  it('absurd gains: statements and nulls, never NaN', () => {
    const axis = { p_us_per_dps: 900, i_us_per_deg: -5000, d_us_per_dps2: 90, feedforward_us_per_dps: 0 };
    const gains = file('mad.json', {
      format: 'gustbench.gains/1',
      loop_Hz: 50,
      computeDelay_s: 0.05,
      axes: { roll: axis, pitch: { ...axis, p_us_per_dps: 0, i_us_per_deg: 0, d_us_per_dps2: 0 }, yaw: axis },
    });
    const result = run(
      'shape',
      '--plant',
      '{"gain_dps2_per_us":-300,"lag_s":0,"delay_s":0.4}',
      '--gains',
      gains,
      '--json',
    );
    expect(result.code).toBe(0);
    expect(result.out).not.toMatch(/NaN|Infinity/);
    expect(JSON.parse(result.out)).toMatchObject({ roll: { stable: false } });
  }, 60_000);

  it('refuses both and neither of --build and --plant, and a broken plant', () => {
    expectRefusal(run('shape', '--gains', GAINS), /exactly one of --build and --plant/);
    expectRefusal(
      run('shape', '--gains', GAINS, '--plant', '{"gain_dps2_per_us":1'),
      /a complete JSON object/,
    );
  }, 60_000);
});

describe('carry', () => {
  it('writes sheet, constants and files; the sheet defers to rules and pilots', () => {
    const out = path.join(folder, 'sheet');
    const result = run(
      'carry',
      '--build',
      BUILD,
      '--gains',
      GAINS,
      '--out',
      out,
      '--date',
      '2026-01-02',
      '--no-trials',
      '--json',
    );
    expect(result.code).toBe(0);
    const sheet = readFileSync(path.join(out, 'sheet.html'), 'utf8');
    expect(sheet).toMatch(/A simulated pass is not clearance to fly/);
    expect(sheet).toMatch(/Local aviation rules/);
    expect(sheet).not.toMatch(/NaN|undefined/);
    expect(readFileSync(path.join(out, 'rate_gains.h'), 'utf8')).toMatch(/#define RATE_ROLL_P/);
    expect(JSON.parse(readFileSync(path.join(out, 'build.json'), 'utf8'))).toHaveProperty(
      'name',
      'Sandpiper',
    );
  }, 60_000);
});

describe('a flight’s own record through match', () => {
  it('gives back the gain and lag that the linear model has, from an excited hover', () => {
    const rows = ['t_s,roll,pitch,yaw,throttle'];
    for (let k = 0; k <= 2500; k++) {
      const t = k / 50;
      const tones = (list: number[], phase: number) =>
        list.reduce((sum, f, i) => sum + Math.sin(2 * Math.PI * f * t + phase * (i + 1)), 0) / list.length;
      rows.push(
        [
          t.toFixed(3),
          (0.35 * tones([0.4, 0.9, 1.7, 2.9, 4.3, 6.1], 1)).toFixed(4),
          (0.35 * tones([0.5, 1.1, 1.9, 3.1, 4.7, 6.7], 2)).toFixed(4),
          '0',
          '0.5',
        ].join(','),
      );
    }
    const log = path.join(folder, 'log.csv');
    expect(
      run(
        'fly',
        '--build',
        BUILD,
        '--gains',
        GAINS,
        '--hover',
        '--sticks',
        file('tones.csv', rows.join('\n')),
        '--duration',
        '50',
        '--out',
        log,
      ).code,
    ).toBe(0);
    const result = run('match', '--build', BUILD, '--log', log, '--json');
    expect(result.code).toBe(0);
    const { axes } = JSON.parse(result.out) as {
      axes: Record<string, { gain_dps2_per_us?: { value: number }; lag_s?: { value: number }; note: string }>;
    };
    const model = JSON.parse(run('shape', '--build', BUILD, '--gains', GAINS, '--json').out) as Record<
      string,
      { plant: { gain_dps2_per_us: number; lag_s: number } }
    >;
    expect(
      Math.abs((axes.roll.gain_dps2_per_us?.value ?? 0) / model.roll.plant.gain_dps2_per_us - 1),
    ).toBeLessThan(0.05);
    expect(Math.abs((axes.roll.lag_s?.value ?? 0) / model.roll.plant.lag_s - 1)).toBeLessThan(0.2);
    expect(axes.yaw.gain_dps2_per_us ?? null, 'yaw was not excited').toBeNull();
    expect(axes.yaw.note.length).toBeGreaterThan(10);
  }, 120_000);
});
