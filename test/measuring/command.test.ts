import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { Command } from 'commander';
import { afterAll, beforeAll, describe, expect, it, vi } from 'vitest';
import { addMeasureCommand } from '../../src/cli/measure.ts';
import { uiucStatic } from './support.ts';

let folder = '';
beforeAll(() => {
  folder = mkdtempSync(path.join(tmpdir(), 'measure-'));
});
afterAll(() => rmSync(folder, { recursive: true }));

function file(name: string, content: string | Buffer): string {
  const full = path.join(folder, name);
  writeFileSync(full, content);
  return full;
}

/** Runs `measure …` in this process and takes what it writes and its exit code. */
async function measure(...words: string[]): Promise<{ code: number; out: string; err: string }> {
  const program = new Command('gustbench').exitOverride();
  addMeasureCommand(program);
  let out = '';
  let err = '';
  const stdout = vi
    .spyOn(process.stdout, 'write')
    .mockImplementation((text) => ((out += String(text)), true));
  const stderr = vi
    .spyOn(process.stderr, 'write')
    .mockImplementation((text) => ((err += String(text)), true));
  const before = process.exitCode;
  try {
    await program.parseAsync(['measure', ...words], { from: 'user' });
    return { code: Number(process.exitCode ?? 0), out, err };
  } finally {
    stdout.mockRestore();
    stderr.mockRestore();
    process.exitCode = before;
  }
}

interface Printed {
  readonly propeller: {
    thrustCoefficient: number;
    powerCoefficient: number;
    staticTable: { rpm: number; ct: number; cp: number }[];
  };
  readonly quantities: Record<string, { value: number; sigma: number; unit: string }>;
  readonly build?: { format: string; propeller: { diameter_m: number } };
  readonly axes: Record<string, { allan: { tau_s: number[]; deviation: number[] } }>;
}

describe('measure on the command line', () => {
  it('stand --json prints one object with propeller, coefficients and staticTable', async () => {
    const { code, out } = await measure(
      'stand',
      file('uiuc.csv', uiucStatic()),
      '--diameter_m',
      '0.254',
      '--json',
    );
    expect(code).toBe(0);
    expect(out.trimEnd().split('\n')).toHaveLength(1);
    const printed = JSON.parse(out) as Printed;
    expect(printed.propeller.staticTable[0]).toEqual({ rpm: 2377, ct: 0.1059, cp: 0.0431 });
    expect(printed.quantities.thrustCoefficient.unit).toBe('1');
    expect(printed.quantities.thrustCoefficient.sigma).toBeGreaterThan(0);
  });

  it('writes a build with --build and --out', async () => {
    const out = path.join(folder, 'out.build.json');
    const { code } = await measure(
      'stand',
      file('u.csv', uiucStatic()),
      '--diameter_m',
      '0.254',
      '--json',
      '--build',
      'scenes/sandpiper.build.json',
      '--out',
      out,
    );
    expect(code).toBe(0);
    expect((JSON.parse(readFileSync(out, 'utf8')) as { format: string }).format).toBe('gustbench.build/1');
  });

  it('joins swing tests from several files', async () => {
    const csv = (axis: string) =>
      `# method: bifilar\n# axis: ${axis}\n# mass_kg: 1.35\n# wireDistance_m: 0.3\n# wireLength_m: 1.2\nswings,time_s\n20,30\n20,30.1\n20,29.9\n`;
    const { out } = await measure('swing', file('r.csv', csv('roll')), file('p.csv', csv('pitch')), '--json');
    expect(Object.keys((JSON.parse(out) as Printed).quantities)).toEqual([
      'inertia_xx_kgm2',
      'inertia_yy_kgm2',
    ]);
  });

  it('still prints the Allan curve as lists', async () => {
    const rows = Array.from({ length: 1000 }, (_, i) => `${i / 500},${((i * 7919) % 211) / 1000}`).join('\n');
    const { out } = await measure('still', file('g.csv', `t_s,gyro_x (deg/s)\n${rows}\n`), '--json');
    const { allan } = (JSON.parse(out) as Printed).axes.roll;
    expect(allan.tau_s).toHaveLength(allan.deviation.length);
    expect(allan.tau_s[0]).toBeCloseTo(0.002, 9);
  });

  it('reads columns from a mapping', async () => {
    const columns = file(
      'columns.json',
      '{"thrust":{"column":"load","unit":"g"},"speed":{"column":"turns","unit":"rev/min"}}',
    );
    const csv = file('odd.csv', 'turns,load\n3000,300\n4000,540\n5000,850\n');
    const { code, out } = await measure(
      'stand',
      csv,
      '--diameter_m',
      '0.254',
      '--columns',
      columns,
      '--json',
    );
    expect(code).toBe(0);
    expect((JSON.parse(out) as Printed).propeller.thrustCoefficient).toBeGreaterThan(0.2);
  });

  it('for people: quantities with 95 %, table, and that it is no clearance', async () => {
    const { out } = await measure('stand', file('v.csv', uiucStatic()), '--diameter_m', '0.254');
    expect(out).toMatch(/thrustCoefficient\s+0\.12\d+ ± .* \(95 %\)/);
    expect(out).toMatch(/C_T ranges over 22.7 %/);
    expect(out).toMatch(/no clearance to fly/);
  });

  const junk = Buffer.from(Array.from({ length: 3000 }, (_, i) => (i * 7919) % 256));
  const bad: [what: string, words: () => string[], line: RegExp][] = [
    [
      'a file that is not there',
      () => ['stand', 'nowhere.csv', '--diameter_m', '0.2'],
      /^nowhere.csv: content: "ENOENT"; allowed: a file that can be read\n$/,
    ],
    [
      'binary junk',
      () => ['still', file('j.bin', junk)],
      /^.*j.bin: content: "binary data"; allowed: a text file.*\n$/,
    ],
    [
      'an empty file',
      () => ['spinup', file('e.csv', '')],
      /^.*e.csv: content: "nothing"; allowed: a head line.*\n$/,
    ],
    ['not a table', () => ['spinup', file('x.csv', 'lorem ipsum\n')], /^.*x.csv: .*allowed: a .*\n$/],
    [
      'a diameter out of range',
      () => ['stand', file('w.csv', uiucStatic()), '--diameter_m', '254'],
      /^command line: --diameter_m: "254"; allowed: a number from 0.02 to 5 m\n$/,
    ],
    [
      'a wrong mapping',
      () => [
        'stand',
        file('y.csv', uiucStatic()),
        '--diameter_m',
        '0.254',
        '--columns',
        file('c.json', '{"lift":{"column":"ct"}}'),
      ],
      /^.*c.json: lift: .*allowed: no quantity of this name; one of .*\n$/,
    ],
    [
      '--out without --build',
      () => ['stand', file('z.csv', uiucStatic()), '--diameter_m', '0.254', '--out', 'o.json'],
      /^command line: --out: "o.json"; allowed: --build.*\n$/,
    ],
  ];
  it.each(bad)(
    '%s: one line on standard error, exit 2, nothing on standard output',
    async (_what, words, line) => {
      const { code, out, err } = await measure(...words());
      expect(err).toMatch(line);
      expect(code).toBe(2);
      expect(out).toBe('');
    },
  );
});
