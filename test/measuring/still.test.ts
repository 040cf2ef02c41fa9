import { describe, expect, it } from 'vitest';
import { RandomStream } from '../../src/math/random.ts';
import { allanDeviation, allanTerms } from '../../src/measuring/allan.ts';
import { readTable } from '../../src/measuring/columns.ts';
import { powerSpectrum } from '../../src/measuring/spectrum.ts';
import { analyseStill, joinStill, type StillOptions } from '../../src/measuring/still.ts';
import { holds, nistSequence, reference, refusal } from './support.ts';

describe('overlapping Allan deviation', () => {
  it('NIST SP 1065 table 31: 1000-point set, τ = 1, 10, 100: 2.922319e-01, 9.159953e-02, 3.241343e-02', () => {
    const { deviation } = allanDeviation(nistSequence(1000), 1, [1, 10, 100]);
    expect([...deviation].map((value) => value.toExponential(6))).toEqual([
      '2.922319e-1',
      '9.159953e-2',
      '3.241343e-2',
    ]);
  });

  it('NIST SP 1065 table 30: nine frequencies of the NBS set, τ = 1, 2: 91.22945, 85.95287', () => {
    const { deviation } = allanDeviation([892, 809, 823, 798, 671, 644, 883, 903, 677], 1, [1, 2]);
    expect(deviation[0]).toBeCloseTo(91.22945, 5);
    expect(deviation[1]).toBeCloseTo(85.95287, 5);
  });

  it('of a steady drift a is a τ/√2 (IEEE Std 952, rate ramp)', () => {
    const { tau_s, deviation } = allanDeviation(
      Float64Array.from({ length: 400 }, (_, i) => 0.02 * i),
      1,
      [1, 5, 50],
    );
    deviation.forEach((value, j) => expect(value).toBeCloseTo((0.02 * tau_s[j]) / Math.SQRT2, 9));
  });

  it('tells a rate random walk from white noise: K of σ² = N²/τ + K² τ/3', () => {
    const random = new RandomStream(4, 'walk');
    let bias = 0;
    const K = 0.004;
    const rate = Float64Array.from({ length: 60_000 }, () => {
      bias += K * Math.sqrt(0.01) * random.gaussian();
      return bias + 0.05 * random.gaussian();
    });
    const terms = allanTerms(allanDeviation(rate, 0.01), 0);
    expect(Math.abs((terms?.rateRandomWalk ?? 0) / K - 1)).toBeLessThan(0.4);
    expect(Math.abs((terms?.randomWalk ?? 0) / (0.05 * Math.sqrt(0.01)) - 1)).toBeLessThan(0.03);
    expect(terms?.instabilityReached).toBe(true);
  });
});

describe('spectrum', () => {
  it('is SciPy’s signal.welch', () => {
    const { welch } = reference();
    const { density } = powerSpectrum(Float64Array.from(nistSequence(2048)), welch.rate_Hz, welch.segment);
    welch.density.forEach((value, k) => {
      if (k > 0) expect(density[k] / value).toBeCloseTo(1, 8);
    });
  });
});

interface Gyro {
  seed?: number;
  rate_Hz?: number;
  seconds?: number;
  density?: number;
  bandwidth_Hz?: number;
  step?: number;
  bias?: number;
  lines?: readonly [hertz: number, amplitude: number][];
  head?: string;
  scale?: number;
}

/** Three gyro axes: white noise of a density (behind a first-order bandwidth), bias, lines, rounding to a step. */
function record(options: Gyro = {}): string {
  const {
    seed = 1,
    rate_Hz = 500,
    seconds = 20,
    density = 0.008,
    bandwidth_Hz = 0,
    step = 0,
    bias = 0.3,
  } = options;
  const { lines = [], head = 't_s,gyro_x (deg/s),gyro_y (deg/s),gyro_z (deg/s)', scale = 1 } = options;
  const random = new RandomStream(seed, 'still');
  const a = bandwidth_Hz === 0 ? 0 : Math.exp((-2 * Math.PI * bandwidth_Hz) / rate_Hz);
  const sigma = density * Math.sqrt(bandwidth_Hz === 0 ? rate_Hz / 2 : (Math.PI / 2) * bandwidth_Hz);
  const noise = [0, 1, 2].map(() => sigma * random.gaussian());
  const rows = [head];
  for (let i = 0; i < seconds * rate_Hz; i++) {
    const t = i / rate_Hz;
    const values = noise.map((last, axis) => {
      noise[axis] = a * last + sigma * Math.sqrt(1 - a * a) * random.gaussian();
      let value = bias + noise[axis];
      for (const [hertz, amplitude] of lines) value += amplitude * Math.sin(2 * Math.PI * hertz * t + axis);
      const rounded = step === 0 ? value : Math.round(value / step) * step;
      return (scale * rounded).toPrecision(9);
    });
    rows.push(`${t.toFixed(5)},${values.join(',')}`);
  }
  return rows.join('\n');
}

