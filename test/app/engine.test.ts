import { describe, expect, it } from 'vitest';
import { FlightEngine } from '../../src/app/worker/engine.ts';
import { Punctuality } from '../../src/app/worker/punctuality.ts';
import type { FlightSettings } from '../../src/app/worker/protocol.ts';
import { OPEN_FIELD } from '../../src/craft/scene.ts';
import { parseWind } from '../../src/craft/wind.ts';
import { NEUTRAL_STICKS, type Sticks } from '../../src/flight/pilot.ts';
import { signalIndex } from '../../src/flight/signals.ts';
import { demoBuild, demoGains } from '../physics/builds.ts';

const GUSTY = parseWind({
  format: 'gustbench.wind/1',
  mean_mps: 5,
  from_deg: 200,
  turbulence: { model: 'MIL-F-8785C', windAt20ft_mps: 6 },
});

function settings(change: Partial<FlightSettings> = {}): FlightSettings {
  return {
    build: demoBuild('sandpiper'),
    gains: demoGains('sandpiper'),
    wind: GUSTY,
    scene: OPEN_FIELD,
    seed: 9,
    faults: [],
    noiseScale: 1,
    vibrationScale: 1,
    ...change,
  };
}

/** An engine on a clock of its own, with everything it said. */
function bench() {
  const rows: Float64Array[] = [];
  const said: string[] = [];
  const sticks: Sticks[] = [];
  const engine = new FlightEngine({
    row: (signals) => rows.push(signals.slice()),
    began: () => said.push('began'),
    rewound: (time_s, _oldest_s, then) => {
      said.push(`rewound ${time_s.toFixed(4)}`);
      sticks.push(then);
    },
    stalled: () => said.push('stalled'),
  });
  let now_ms = 0;
  const run = (seconds: number, step_ms = 8) => {
    const end = now_ms + seconds * 1000;
    while (now_ms < end) {
      now_ms = Math.min(end, now_ms + step_ms);
      while (engine.advance(now_ms));
    }
  };
  return { engine, rows, said, sticks, run, now: () => now_ms };
}

const flying = { ...NEUTRAL_STICKS, armed: true, levelling: true, heightHold: true, throttle: 0.8 };

