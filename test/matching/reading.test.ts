import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { InputError } from '../../src/craft/problem.ts';
import { findTimeBase } from '../../src/matching/align.ts';
import { parseColumns } from '../../src/matching/columns.ts';
import { inspectLog } from '../../src/matching/inspectLog.ts';
import { NumberScanner } from '../../src/matching/numberScanner.ts';
import {
  blobSource,
  LARGEST_LOG_BYTES,
  openLog,
  readHead,
  readLog,
  type LogSource,
} from '../../src/matching/readLog.ts';
import { risingTimes } from '../../src/matching/timeStamps.ts';

const RANGE = { min_us: 1000, max_us: 2000 };
const bytes = (text: string) => new TextEncoder().encode(text);

async function refusal(run: () => unknown): Promise<string> {
  try {
    await run();
  } catch (error) {
    if (error instanceof InputError) return error.message;
    throw error;
  }
  throw new Error('was accepted');
}

/** Reads text with the proposal as it stands, or with columns. */
async function read(text: string, columns?: unknown) {
  const source = blobSource(new Blob([text]), 'log.csv');
  const proposal = await openLog(source);
  const chosen = columns === undefined ? proposal.columns : parseColumns(columns, 'columns.json');
  return readLog(source, proposal, chosen, { range: RANGE });
}

/** Rows t, gyro, u with a line per row; `row` may change one. */
function simple(
  rows: number,
  row: (k: number) => string = (k) => `${(k * 0.0025).toFixed(4)},${k % 7},${k % 5}`,
): string {
  return `time_s,gyro_roll_dps,u_roll_us\n${Array.from({ length: rows }, (_, k) => row(k)).join('\n')}\n`;
}

describe('number scanner', () => {
  const scan = (text: string, wanted: number[], cut: number, delimiter = ',', decimal = '.') => {
    const rows: number[][] = [];
    const scanner = new NumberScanner(wanted, delimiter.charCodeAt(0), decimal.charCodeAt(0), {
      take: (values) => rows.push(Array.from(values)),
    });
    const all = bytes(text);
    for (let at = 0; at < all.length; at += cut) scanner.push(all.subarray(at, at + cut));
    scanner.finish();
    return rows;
  };

  it('reads what Number() reads, however the bytes are cut', () => {
    // Nothing a log holds is smaller than this; below it Number() goes on into denormal numbers.
    const usual = (value: number) => (Math.abs(value) < 1e-290 ? 0 : value);
    const number = fc.oneof(
      fc.double({ noNaN: true, noDefaultInfinity: true, min: -1e12, max: 1e12 }).map(usual),
      fc.integer(),
      fc.double({ noNaN: true, noDefaultInfinity: true, min: -1e-3, max: 1e-3 }).map(usual),
    );
    fc.assert(
      fc.property(
        fc.array(fc.tuple(number, number, number), { minLength: 1, maxLength: 20 }),
        fc.integer({ min: 1, max: 50 }),
        (rows, cut) => {
          const found = scan(rows.map((row) => row.map(String).join(',')).join('\r\n'), [0, 2], cut);
          expect(found.length).toBe(rows.length);
          rows.forEach((row, k) => {
            // 15 digits of the mantissa are kept: relative error below 1e-14.
            expect(Math.abs(found[k][0] - row[0])).toBeLessThanOrEqual(1e-14 * Math.abs(row[0]));
            expect(Math.abs(found[k][1] - row[2])).toBeLessThanOrEqual(1e-14 * Math.abs(row[2]));
          });
        },
      ),
      { numRuns: 200 },
    );
  });

  it.each([
    ['1,,3', [1, NaN]],
    ['1,nan,3', [1, NaN]],
    ['1,2x,3', [1, NaN]],
    ['1,-,3', [1, NaN]],
    ['1, "+2.50e1" ,3', [1, 25]],
    ['1', [1, NaN]],
    ['1,1e999,2', [1, NaN]],
    ['1,.5,2', [1, 0.5]],
  ])('cell of %j', (line, wanted) => {
    expect(scan(`${line}\n`, [0, 1], 64)).toEqual([wanted]);
  });

  it('semicolons with decimal commas, tabs, comments and blank lines', () => {
    expect(scan('# head\n1,5;2,25\n\n-0,5;1\n', [0, 1], 5, ';', ',')).toEqual([
      [1.5, 2.25],
      [-0.5, 1],
    ]);
    expect(scan('1\t2\n', [1], 1, '\t')).toEqual([[2]]);
  });
});

