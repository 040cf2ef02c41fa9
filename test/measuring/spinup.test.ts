import { describe, expect, it } from 'vitest';
import { RandomStream } from '../../src/math/random.ts';
import { readTable } from '../../src/measuring/columns.ts';
import { analyseSpinup, joinSpinup } from '../../src/measuring/spinup.ts';
import { holds, reference, refusal } from './support.ts';

const spinup = (text: string) => analyseSpinup(readTable(text, 'f'));
const LAG_UP = 0.045;
const LAG_DOWN = 0.07;
const DELAY = 0.0042;
const EDGES = [0.3, 0.9, 1.6, 2.2];

/** First-order response with delay to a square command, in closed form; 3000 and 6000 rev/min. */
function record(seed: number, options: { command?: boolean; noise?: number; step?: number } = {}): string {
  const { command = true, noise = 30, step = 0.001 } = options;
  const random = new RandomStream(seed, 'spinup');
  const lines = [command ? 't_s,esc_us,rpm' : 't_s,rpm'];
  for (let i = 0; i * step < 3; i++) {
    const t = i * step;
    let speed = 3000;
    EDGES.forEach((edge, k) => {
      const begin = edge + DELAY;
      if (t <= begin) return;
      const end = Math.min(t, (EDGES[k + 1] ?? Infinity) + DELAY);
      const target = k % 2 === 0 ? 6000 : 3000;
      speed = target + (speed - target) * Math.exp(-(end - begin) / (k % 2 === 0 ? LAG_UP : LAG_DOWN));
    });
    const on = EDGES.filter((edge) => t >= edge - 1e-9).length % 2 === 1;
    const value = (speed + noise * random.gaussian()).toFixed(1);
    lines.push(command ? `${t.toFixed(4)},${on ? 1600 : 1300},${value}` : `${t.toFixed(4)},${value}`);
  }
  return lines.join('\n');
}

describe('motor lag', () => {
  it('fits one step as SciPy’s curve_fit does', () => {
    const { step } = reference();
    const result = spinup(['t_s,speed_rad/s', ...step.t.map((t, i) => `${t},${step.y[i]}`)].join('\n'));
    expect(result.steps).toHaveLength(1);
    expect(Math.abs(result.steps[0].lag.value / step.lag_s - 1)).toBeLessThan(2e-3);
    expect(Math.abs(result.steps[0].lag.sigma / step.lagSigma_s - 1)).toBeLessThan(0.15);
    expect(result.steps[0].time_s).toBeCloseTo(step.onset_s, 4);
  });

  it('up, down and delay of a closed-form response, with and without a command column', () => {
    for (const command of [true, false]) {
      const { quantities, steps, notes, motor } = spinup(record(1, { command }));
      expect(steps.map((step) => step.direction)).toEqual(['up', 'down', 'up', 'down']);
      expect(Math.abs((quantities.lag_s?.value ?? 0) / LAG_UP - 1)).toBeLessThan(0.02);
      expect(Math.abs((quantities.lagDown_s?.value ?? 0) / LAG_DOWN - 1)).toBeLessThan(0.02);
      expect(motor.maxSpeed_rpm).toBeCloseTo(6000, -2);
      expect(quantities.speedNoise_rpm?.value).toBeCloseTo(30, -1);
      if (command) expect(Math.abs((quantities.delay_s?.value ?? 0) - DELAY)).toBeLessThan(6e-4);
      else {
        expect(quantities.delay_s).toBeUndefined();
        expect(notes.join(' ')).toMatch(/No command column/);
      }
    }
  });

  it('is exact without noise, on a coarse clock as well', () => {
    const { quantities } = spinup(record(1, { noise: 0, step: 0.005 }));
    expect((quantities.lag_s?.value ?? 0) / LAG_UP).toBeCloseTo(1, 2);
    expect((quantities.lagDown_s?.value ?? 0) / LAG_DOWN).toBeCloseTo(1, 2);
  });

  it('holds both lags in 90 to 98 % of 200 runs', () => {
    let up = 0;
    let down = 0;
    for (let seed = 1; seed <= 200; seed++) {
      const { quantities } = spinup(record(seed, { step: 0.002 }));
      if (quantities.lag_s !== undefined && holds(quantities.lag_s, LAG_UP)) up++;
      if (quantities.lagDown_s !== undefined && holds(quantities.lagDown_s, LAG_DOWN)) down++;
    }
    for (const count of [up, down]) {
      expect(count).toBeGreaterThanOrEqual(180);
      expect(count).toBeLessThanOrEqual(196);
    }
  });

  it('several recordings are joined', () => {
    const parts = [1, 2, 3].map((seed) => spinup(record(seed)));
    const joined = joinSpinup(parts);
    expect(joined.steps).toHaveLength(12);
    expect(joined.quantities.lag_s?.sigma).toBeLessThan(parts[0].quantities.lag_s?.sigma ?? 0);
  });

  it('says when the motor is not first order', () => {
    // Speed limited in slope, as by a current limit.
    const lines = ['t_s,esc_us,rpm'];
    for (let i = 0; i < 1500; i++) {
      const t = i / 1000;
      const speed = t < 0.3 ? 3000 : Math.min(6000, 3000 + 12_000 * (t - 0.3));
      lines.push(`${t},${t < 0.3 ? 1300 : 1600},${speed + (i % 2)}`);
    }
    expect(spinup(lines.join('\n')).notes.join(' ')).toMatch(/not first order/);
  });
});

describe('spin-up files that cannot be used', () => {
  const rows = (make: (i: number) => string, count = 200) =>
    Array.from({ length: count }, (_, i) => make(i)).join('\n');
  const wrong: [what: string, text: string, message: RegExp][] = [
    ['no time', `esc_us,rpm\n${rows(() => '1300,3000')}`, /f: time: missing/],
    ['no speed', `t_s,esc_us\n${rows((i) => `${i},1300`)}`, /f: speed: missing/],
    [
      'constant speed',
      `t_s,rpm\n${rows((i) => `${i / 100},3000`)}`,
      /column rpm: .*allowed: a recording in which the speed steps/,
    ],
    [
      'decreasing time',
      `t_s,rpm\n${rows((i) => `${i === 50 ? 0 : i / 100},3000`)}`,
      /row 51, t_s: 0; allowed: a time not before/,
    ],
    ['time that stands', `t_s,rpm\n${rows((i) => `5,${3000 + i}`)}`, /time that mostly stands still/],
    ['too few rows', 't_s,rpm\n0,1\n1,2\n', /2 rows/],
    ['1e308', `t_s,rpm\n${rows((i) => `${i / 100},${i === 7 ? 1e308 : 3000}`)}`, /row 8, rpm/],
    [
      'a gap',
      `t_s,rpm\n${rows((i) => `${i / 100},${i === 7 ? '' : 3000 + i}`)}`,
      /row 8, rpm: missing; allowed: a number/,
    ],
    [
      'noise alone',
      `t_s,rpm\n${rows((i) => `${i / 100},${3000 + ((i * 7919) % 100)}`)}`,
      /allowed: (a recording in which|steps held)/,
    ],
  ];
  it.each(wrong)('%s', (_what, text, message) => {
    expect(refusal(() => spinup(text))).toMatch(message);
  });
});
