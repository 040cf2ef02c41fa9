import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { columnInSI, proposeMapping, readTable } from '../../src/measuring/columns.ts';
import { recogniseHead } from '../../src/measuring/heads.ts';
import { refusal } from './support.ts';

const G = 9.80665;
const RPM = Math.PI / 30;

describe('a column head is told to quantity and unit', () => {
  // Factors: CGPM 1901 for g, international pound and inch of 1959, SI brochure for the rest.
  const heads: [head: string, quantity: string, toSI: number][] = [
    ['Thrust (g)', 'thrust', G / 1000],
    ['thrust_N', 'thrust', 1],
    ['Thrust [kgf]', 'thrust', G],
    ['Thrust (lbf)', 'thrust', 4.4482216],
    ['Thrust (oz)', 'thrust', 0.27801385],
    ['Schub [kp]', 'thrust', G],
    ['Torque [N·m]', 'torque', 1],
    ['Torque (N.m)', 'torque', 1],
    ['Torque (N*m)', 'torque', 1],
    ['torque_Nm', 'torque', 1],
    ['torque_N_m', 'torque', 1],
    ['Torque (N·mm)', 'torque', 1e-3],
    ['Torque (mN·m)', 'torque', 1e-3],
    ['Torque (kg-cm)', 'torque', G / 100],
    ['Torque (oz-in)', 'torque', 0.0070615518],
    ['Torque (lbf·ft)', 'torque', 1.3558179],
    ['rpm', 'speed', RPM],
    ['RPM', 'speed', RPM],
    ['Motor Optical Speed (RPM)', 'speed', RPM],
    ['speed_rad/s', 'speed', 1],
    ['n [1/min]', 'speed', RPM],
    ['n (rev/s)', 'speed', 2 * Math.PI],
    ['Throttle (us)', 'command', 1],
    ['ESC signal (µs)', 'command', 1],
    ['esc_us', 'command', 1],
    ['Throttle (%)', 'command', 0.01],
    ['Voltage (V)', 'voltage', 1],
    ['U [mV]', 'voltage', 1e-3],
    ['current_A', 'current', 1],
    ['I [mA]', 'current', 1e-3],
    ['power (W)', 'power', 1],
    ['Mechanical Power (W)', 'shaftPower', 1],
    ['t_s', 'time', 1],
    ['Time (ms)', 'time', 1e-3],
    ['time_us', 'time', 1e-6],
    ['gyro_roll_dps', 'gyro', Math.PI / 180],
    ['GyroX [rad/s]', 'gyro', 1],
    ['omega_z (deg/s)', 'gyro', Math.PI / 180],
    ['q (rad/s)', 'gyro', 1],
    ['ax (m/s²)', 'acceleration', 1],
    ['acc_z [g]', 'acceleration', G],
    ['ERPM', 'electricalSpeed', RPM],
    ['C_T', 'thrustCoefficient', 1],
  ];
  it.each(heads)('%s', (head, quantity, toSI) => {
    const found = recogniseHead(head);
    expect(found?.quantity).toBe(quantity);
    expect((found?.toSI ?? 0) / toSI).toBeCloseTo(1, 7);
  });

  it.each(['Vibration (g)', 'north_m', 'qw', 'comment', ''])('"%s" is told to nothing', (head) => {
    expect(recogniseHead(head)).toBeNull();
  });

  it('names axis and corner', () => {
    expect(recogniseHead('gyro_yaw_dps')?.axis).toBe('yaw');
    expect(recogniseHead('gyro[1]')?.axis).toBe('pitch');
    expect(recogniseHead('speed_RL_rpm')?.corner).toBe('RL');
  });
});

