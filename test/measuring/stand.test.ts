import { describe, expect, it } from 'vitest';
import { RandomStream } from '../../src/math/random.ts';
import { readTable } from '../../src/measuring/columns.ts';
import { analyseStand, type StandOptions } from '../../src/measuring/stand.ts';
import { holds, refusal, uiucStatic } from './support.ts';

const D = 0.254;
const G = 9.80665;
const stand = (text: string, options: Partial<StandOptions> = {}) =>
  analyseStand([readTable(text, 'f')], { diameter_m: D, density_kgpm3: 1.225, ...options });

/** Thrust (N) and torque (N·m) at `rpm` from the definitions of C_T and C_P. */
const thrustAt = (ct: number, rpm: number, rho = 1.225) => ct * rho * (rpm / 60) ** 2 * D ** 4;
const torqueAt = (cp: number, rpm: number, rho = 1.225) =>
  (cp / (2 * Math.PI)) * rho * (rpm / 60) ** 2 * D ** 5;

const uiucRows = uiucStatic()
  .split('\n')
  .filter((line) => /^\d/.test(line))
  .map((line) => line.split(',').map(Number));

describe('UIUC static run of a 10 × 4.7 propeller (Brandt & Selig, AIAA 2011-1255, kt0835)', () => {
  const units: [what: string, head: string, row: (rpm: number, ct: number, cp: number) => number[]][] = [
    ['coefficients', 'rpm,ct,cp', (rpm, ct, cp) => [rpm, ct, cp]],
    [
      'N, N·m, rev/min',
      'rpm,thrust_N,Torque [N·m]',
      (rpm, ct, cp) => [rpm, thrustAt(ct, rpm), torqueAt(cp, rpm)],
    ],
    [
      'g, N·mm, rad/s',
      'speed_rad/s,Thrust (g),Torque (N·mm)',
      (rpm, ct, cp) => [(rpm * Math.PI) / 30, (thrustAt(ct, rpm) / G) * 1000, torqueAt(cp, rpm) * 1000],
    ],
    [
      'kgf, kgf·cm, rev/s',
      'n (rev/s),Thrust (kgf),Torque (kg-cm)',
      (rpm, ct, cp) => [rpm / 60, thrustAt(ct, rpm) / G, (torqueAt(cp, rpm) / G) * 100],
    ],
    [
      'lbf, oz·in',
      'RPM,Thrust (lbf),Torque (oz-in)',
      (rpm, ct, cp) => [rpm, thrustAt(ct, rpm) / 4.4482216, torqueAt(cp, rpm) / 0.0070615518],
    ],
    [
      'shaft power',
      'RPM,thrust_N,Mechanical power (W)',
      (rpm, ct, cp) => [rpm, thrustAt(ct, rpm), (torqueAt(cp, rpm) * rpm * Math.PI) / 30],
    ],
  ];
  it.each(units)('C_T rises from 0.1059 to 0.1299 from %s', (_what, head, row) => {
    const text = [head, ...uiucRows.map(([rpm, ct, cp]) => row(rpm, ct, cp).join(','))].join('\n');
    const { propeller, constantCost, outliers, quantities } = stand(text);
    const table = propeller.staticTable ?? [];
    expect(table).toHaveLength(16);
    table.forEach((point, i) => {
      expect(point.rpm / uiucRows[i][0]).toBeCloseTo(1, 5);
      expect(point.ct / uiucRows[i][1]).toBeCloseTo(1, 5);
      expect((point.cp ?? 0) / uiucRows[i][2]).toBeCloseTo(1, 5);
    });
    expect(constantCost.thrust.range_pct).toBeCloseTo(100 * (0.1299 / 0.1059 - 1), 2);
    expect(outliers).toEqual([]);
    // About n^0.22 over the run; the fit leans to the faster rows.
    expect(Math.abs(quantities.thrustExponent.value - 0.22)).toBeLessThan(0.02);
    expect(propeller.thrustCoefficient).toBeGreaterThan(0.1059);
    expect(propeller.thrustCoefficient).toBeLessThan(0.1299);
  });

  it('the attribution travels with the copy', () => {
    expect(uiucStatic().split('\n')[0]).toMatch(/UIUC Propeller Data Site.*Brandt and Selig, AIAA 2011-1255/);
  });
});