const still = (text: string, options: StillOptions = {}) => analyseStill(readTable(text, 'f'), options);

describe('gyro at rest', () => {
  it('density, bias and angle random walk hold the truth in 90 to 98 % of 200 runs (σ = N √(f_s/2); N/√2 at τ = 1 s)', () => {
    const held = { noise: 0, bias: 0, walk: 0 };
    for (let seed = 1; seed <= 67; seed++) {
      const { axes } = still(record({ seed, seconds: 12 }));
      for (const axis of Object.values(axes)) {
        if (holds(axis.noise, 0.008)) held.noise++;
        if (holds(axis.bias, 0.3)) held.bias++;
        if (axis.angleRandomWalk !== null && holds(axis.angleRandomWalk, 0.008 / Math.SQRT2)) held.walk++;
      }
    }
    for (const [name, count] of Object.entries(held)) {
      expect(count, name).toBeGreaterThanOrEqual(0.9 * 201);
      expect(count, name).toBeLessThanOrEqual(0.98 * 201 + 1);
    }
  });

  it('finds a first-order bandwidth in the noise and the density before it', () => {
    const { axes, gyro } = still(record({ bandwidth_Hz: 60, seconds: 40 }));
    expect(Math.abs(gyro.bandwidth_Hz / 60 - 1)).toBeLessThan(0.08);
    for (const axis of Object.values(axes)) expect(Math.abs(axis.noise.value / 0.008 - 1)).toBeLessThan(0.05);
  });

  it('resolution is the smallest step; rounding noise is taken out of the density', () => {
    const { gyro, quantities } = still(record({ step: 0.061, seconds: 30 }));
    expect(gyro.resolution_dps / 0.061).toBeCloseTo(1, 4);
    expect(Math.abs(gyro.noise_dps_per_rtHz / 0.008 - 1)).toBeLessThan(0.03);
    expect(quantities.resolution_dps.meaning).toMatch(/30.5 deg\/s² to a derivative/);
  });

  it('sampling: rate, jitter of 0.2 ms, lost samples', () => {
    const random = new RandomStream(9, 'jitter');
    const lines = record({ rate_Hz: 400, seconds: 20 }).split('\n');
    const jittered = lines.flatMap((line, i) => {
      if (i === 0) return [line];
      if (i % 1000 === 500) return [];
      const [t, ...rest] = line.split(',');
      return [[(Number(t) + 0.0002 * random.gaussian()).toFixed(6), ...rest].join(',')];
    });
    const { sampling, notes } = still(jittered.join('\n'));
    expect(sampling.lost).toBe(8);
    expect(Math.abs(sampling.rate_Hz / 400 - 1)).toBeLessThan(0.002);
    // The difference of two times carries √2 of the jitter of one.
    expect(Math.abs(sampling.jitter_s / (0.0002 * Math.SQRT2) - 1)).toBeLessThan(0.1);
    expect(notes.join(' ')).toMatch(/8 samples are missing/);
    expect(notes.join(' ')).toMatch(/longest stretch without a gap/);
  });

  it('says what the noise does to the motors: backward difference of white noise', () => {
    const { quantities } = still(record({ seconds: 30 }));
    const rms = 0.008 * Math.sqrt(250);
    const shaken = Number(/motors by ([\d.]+) µs/.exec(quantities.noise_roll_dps_per_rtHz.meaning)?.[1]);
    expect(Math.abs(shaken / (0.01 * Math.SQRT2 * rms * 500) - 1)).toBeLessThan(0.05);
  });

  it('a knock is told with its time', () => {
    const lines = record({ seconds: 10 }).split('\n');
    for (let i = 3200; i < 3300; i++) {
      const cells = lines[i].split(',');
      lines[i] = [cells[0], 40 * Math.sin(i), cells[2], cells[3]].join(',');
    }
    expect(still(lines.join('\n')).notes.join(' ')).toMatch(/moved or knocked, first at 6\.0 s/);
  });

  it('a constant axis is left out and said; accelerometer in g is read as such', () => {
    const head = 't_s,gyro_x (deg/s),gyro_y (deg/s),gyro_z (deg/s),ax,ay,az';
    const random = new RandomStream(3, 'acc');
    const lines = record({ seconds: 10 })
      .split('\n')
      .map((line, i) => {
        if (i === 0) return head;
        const [t, x, y] = line.split(',');
        const acc = [0.01, 0.02, -1].map((value) => (value + 0.002 * random.gaussian()).toFixed(7));
        return [t, x, y, '0', ...acc].join(',');
      });
    const { axes, notes, accelerometer } = still(lines.join('\n'));
    expect(Object.keys(axes)).toEqual(['roll', 'pitch']);
    expect(notes.join(' ')).toMatch(/stands at 0 throughout/);
    expect(notes.join(' ')).toMatch(/taken to be in g/);
    expect(
      Math.abs((accelerometer?.noise_mps2_per_rtHz ?? 0) / ((0.002 * 9.80665) / Math.sqrt(250)) - 1),
    ).toBeLessThan(0.05);
  });
});