describe('a table is read as instruments write it', () => {
  const numbers = (text: string) => readTable(text, 'f').columns.map((column) => [...column]);
  const layouts: [what: string, text: string][] = [
    ['commas', 't_s,rpm\n0,1000.5\n1,2000.5\n'],
    ['semicolons and decimal comma', 't_s;rpm\n0;1000,5\n1;2000,5\n'],
    ['decimal comma with thousands', 't_s;rpm\n0;1.000,5\n1;2.000,5\n'],
    ['tabs', 't_s\trpm\n0\t1000.5\n1\t2000.5\n'],
    ['spaces', 't_s  rpm\n0   1000.5\n1   2000.5\n'],
    ['byte-order mark and CRLF', '\uFEFFt_s,rpm\r\n0,1000.5\r\n1,2000.5\r\n'],
    ['comment lines', '# bench 3\nt_s,rpm\n0,1000.5\n# pause\n1,2000.5\n'],
    ['talk above the head', 'Made by: us\nserial 12\nt_s,rpm\n0,1000.5\n1,2000.5\n'],
    ['a line of units', 't,n\ns,1/min\n0,1000.5\n1,2000.5\n'],
    ['the head in a comment', '# t_s rpm\n0 1000.5\n1 2000.5\n'],
    ['quotes and thousands', '"t_s","rpm"\n"0","1,000.5"\n"1","2,000.5"\n'],
    ['empty lines', 't_s,rpm\n\n0,1000.5\n\n1,2000.5\n\n'],
    ['a last row cut off', 't_s,rpm\n0,1000.5\n1,2000.5\n2'],
  ];
  it.each(layouts)('%s', (_what, text) => {
    expect(numbers(text)).toEqual([
      [0, 1],
      [1000.5, 2000.5],
    ]);
  });

  it('takes the unit from the line below the head', () => {
    const table = readTable('t,n\ns,1/min\n0,60\n1,120\n', 'f');
    const mapping = proposeMapping(table);
    expect(mapping.speed).toEqual({ column: 'n [1/min]', unit: 'rev/min' });
    const speed = columnInSI(table, 'speed', mapping.speed ?? { column: '', unit: null });
    expect(speed[0]).toBeCloseTo(2 * Math.PI, 10);
  });

  it('tells odd cells, and keeps text columns', () => {
    const table = readTable('t_s,rpm,who\n0,1000,ann\n1,x,bob\n2,3000,eve\n', 'f');
    expect(table.oddCells).toEqual([{ row: 2, head: 'rpm', text: 'x' }]);
    expect(table.columns[1][1]).toBeNaN();
    expect(table.texts[2]).toEqual(['ann', 'bob', 'eve']);
  });

  const wrong: [what: string, text: string, message: RegExp][] = [
    ['empty', '', /f: content: "nothing"; allowed: a head line/],
    ['blank', ' \n\n', /nothing/],
    ['no table', 'hello there', /allowed: a table|allowed: a head line/],
    ['a head alone', 't_s,rpm\n', /allowed: a head line, then at least one row/],
    ['numbers without a head', '1,2\n3,4\n', /head line: "1,2"; allowed: names of the columns/],
    ['binary', 'PK\u0003\u0004\u0000\u0000\u0001', /binary data/],
    ['rows longer than the head', 'a,b\n1,2,3\n', /row 1: "3 cells"; allowed: 2 cells/],
    ['comments alone', '# a\n# b\n', /comment lines alone/],
  ];
  it.each(wrong)('refuses %s', (_what, text, message) => {
    expect(refusal(() => readTable(text, 'f'))).toMatch(message);
  });

  it('gives back what was written, for any numbers and delimiter', () => {
    const cell = fc.double({ noNaN: true, noDefaultInfinity: true, min: -1e9, max: 1e9 });
    fc.assert(
      fc.property(
        fc.array(fc.tuple(cell, cell), { minLength: 1, maxLength: 30 }),
        fc.constantFrom(',', ';', '\t'),
        fc.constantFrom('\n', '\r\n'),
        (rows, delimiter, newline) => {
          const lines =
            ['a_s', 'b_V'].join(delimiter) + newline + rows.map((row) => row.join(delimiter)).join(newline);
          const table = readTable(lines, 'f');
          expect([...table.columns[0]]).toEqual(rows.map((row) => Number(String(row[0]))));
          expect([...table.columns[1]]).toEqual(rows.map((row) => Number(String(row[1]))));
        },
      ),
      { numRuns: 60 },
    );
  });

  it('never fails otherwise than with an InputError, whatever the text', () => {
    fc.assert(
      fc.property(fc.string({ unit: 'binary', maxLength: 200 }), (text) => {
        try {
          readTable(text, 'f');
        } catch (error) {
          expect((error as Error).name).toBe('InputError');
        }
      }),
      { numRuns: 200 },
    );
  });
});