/** A stand run of a motor with known constants: u V = R i + K_e Ω, i = Q/K_t + I₀, I = u i. */
function run(options: {
  kv?: number;
  voltages?: readonly number[];
  noise?: number;
  seed?: number;
  exponent?: number;
  from?: number;
}): string {
  const { kv = 700, voltages = [16], noise = 0, seed = 1, exponent = 0, from = 0.2 } = options;
  const random = new RandomStream(seed, 'stand');
  const noisy = (value: number) => value * (1 + noise * random.gaussian());
  const ke = 60 / (2 * Math.PI * kv);
  const lines = ['Throttle (%),rpm,thrust_N,torque_Nm,Voltage (V),Current (A)'];
  for (const voltage of voltages) {
    for (let u = from; u < 1.001; u += 0.04) {
      let low = 0;
      let high = (u * voltage) / ke;
      let current = 0;
      for (let k = 0; k < 60; k++) {
        const speed = (low + high) / 2;
        const torque = torqueAt(0.048 * (speed / 500) ** exponent, (speed * 30) / Math.PI);
        current = (u * voltage - ke * speed) / 0.12;
        if (ke * (current - 0.6) > torque) low = speed;
        else high = speed;
      }
      const rpm = (low * 30) / Math.PI;
      lines.push(
        [
          100 * u,
          rpm,
          noisy(thrustAt(0.115 * (low / 500) ** exponent, rpm)),
          noisy(torqueAt(0.048 * (low / 500) ** exponent, rpm)),
          voltage,
          noisy(u * current),
        ].join(','),
      );
    }
  }
  return lines.join('\n');
}

describe('motor constants', () => {
  it('KV 700 has K_t = 60/(2π·KV) = 0.013642 N·m/A', () => {
    const { motor, quantities } = stand(run({ kv: 700 }));
    expect(60 / (2 * Math.PI * quantities.kv_rpm_per_V.value)).toBeCloseTo(0.013642, 6);
    expect(motor?.resistance.value).toBeCloseTo(0.12, 4);
    expect(motor?.noLoadCurrent?.value).toBeCloseTo(0.6, 3);
    expect(motor?.residual_V).toBeLessThan(1e-3);
  });

  it('comes out of three voltages in one file, told apart', () => {
    const result = stand(run({ voltages: [11.1, 14.8, 22.2], noise: 0.01, seed: 3 }));
    expect(result.voltages.map((group) => group.highest_V)).toEqual([11.1, 14.8, 22.2]);
    expect(Math.abs(result.quantities.kv_rpm_per_V.value / 700 - 1)).toBeLessThan(0.02);
    expect(Math.abs(result.quantities.resistance_ohm.value / 0.12 - 1)).toBeLessThan(0.15);
  });

  it('without torque I₀ is read off the square law, and that is said', () => {
    const text = run({})
      .split('\n')
      .map((line) =>
        line
          .split(',')
          .filter((_, i) => i !== 3)
          .join(','),
      )
      .join('\n');
    const { motor, notes, propeller } = stand(text);
    expect(motor?.noLoadCurrent?.value).toBeCloseTo(0.6, 2);
    expect(notes.join(' ')).toMatch(/for want of a torque column/);
    expect(propeller.powerCoefficient).toBeUndefined();
  });
});