describe('inspection', () => {
  it.each([
    [
      'time_us,gyro_x (rad/s),gyro_y (rad/s),gyro_z (rad/s),cmd_FL_us',
      ',',
      { t: 'us', gyro_roll: 'rad/s', gyro_yaw: 'rad/s', cmd_FL: 'us' },
    ],
    [
      't [ms];p [deg/s];q [deg/s];r [deg/s];throttle [%]',
      ';',
      { t: 'ms', gyro_roll: 'deg/s', gyro_pitch: 'deg/s', throttle: '%' },
    ],
    ['time\tp\tq\tr\tu_roll_us', '\t', { t: 'us', gyro_roll: 'rad/s', u_roll: 'us' }],
  ])('proposes columns and units for %j', (heads, delimiter, wanted) => {
    const rows = Array.from({ length: 50 }, (_, k) =>
      [k * (heads.includes('ms') ? 2.5 : 2500), 0.1 * (k % 9), 0.2, 0.3, 45].join(delimiter),
    );
    const proposal = inspectLog(bytes([heads, ...rows].join('\n')));
    expect(proposal.form.delimiter).toBe(delimiter);
    for (const [signal, unit] of Object.entries(wanted))
      expect(proposal.columns[signal]?.unit, signal).toBe(unit);
    expect(proposal.reasons.every((reason) => reason.because.length > 5)).toBe(true);
  });

  it('tells the unit of a bare time by the step: 2500 a row is µs at 400 Hz, 0.0025 is seconds', () => {
    const log = (step: number) =>
      bytes(`time,p\n${Array.from({ length: 60 }, (_, k) => `${k * step},${k % 3}`).join('\n')}\n`);
    expect(inspectLog(log(2500)).columns.t?.unit).toBe('us');
    expect(inspectLog(log(0.0025)).columns.t?.unit).toBe('s');
    expect(inspectLog(log(2.5)).columns.t?.unit).toBe('ms');
  });

  it('says what is missing, and never places motors that have only numbers', () => {
    const proposal = inspectLog(
      bytes(`time_us,p_rad/s,m1_us,m2_us,m3_us,m4_us\n${'0,0.1,1500,1500,1500,1500\n'.repeat(20)}`),
    );
    expect(Object.keys(proposal.columns).some((signal) => signal.startsWith('cmd_'))).toBe(false);
    expect(proposal.missing[0].allowed).toMatch(/all four motor commands/);
  });

  it.each([
    ['nothing', '', /nothing/],
    ['a poem', 'roses are red\nviolets are blue\n', /allowed: a log: column heads/],
    ['a head line alone', 'time,p,q\n', /a head line alone/],
    ['a table of words', `a,b\n${'x,y\n'.repeat(30)}`, /allowed: a log/],
    ['binary data', 'a\u0000b', /binary data/],
    ['more binary data', '\u0001\u0002\u0003\u0004'.repeat(100), /binary data/],
    ['broken JSON lines', '{"a":1\n{"a"\n', /one complete JSON object a line/],
  ])('refuses %s', async (_name, text, message) => {
    expect(await refusal(() => inspectLog(bytes(text), 'log.csv'))).toMatch(message);
  });
});

