import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { calibrated, demandOf, shaped, slewed, type StickDemand } from '../../src/control/sticks.ts';
import { parseSticks, StickPlayer } from '../../src/control/sticksFile.ts';

const share = fc.double({ min: -1, max: 1, noNaN: true });
const feel = fc.record({
  deadband: fc.double({ min: 0, max: 0.3, noNaN: true }),
  curve: fc.double({ min: 0, max: 1, noNaN: true }),
});

describe('stick shaping', () => {
  it('is odd, rises, is continuous at the deadband and ends at ±1', () => {
    fc.assert(
      fc.property(share, share, feel, (a, b, f) => {
        expect(shaped(-a, f)).toBeCloseTo(-shaped(a, f), 12);
        if (a < b) expect(shaped(a, f)).toBeLessThanOrEqual(shaped(b, f) + 1e-12);
        expect(shaped(1, f)).toBeCloseTo(1, 12);
        expect(shaped(-1, f)).toBeCloseTo(-1, 12);
        expect(shaped(f.deadband, f)).toBe(0);
        expect(Math.abs(shaped(f.deadband + 1e-9, f))).toBeLessThan(1e-6);
      }),
    );
  });

  it('slews no faster than it may, never past what is wanted, and at once where no slew is set', () => {
    fc.assert(
      fc.property(
        share,
        share,
        fc.double({ min: 0.1, max: 50, noNaN: true }),
        fc.double({ min: 0.001, max: 0.1, noNaN: true }),
        (now, wanted, slew, dt) => {
          const next = slewed(now, wanted, slew, dt);
          expect(Math.abs(next - now)).toBeLessThanOrEqual(slew * dt + 1e-12);
          expect(Math.abs(wanted - next)).toBeLessThanOrEqual(Math.abs(wanted - now) + 1e-12);
          expect(slewed(now, wanted, 0, dt)).toBe(wanted);
        },
      ),
    );
    // Half the travel a second: from neutral to the end in two seconds (by its definition).
    let at = 0;
    for (let k = 0; k < 100; k++) at = slewed(at, 1, 0.5, 0.02);
    expect(at).toBeCloseTo(1, 9);
  });

  it('calibrates each side of the centre to its own end and stays within ±1', () => {
    fc.assert(
      fc.property(
        fc.double({ min: -1, max: -0.2, noNaN: true }),
        fc.double({ min: -0.1, max: 0.1, noNaN: true }),
        fc.double({ min: 0.2, max: 1, noNaN: true }),
        fc.double({ min: -3, max: 3 }),
        fc.boolean(),
        (low, centre, high, raw, reverse) => {
          const c = { axis: 0, low, centre, high, reverse };
          const sign = reverse ? -1 : 1;
          expect(calibrated(high, c)).toBeCloseTo(sign, 12);
          expect(calibrated(low, c)).toBeCloseTo(-sign, 12);
          expect(Math.abs(calibrated(centre, c))).toBe(0);
          expect(Math.abs(calibrated(raw, c))).toBeLessThanOrEqual(1);
        },
      ),
    );
  });

  it('gives each of the four customary modes its own sides (common practice, no source)', () => {
    const ways = { leftX: 0.1, leftY: 0.2, rightX: 0.3, rightY: 0.4 };
    const of = (mode: 1 | 2 | 3 | 4) => {
      const demand: StickDemand = { roll: 0, pitch: 0, yaw: 0, lift: 0 };
      demandOf(ways, mode, demand);
      return demand;
    };
    expect(of(1)).toEqual({ roll: 0.3, yaw: 0.1, pitch: -0.2, lift: 0.4 });
    expect(of(2)).toEqual({ roll: 0.3, yaw: 0.1, pitch: -0.4, lift: 0.2 });
    expect(of(3)).toEqual({ roll: 0.1, yaw: 0.3, pitch: -0.2, lift: 0.4 });
    expect(of(4)).toEqual({ roll: 0.1, yaw: 0.3, pitch: -0.4, lift: 0.2 });
  });
});

describe('sticks file', () => {
  it('moves linearly between rows and holds at the ends', () => {
    const track = parseSticks(
      '# made by hand\nt_s, roll, pitch, yaw, throttle\n1, 0, 0, 0, 0.4\n2, 1, -1, 0.5, 0.6\n',
    );
    const player = new StickPlayer(track);
    const at = (t: number) => {
      const into = { roll: 9, pitch: 9, yaw: 9, throttle: 9 };
      player.at(t, into);
      return into;
    };
    expect(at(0)).toEqual({ roll: 0, pitch: 0, yaw: 0, throttle: 0.4 });
    expect(at(1.25).roll).toBeCloseTo(0.25, 12);
    expect(at(1.5).throttle).toBeCloseTo(0.5, 12);
    expect(at(9)).toEqual({ roll: 1, pitch: -1, yaw: 0.5, throttle: 0.6 });
  });

  it.each([
    ['', /head line/],
    ['t_s,roll,pitch,yaw\n0,0,0,0\n', /throttle: .*allowed: a column of this name/],
    ['t_s,roll,pitch,yaw,throttle\n', /at least one row/],
    ['t_s,roll,pitch,yaw,throttle\n0,2,0,0,0\n', /row 1, roll: "2"; allowed: a number from -1 to 1/],
    ['t_s,roll,pitch,yaw,throttle\n0,0,0,0,NaN\n', /row 1, throttle: "NaN"/],
    ['t_s,roll,pitch,yaw,throttle\n0,0,0,0,1e308\n', /row 1, throttle: "1e308"/],
    [
      't_s,roll,pitch,yaw,throttle\n1,0,0,0,0\n0.5,0,0,0,0\n',
      /row 2, t_s: 0.5; allowed: a time after the row before, 1 s/,
    ],
    ['t_s,roll,pitch,yaw,throttle\n0,0,0\n', /row 1, yaw: missing/],
  ])('refuses %j by row, column, value and what is allowed', (text, message) => {
    expect(() => parseSticks(text, 'sticks.csv')).toThrow(message);
  });
});