describe('what the stand says about itself', () => {
  it('a row with a wrong thrust is shown as an outlier and does not move the fit', () => {
    const clean = stand(run({ noise: 0.005 }));
    const lines = run({ noise: 0.005 }).split('\n');
    const cells = lines[8].split(',');
    cells[2] = String(1.3 * Number(cells[2]));
    lines[8] = cells.join(',');
    const spoilt = stand(lines.join('\n'));
    expect(spoilt.outliers.map((row) => row.row)).toEqual([8]);
    expect(spoilt.outliers[0].outlier).toMatch(/thrust .* times the usual scatter above/);
    expect(spoilt.residuals).toHaveLength(lines.length - 1);
    expect(Math.abs(spoilt.propeller.thrustCoefficient / clean.propeller.thrustCoefficient - 1)).toBeLessThan(
      0.003,
    );
  });

  it('dead zone lies between the last still and the first turning command; tare is taken off', () => {
    const rows = [
      [1000, 0],
      [1040, 0],
      [1060, 900],
      [1200, 2500],
      [1500, 5000],
      [2000, 8000],
    ].map(([us, rpm]) => [us, rpm, (thrustAt(0.11, rpm) / G) * 1000 + 15]);
    const { quantities, notes, propeller } = stand(
      ['esc_us,RPM,Thrust (g)', ...rows.map((row) => row.join(','))].join('\n'),
    );
    expect(quantities.deadZone.value).toBe(1050);
    expect(quantities.deadZone.sigma).toBeCloseTo(20 / Math.sqrt(12), 9);
    expect(notes.join(' ')).toMatch(/at rest; that was taken off every row/);
    expect(propeller.thrustCoefficient).toBeCloseTo(0.11, 5);
  });

  it('command to speed: a point each command, and how far from a straight line', () => {
    const rows = [1200, 1400, 1600, 1800].map((us, i) => [us, [2000, 4000, 6000, 7600][i]]);
    const text = [
      'esc_us,RPM,thrust_N',
      ...rows.map(([us, rpm]) => `${us},${rpm},${thrustAt(0.11, rpm)}`),
    ].join('\n');
    const { points, straightLine_pct } = stand(text).commandMap;
    expect(points.map((point) => [point.command, Math.round(point.speed_rpm)])).toEqual(rows);
    // Least squares through 2, 4, 6, 7.6 at 0, 1, 2, 3: slope 1.88, residuals −0.08, 0.04, 0.16, −0.12.
    expect(straightLine_pct).toBeCloseTo((100 * 160) / 7600, 6);
  });

  it('efficiency is grams per watt', () => {
    const { efficiency } = stand('rpm,Thrust (g),Power (W)\n3000,200,20\n4000,355,40\n5000,556,80\n');
    expect(efficiency[0].efficiency_gPerW).toBeCloseTo(10, 6);
  });

  it('density: ISO 2533 at 2000 m is 1.00649 kg/m³; without anything sea level is taken and said', () => {
    const text = 'rpm,thrust_N\n3000,3\n4000,5.3\n5000,8.3\n';
    const high = stand(text, { density_kgpm3: undefined, elevation_m: 2000 });
    expect(high.air.density_kgpm3).toBeCloseTo(1.00649, 5);
    const low = stand(text, { density_kgpm3: undefined });
    expect(low.air.density_kgpm3).toBeCloseTo(1.225, 5);
    expect(low.notes.join(' ')).toMatch(/ISO 2533 at sea level/);
    expect(high.propeller.thrustCoefficient / low.propeller.thrustCoefficient).toBeCloseTo(
      1.225 / 1.00649,
      4,
    );
  });

  it('negative thrust is turned, electrical speed divided by pole pairs', () => {
    const text = [
      'ERPM,thrust_N',
      ...[3000, 4000, 5000].map((rpm) => `${7 * rpm},${-thrustAt(0.11, rpm)}`),
    ].join('\n');
    const result = stand(text, { poles: 14 });
    expect(result.propeller.thrustCoefficient).toBeCloseTo(0.11, 5);
    expect(result.notes.join(' ')).toMatch(/thrust is negative .* its sign was turned/);
    expect(refusal(() => stand(text))).toMatch(/no number of poles/);
  });

  it('many rows become a table of few, each with its sigma', () => {
    const random = new RandomStream(2, 'many');
    const lines = ['rpm,thrust_N,torque_Nm'];
    for (let k = 0; k < 3000; k++) {
      const rpm = 2000 + 6000 * random.uniform();
      lines.push(
        [rpm, thrustAt(0.1 + (rpm - 2000) * 4e-6, rpm) + 0.05 * random.gaussian(), torqueAt(0.05, rpm)].join(
          ',',
        ),
      );
    }
    const { table } = stand(lines.join('\n'));
    expect(table.length).toBeGreaterThan(10);
    expect(table.length).toBeLessThan(30);
    for (const point of table)
      expect(Math.abs(point.ct - (0.1 + (point.rpm - 2000) * 4e-6))).toBeLessThan(0.002);
  });

  it('holds C_T, exponent and C_P in 90 to 98 % of 200 runs with 1 % noise', () => {
    const held = { ct: 0, exponent: 0, cp: 0 };
    for (let seed = 1; seed <= 200; seed++) {
      const { quantities } = stand(run({ noise: 0.01, seed }));
      if (holds(quantities.thrustCoefficient, 0.115)) held.ct++;
      if (holds(quantities.thrustExponent, 0)) held.exponent++;
      if (holds(quantities.powerCoefficient, 0.048)) held.cp++;
    }
    for (const [name, count] of Object.entries(held)) {
      expect(count, name).toBeGreaterThanOrEqual(180);
      expect(count, name).toBeLessThanOrEqual(196);
    }
  });
});