describe('reading', () => {
  it('JSON lines give the same log as CSV', async () => {
    const csv = await read(simple(400));
    const lines = Array.from({ length: 400 }, (_, k) =>
      JSON.stringify({
        time_s: Number((k * 0.0025).toFixed(4)),
        gyro_roll_dps: k % 7,
        u_roll_us: k % 5,
        note: 'x',
      }),
    );
    const json = await read(lines.join('\n'));
    expect(json.t_s).toEqual(csv.t_s);
    expect(json.gyro_dps.roll).toEqual(csv.gyro_dps.roll);
    expect(json.axisCommand_us.roll).toEqual(csv.axisCommand_us.roll);
  });

  it('converts units and signs; shares of the command range become µs', async () => {
    const text = `a,b,c,d\n${Array.from({ length: 300 }, (_, k) => `${k * 2500},1,0.5,50`).join('\n')}\n`;
    const log = await read(text, {
      t: { column: 'a', unit: 'us' },
      gyro_roll: { column: 2, unit: 'rad/s', sign: -1 },
      u_roll: { column: 'c', unit: '1' },
      throttle: { column: 'd', unit: '%' },
    });
    expect(log.t_s[4]).toBeCloseTo(0.01, 12);
    expect(log.gyro_dps.roll?.[0]).toBeCloseTo(-57.29578, 4);
    expect(log.axisCommand_us.roll?.[0]).toBe(500);
    expect(log.throttle?.[0]).toBe(0.5);
  });

  it('leaves out rows without numbers, counts them, and refuses a log that is mostly such', async () => {
    const log = await read(
      simple(500, (k) => (k % 50 === 3 ? `${k * 0.0025},NaN,1` : `${k * 0.0025},${k % 7},2`)),
    );
    expect(log.t_s.length).toBe(490);
    expect(log.remarks.join(' ')).toMatch(/10 of 500 rows had no number/);
    const bad = simple(500, (k) => (k % 2 === 0 ? `${k * 0.0025},,1` : `${k * 0.0025},1,2`));
    expect(await refusal(() => read(bad))).toMatch(/log\.csv: line 2: "250 of 500 rows.*allowed: .*80 %/);
  });

  it.each([
    [
      'falling time',
      simple(400, (k) => `${k === 200 ? 0.1 : k * 0.0025},1,2`),
      /row 201, t: 0.1; allowed: a time not before/,
    ],
    [
      'time that stands still',
      simple(400, () => '5,1,2'),
      /t: "?5 in every row"?; allowed: a time that rises/,
    ],
    ['too few rows', simple(50), /rows: "?50 rows"?; allowed: at least 200/],
    [
      'a pause of hours',
      simple(400, (k) => `${k * 0.0025 + (k > 200 ? 9999 : 0)},1,2`),
      /pauses of at most 3600 s/,
    ],
  ])('refuses %s', async (_name, text, message) => {
    expect(await refusal(() => read(text))).toMatch(message);
  });

  it('a log of 2 GB is refused before it is read, with what to do', async () => {
    const huge: LogSource = {
      name: 'huge.csv',
      size_bytes: LARGEST_LOG_BYTES,
      open: () => {
        throw new Error('must not be opened');
      },
    };
    expect(await refusal(() => readHead(huge))).toMatch(/huge\.csv: .*2\.0 GB.*cut out the minutes/);
  });

  it('tells progress and can be stopped', async () => {
    const source = blobSource(new Blob([simple(20_000)]), 'log.csv');
    const proposal = await openLog(source);
    const shares: number[] = [];
    await readLog(source, proposal, proposal.columns, {
      range: RANGE,
      onProgress: (share) => shares.push(share),
    });
    expect(shares.at(-1)).toBeCloseTo(1, 6);
    const stop = AbortSignal.abort();
    await expect(readLog(source, proposal, proposal.columns, { range: RANGE, signal: stop })).rejects.toThrow(
      /abort/i,
    );
  });
});

describe('columns file', () => {
  const good = {
    t: { column: 'a', unit: 'us' },
    gyro_roll: { column: 'p', unit: 'rad/s' },
    u_roll: { column: 'u' },
  };
  it.each([
    [{ ...good, gyro_rol: good.gyro_roll }, /columns: gyro_rol: .*no field of this name/],
    [
      { ...good, t: { column: 'a', unit: 'hours' } },
      /t\.unit: "hours"; allowed: one of "s", "ms", "us", "ns"/,
    ],
    [{ ...good, t: { column: 'a', unit: 'us', factor: 2 } }, /t\.factor: 2; allowed: no field of this name/],
    [{ ...good, gyro_roll: { column: 'p', unit: 'rad/s', sign: 2 } }, /gyro_roll\.sign: 2; allowed: 1 or -1/],
    [{ gyro_roll: good.gyro_roll, u_roll: good.u_roll }, /columns: t: missing/],
    [{ t: good.t, u_roll: good.u_roll }, /gyro_roll: missing; allowed: the column of at least one/],
    [
      { t: good.t, gyro_roll: good.gyro_roll, cmd_FL: { column: 'm' } },
      /cmd_FR: missing; allowed: .*all four motor commands/,
    ],
    ['text', /columns: content: "text"; allowed: an object with/],
  ])('refuses %j', async (raw, message) => {
    expect(await refusal(() => parseColumns(raw))).toMatch(message);
  });

  it('a unit that is not said is the usual one: s, deg/s, a share of throttle, µs', () => {
    const columns = parseColumns({
      t: { column: 'a' },
      gyro_roll: { column: 'p' },
      throttle: { column: 'h' },
      u_roll: { column: 'u' },
      cmd_FL: { column: 'm' },
    });
    const units = ['t', 'gyro_roll', 'throttle', 'u_roll', 'cmd_FL'].map((signal) => columns[signal]?.unit);
    expect(units).toEqual(['s', 'deg/s', '1', 'us', 'us']);
  });

  it('a column the log does not have is named with the heads there are', async () => {
    const columns = { ...good, t: { column: 'clock', unit: 'us' } };
    expect(await refusal(() => read(simple(300), columns))).toMatch(
      /t\.column: "clock"; allowed: one of the log's heads: time_s, gyro_roll_dps, u_roll_us/,
    );
  });
});

describe('time base', () => {
  it.each([
    ['16-bit µs', 16, 1e-6, 2500],
    ['16-bit ms', 16, 1e-3, 5],
    ['32-bit µs', 32, 1e-6, 2500],
  ])('a %s counter that wraps is unrolled', (_name, bits, unit_s, step) => {
    const start = 2 ** bits - 20 * step;
    const raw = Float64Array.from({ length: 300 }, (_, k) => (start + k * step) % 2 ** bits);
    const { t_s, remarks } = risingTimes(raw, unit_s, 'log.csv');
    t_s.forEach((t, k) => {
      expect(t).toBeCloseTo(k * step * unit_s, 9);
    });
    expect(remarks.join(' ')).toMatch(/wrapped/);
  });

  it('finds period, jitter and lost rows, also with 5 % lost', () => {
    let state = 7;
    const random = () => (state = (state * 48271) % 2147483647) / 2147483647;
    const kept: number[] = [];
    let lost = 0;
    for (let k = 0; k < 8000; k++) {
      const at = k * 0.0025 + 0.0004 * (random() - 0.5);
      if (random() < 0.05 && k > 0 && k < 7999) lost++;
      else kept.push(at);
    }
    const base = findTimeBase(Float64Array.from(kept));
    expect(base.period_s).toBeCloseTo(0.0025, 6);
    expect(base.lostRows).toBe(lost);
    // Uniform within ±0.2 ms: standard deviation 0.2/√3 ms.
    expect(base.jitter_s).toBeCloseTo(0.0002 / Math.sqrt(3), 5);
    for (const stretch of base.stretches) {
      stretch.logged_s.forEach((t, i) => {
        if (i > 0) expect(t).toBeGreaterThan(stretch.logged_s[i - 1]);
      });
    }
  });

  it('stamps rounded to milliseconds still show a tick of 400 Hz', () => {
    const t = Float64Array.from({ length: 4000 }, (_, k) => Math.round(k * 2.5) / 1000);
    const base = findTimeBase(t);
    expect(base.period_s).toBeCloseTo(0.0025, 6);
    expect(base.lostRows).toBe(0);
  });

  it('a pause parts the log', () => {
    const t = Float64Array.from({ length: 2000 }, (_, k) => k * 0.0025 + (k >= 1200 ? 4 : 0));
    expect(findTimeBase(t).stretches.map((stretch) => stretch.row.length)).toEqual([1200, 800]);
  });
});