describe('units of the gyro', () => {
  const radians = 't_s,gyro_x (rad/s),gyro_y (rad/s),gyro_z (rad/s)';
  const degrees = 't_s,gyro_x (deg/s),gyro_y (deg/s),gyro_z (deg/s)';
  const bare = 't_s,gyro_x,gyro_y,gyro_z';
  const toRadians = Math.PI / 180;

  it('rad/s under its own head gives the same as deg/s', () => {
    const a = still(record({ seconds: 8, step: 0.061 }));
    const b = still(record({ seconds: 8, step: 0.061, head: radians, scale: toRadians }));
    expect(b.gyro.noise_dps_per_rtHz / a.gyro.noise_dps_per_rtHz).toBeCloseTo(1, 6);
    expect(b.gyro.bias_dps[0]).toBeCloseTo(a.gyro.bias_dps[0], 6);
    expect(b.unitDoubt).toBeNull();
  });

  const mistaken: [what: string, head: string, scale: number, step: number, likely: string][] = [
    ['rad/s under deg/s, by the step', degrees, toRadians, 2000 / 32768, 'rad/s'],
    ['rad/s under deg/s, by the noise', degrees, toRadians, 0, 'rad/s'],
    ['deg/s under rad/s, by the step', radians, 1, 2000 / 32768, 'deg/s'],
    ['deg/s under rad/s, by the noise', radians, 1, 0, 'deg/s'],
  ];
  it.each(mistaken)('%s is noticed and offered', (_what, head, scale, step, likely) => {
    const { unitDoubt, notes } = still(record({ seconds: 8, head, scale, step }));
    expect(unitDoubt?.likely).toBe(likely);
    expect(notes.join(' ')).toMatch(new RegExp(`If it is ${likely}, give the column that unit`));
  });

  it('a head without a unit is read by the noise, and said', () => {
    for (const scale of [1, toRadians]) {
      const { gyro, notes } = still(record({ seconds: 8, head: bare, scale }));
      expect(Math.abs(gyro.noise_dps_per_rtHz / 0.008 - 1)).toBeLessThan(0.1);
      expect(notes.join(' ')).toMatch(/state no unit; they are read as/);
    }
  });
});