describe('units mistaken', () => {
  const grams = uiucRows.map(([rpm, ct]) => [rpm, (thrustAt(ct, rpm) / G) * 1000]);
  const text = (head: string, rows: readonly (readonly number[])[]) =>
    [head, ...rows.map((row) => row.join(','))].join('\n');

  it('grams under a head of newtons are refused, with grams offered', () => {
    const message = refusal(() => stand(text('rpm,Thrust (N)', grams)));
    expect(message).toMatch(/column Thrust \(N\): "N giving C_T 1[12]\.?\d*"/);
    expect(message).toMatch(/reads like g, not N/);
  });
  it('newtons under a head of grams are refused, with newtons offered', () => {
    const rows = grams.map(([rpm, g]) => [rpm, (g / 1000) * G]);
    expect(refusal(() => stand(text('rpm,Thrust (g)', rows)))).toMatch(/reads like N, not g/);
  });
  it('rad/s under a head of rev/min is refused', () => {
    const rows = uiucRows.map(([rpm, ct]) => [(rpm * Math.PI) / 30, thrustAt(ct, rpm)]);
    expect(refusal(() => stand(text('rpm,thrust_N', rows)))).toMatch(/C_T comes out as 1\d/);
  });
  it('N·mm under a head of N·m is refused by the figure of merit', () => {
    const rows = uiucRows.map(([rpm, ct, cp]) => [rpm, thrustAt(ct, rpm), torqueAt(cp, rpm) * 1000]);
    expect(refusal(() => stand(text('rpm,thrust_N,torque_Nm', rows)))).toMatch(
      /torque_Nm.*figure of merit.*reads like (N·mm|mN·m)/,
    );
  });
  it('the user’s mapping overrides the head', () => {
    const result = stand(text('rpm,Thrust (N)', grams), {
      mapping: { thrust: { column: 'Thrust (N)', unit: 'g' } },
    });
    expect(result.table[0].ct).toBeCloseTo(0.1059, 5);
  });
});

describe('stand files that cannot be used', () => {
  const wrong: [what: string, text: string, message: RegExp][] = [
    [
      'no thrust',
      'rpm,Voltage (V)\n3000,12\n',
      /f: thrust: missing; allowed: a column of thrust such as "Thrust \(g\)"/,
    ],
    ['no speed', 'Thrust (g),Voltage (V)\n300,12\n', /f: speed: missing/],
    [
      'thrust without a unit',
      'rpm,Thrust\n3000,300\n4000,500\n',
      /column Thrust: "a head without a unit"; allowed: a unit for thrust/,
    ],
    [
      'a cell that is no number',
      'rpm,thrust_N\n3000,3\n4000,oops\n5000,7\n',
      /row 2, thrust_N: "oops"; allowed: a number/,
    ],
    ['1e308', 'rpm,thrust_N\n3000,3\n4000,1e308\n', /row 2, thrust_N: 1e\+308; allowed: at most/],
    ['a speed beyond any rotor', 'rpm,thrust_N\n3000,3\n4e9,5\n', /row 2, speed/],
    ['a motor that never turns', 'rpm,thrust_N\n0,0\n0,0\n', /no row that turns/],
    ['no thrust at all', 'rpm,thrust_N\n3000,0\n4000,0\n', /at least 2 rows with thrust above 0/],
  ];
  it.each(wrong)('%s', (_what, text, message) => {
    expect(refusal(() => stand(text))).toMatch(message);
  });
});