describe('flight engine', () => {
  it('keeps real time: as many ticks as the loop rate says, at full, half and quarter speed', () => {
    const { engine, run } = bench();
    engine.begin(settings(), { kind: 'ground' }, 0);
    run(1);
    expect(engine.stats().ticks).toBe(400);
    engine.setSpeed(0.5, 1000);
    run(1);
    expect(engine.stats().ticks).toBe(600);
    engine.setSpeed(0.25, 2000);
    run(1);
    expect(engine.stats().ticks).toBe(700);
    engine.setSpeed(0, 3000);
    run(1);
    engine.singleTick();
    expect(engine.stats().ticks).toBe(701);
    expect(engine.stats().late).toBe(0);
  });

  it('counts ticks that begin more than a screen frame late, catches up a quarter second, pauses after a long stall', () => {
    const { engine, rows, run, said } = bench();
    engine.begin(settings(), { kind: 'ground' }, 0);
    run(0.5, 100);
    expect(engine.stats().late).toBeGreaterThan(100);
    const { ticks, late } = engine.stats();
    const rowsBefore = rows.length;
    run(1, 1000);
    expect(engine.stats().ticks).toBe(ticks + 400);
    expect(engine.stats().late).toBeGreaterThan(late + 380);
    expect(rows.length - rowsBefore, 'ticks flown').toBe(100);
    expect(said).not.toContain('stalled');
    run(2.5, 2500);
    expect(said).toContain('stalled');
    expect(engine.speed).toBe(0);
  });

  it('the time it takes to make a flight is not the flight’s', () => {
    const { engine, said } = bench();
    engine.begin(settings(), { kind: 'ground' }, 0);
    engine.startClock(5000);
    while (engine.advance(5008));
    expect(engine.stats()).toMatchObject({ ticks: 3, late: 0 });
    engine.startClock(9000);
    while (engine.advance(5016));
    expect(engine.stats().ticks, 'a running clock is left alone').toBe(6);
    expect(said).not.toContain('stalled');
  });

  it('rewinds to the exact tick: what is flown again with the same sticks is the same to the bit', () => {
    const { engine, rows, run, now, said } = bench();
    engine.begin(settings(), { kind: 'ground' }, 0);
    engine.setSticks(flying);
    run(2.1);
    engine.setSticks({ ...flying, roll: 0.4 });
    run(1.3);
    const t = signalIndex('t_s');
    const flown = rows.map((row) => row);
    engine.rewind(1.7, now());
    expect(said.at(-1)).toBe('rewound 1.7000');
    rows.length = 0;
    engine.setSpeed(1, now());
    run(0.4);
    // Sticks at 1.7 s were the first ones, and stay them: compare up to where they were changed.
    expect(rows.length).toBeGreaterThan(100);
    for (const row of rows) {
      const before = flown.find((one) => one[t] === row[t]);
      expect(before, `a row at ${row[t]} s was flown before`).toBeDefined();
      if (row[t] < 2.099) expect(Array.from(row)).toEqual(Array.from(before ?? []));
    }
  });

  it('a rewind comes back with the sticks of that instant: armed again after the motors were stopped', () => {
    const { engine, run, now, sticks } = bench();
    engine.begin(settings(), { kind: 'ground' }, 0);
    engine.setSticks(flying);
    run(2);
    engine.setSticks({ ...NEUTRAL_STICKS });
    run(1);
    engine.rewind(1.5, now());
    expect(sticks.at(-1)).toMatchObject({ armed: true, throttle: flying.throttle });
  });

  it('setting upright is replayed once, also at the tick of a snapshot', () => {
    const { engine, rows, run, now } = bench();
    engine.begin(settings(), { kind: 'ground' }, 0);
    // 100 ticks a quarter second: the press falls on the tick before which a snapshot is kept.
    run(0.5);
    engine.setUpright();
    run(0.3);
    const down = signalIndex('down_m');
    const before = rows.at(-1)?.[down];
    const time = rows.at(-1)?.[signalIndex('t_s')] ?? 0;
    engine.rewind(0.6, now());
    rows.length = 0;
    engine.setSpeed(1, now());
    run(0.3);
    expect(rows.find((row) => row[signalIndex('t_s')] === time)?.[down]).toBe(before);
  });

  it('a flight that came apart says where, and flies on from before', () => {
    const { engine, run, now } = bench();
    engine.begin(settings(), { kind: 'ground' }, 0);
    engine.setSticks(flying);
    run(1);
    const { flight } = engine as unknown as { flight: { state: Float64Array } };
    flight.state[10] = NaN;
    run(0.2);
    expect(engine.stopped).toMatchObject({ reason: 'diverged' });
    expect(engine.stopped?.what).toMatch(/NaN/);
    const ticks = engine.stats().ticks;
    engine.rewind(0.8, now());
    expect(engine.stopped).toBeNull();
    engine.setSpeed(1, now());
    run(0.5);
    expect(engine.stats().ticks).toBe(ticks + 200);
    expect(engine.stopped).toBeNull();
  });

  it('the record tells what stood before gains were changed in flight, one entry a movement', async () => {
    const { engine, run, now } = bench();
    const gains = demoGains('sandpiper');
    engine.begin(settings(), { kind: 'ground' }, 0);
    run(1);
    for (const p of [2, 2.1, 2.2]) {
      const roll = { ...gains.axes.roll, p_us_per_dps: p };
      engine.change(settings({ gains: { ...gains, axes: { ...gains.axes, roll } } }), now());
      run(0.1);
    }
    const text = await engine.recordBlob().csv.text();
    const earlier = text.split('\n').filter((line) => line.startsWith('# until '));
    expect(earlier.length).toBe(1);
    expect(earlier[0]).toContain('until 1.200000 s');
    expect(earlier[0]).toContain(`"p_us_per_dps":${gains.axes.roll.p_us_per_dps}`);
    expect(text).toMatch(/^# gains: .*"p_us_per_dps":2\.2/m);
  });

  it('another site of the same name is another site', () => {
    const { engine, run, now, said } = bench();
    engine.begin(settings(), { kind: 'ground' }, 0);
    run(0.1);
    engine.change(settings({ scene: structuredClone(OPEN_FIELD) }), now());
    expect(said.filter((one) => one === 'began').length).toBe(1);
    engine.change(settings({ scene: { ...OPEN_FIELD, title: 'Higher' } }), now());
    expect(said.filter((one) => one === 'began').length).toBe(2);
  });

  it('takes new gains in flight without a jump, another loop rate by a fresh flight from the same place', () => {
    const { engine, rows, run, now, said } = bench();
    engine.begin(settings(), { kind: 'ground' }, 0);
    engine.setSticks(flying);
    run(2);
    const down = signalIndex('down_m');
    const before = rows.at(-1)?.[down] ?? 0;
    const gains = demoGains('sandpiper');
    engine.change(settings({ gains: { ...gains, loop_Hz: 800 } }), now());
    expect(said.filter((one) => one === 'began').length).toBe(2);
    run(0.02);
    expect(Math.abs((rows.at(-1)?.[down] ?? 0) - before)).toBeLessThan(0.2);
    run(1);
    expect(engine.stopped).toBeNull();
  });

  it('a craft that cannot hover here is refused and the flight that was running goes on', () => {
    const { engine, run, now } = bench();
    engine.begin(settings(), { kind: 'ground' }, 0);
    run(0.2);
    const ticks = engine.stats().ticks;
    const build = demoBuild('sandpiper');
    const heavy = { ...build, airframe: { ...build.airframe, mass_kg: 30 } };
    expect(() => engine.change(settings({ build: heavy }), now())).toThrow(/can hover at this site/);
    run(0.2);
    expect(engine.stats().ticks).toBeGreaterThan(ticks + 60);
  });

  it('more derivative gain on a noisy gyro makes the motors work harder and hotter (common practice, no source)', () => {
    const noisy = (d: number) => {
      const { engine, run } = bench();
      const gains = demoGains('sandpiper');
      const axis = { ...gains.axes.roll, d_us_per_dps2: d };
      engine.begin(
        settings({
          wind: parseWind({ format: 'gustbench.wind/1' }),
          gains: {
            ...gains,
            axes: { roll: axis, pitch: axis, yaw: gains.axes.yaw },
            derivativeLowPass_Hz: 120,
          },
        }),
        { kind: 'hover', height_m: 5 },
        0,
      );
      engine.setSticks({ ...flying, throttle: 0.5 });
      run(3);
      return engine.stats();
    };
    const low = noisy(0.008);
    const high = noisy(0.035);
    expect(high.motorActivity_us).toBeGreaterThan(1.6 * low.motorActivity_us);
    expect(high.windingHeat_W).toBeGreaterThan(low.windingHeat_W);
  });
});

describe('ticks on time', () => {
  it('are a share of the last minute: what was late before is forgotten', () => {
    const counted = new Punctuality();
    expect(counted.share).toBe(1);
    counted.count(500, 100, 50);
    expect(counted.share).toBeCloseTo(0.5, 12);
    for (let s = 1; s < 59; s++) counted.count(1000 * s + 500, 400, 0);
    expect(counted.share).toBeCloseTo(1 - 50 / (100 + 58 * 400), 12);
    counted.count(60_500, 400, 1);
    expect(counted.share).toBeCloseTo(1 - 1 / (59 * 400), 12);
    counted.count(500_000, 100, 0);
    expect(counted.share).toBe(1);
  });
});