describe('vibration of turning rotors', () => {
  const lines: [number, number][] = [
    [62, 2.4],
    [124, 0.9],
    [171, 0.5],
  ];

  it('gives each line its order; amplitude is the line’s own', () => {
    const { axes, rotor, condition, gyro } = still(record({ lines }), {
      speed_rpm: 62 * 60,
      rotorsTurning: 1,
    });
    expect(condition).toBe('turning');
    expect(rotor?.estimated).toBe(false);
    const peaks = axes.roll?.peaks ?? [];
    expect(peaks.map((peak) => peak.order)).toEqual([1, 2, null]);
    peaks.forEach((peak, i) => {
      expect(Math.abs(peak.frequency_Hz - lines[i][0])).toBeLessThan(0.3);
      expect(Math.abs(peak.amplitude / lines[i][1] - 1)).toBeLessThan(0.05);
    });
    expect(Math.abs((gyro.vibration_dps?.[0] ?? 0) / 2.4 - 1)).toBeLessThan(0.05);
    // The lines do not reach the density of the noise.
    expect(Math.abs(gyro.noise_dps_per_rtHz / 0.008 - 1)).toBeLessThan(0.05);
  });

  it('estimates the speed where it is not given, and says so', () => {
    const { rotor, notes } = still(record({ lines }));
    expect(rotor?.estimated).toBe(true);
    expect(Math.abs((rotor?.speed_Hz ?? 0) - 62)).toBeLessThan(0.5);
    expect(notes.join(' ')).toMatch(/Rotor speed estimated/);
    expect(still(record()).condition).toBe('rest');
  });

  it('knows a line folded about half the sampling rate', () => {
    // 3 blades at 110 Hz pass at 330 Hz; at 500 Hz they appear at 170 Hz.
    const { axes, notes } = still(
      record({
        lines: [
          [110, 2],
          [330, 1],
        ],
      }),
      { speed_rpm: 6600, blades: 3 },
    );
    const pass = axes.roll?.peaks.find((peak) => peak.order === 3);
    expect(pass?.folded).toBe(true);
    expect(Math.abs((pass?.frequency_Hz ?? 0) - 170)).toBeLessThan(0.5);
    expect(notes.join(' ')).toMatch(/seen folded down/);
  });

  it('rest and idle are joined: noise from rest, vibration from idle', () => {
    const rest = still(record({ seed: 2 }));
    const idle = still(record({ seed: 3, density: 0.05, lines }));
    for (const order of [
      [rest, idle],
      [idle, rest],
    ]) {
      const joined = joinStill(order);
      expect(joined.gyro.noise_dps_per_rtHz).toBe(rest.gyro.noise_dps_per_rtHz);
      expect(joined.gyro.vibration_dps).toEqual(idle.gyro.vibration_dps);
    }
  });
});

describe('still files that cannot be used', () => {
  const rows = (make: (i: number) => string, count = 600) =>
    Array.from({ length: count }, (_, i) => make(i)).join('\n');
  const wrong: [what: string, text: string, message: RegExp][] = [
    ['no gyro', `t_s,rpm\n${rows((i) => `${i},1300`)}`, /f: gyro: missing; allowed: columns of body rates/],
    ['no time', `gyro_x (deg/s),b_V\n${rows((i) => `${i},1`)}`, /f: time: missing/],
    [
      'a constant gyro',
      `t_s,gyro_x (deg/s)\n${rows((i) => `${i / 100},1`)}`,
      /one value throughout.*shows its noise/,
    ],
    ['decreasing time', `t_s,gyro_x (deg/s)\n${rows((i) => `${-i / 100},${i % 7}`)}`, /row 2, t_s: -0.01/],
    [
      'too short',
      `t_s,gyro_x (deg/s)\n${rows((i) => `${i / 100},${i % 7}`, 50)}`,
      /50 samples without a gap/,
    ],
    [
      '1e308',
      `t_s,gyro_x (deg/s)\n${rows((i) => `${i / 100},${i === 9 ? '1e308' : i % 7}`)}`,
      /row 10, gyro_x \(deg\/s\)/,
    ],
    [
      'text among numbers',
      `t_s,gyro_x (deg/s)\n${rows((i) => `${i / 100},${i === 9 ? 'err' : i % 7}`)}`,
      /row 10, gyro_x \(deg\/s\): "err"/,
    ],
  ];
  it.each(wrong)('%s', (_what, text, message) => {
    expect(refusal(() => still(text))).toMatch(message);
  });
});
