import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { CALM, parseWind } from '../../src/craft/wind.ts';
import { CommandQueue } from '../../src/flight/commandQueue.ts';
import { Flight, type FlightSetup } from '../../src/flight/flight.ts';
import { NEUTRAL_STICKS, type Sticks } from '../../src/flight/pilot.ts';
import { recordCsv } from '../../src/flight/record.ts';
import { runFlight } from '../../src/flight/run.ts';
import { RECORD_SIGNALS, SIGNAL_NAMES, signalIndex } from '../../src/flight/signals.ts';
import { GRAVITY_MPS2 } from '../../src/math/angles.ts';
import { demoBuild, demoGains } from '../physics/builds.ts';

const GUSTY = parseWind({
  format: 'gustbench.wind/1',
  mean_mps: 7,
  from_deg: 230,
  turbulence: { model: 'MIL-F-8785C', windAt20ft_mps: 8 },
  gusts: [{ start_s: 2, length_m: 15, peak_mps: 5, from_deg: 230 }],
});
const MOORED: Sticks = { ...NEUTRAL_STICKS, armed: true, moored: true, throttle: 0.5 };

function setup(name: 'sandpiper' | 'wren', change: Partial<FlightSetup> = {}): FlightSetup {
  return {
    build: demoBuild(name),
    gains: demoGains(name),
    wind: CALM,
    seed: 11,
    start: { kind: 'hover', height_m: 5 },
    ...change,
  };
}

describe('the demo builds with their gains', () => {
  it.each(['sandpiper', 'wren'] as const)(
    '%s hovers: tilt below 1.5°, drift below 0.2 m in calm air',
    (name) => {
      const { record, stopped, flight } = runFlight(setup(name), 15, () => MOORED);
      expect(stopped).toBeNull();
      const [qx, qy] = [record.column('qx'), record.column('qy')];
      const tilt = Math.max(...qx.map((x, k) => 2 * Math.asin(Math.hypot(x, qy[k]))));
      expect(tilt * 57.3).toBeLessThan(1.5);
      expect(Math.hypot(flight.state[0], flight.state[1])).toBeLessThan(0.2);
      expect(Math.abs(flight.state[2] + 5)).toBeLessThan(0.1);
    },
  );

  it.each(['sandpiper', 'wren'] as const)('%s stays upright in 7 m/s with gusts and turbulence', (name) => {
    const { record, stopped } = runFlight(setup(name, { wind: GUSTY }), 15, () => MOORED);
    expect(stopped).toBeNull();
    const [qx, qy] = [record.column('qx'), record.column('qy')];
    expect(Math.max(...qx.map((x, k) => 2 * Math.asin(Math.hypot(x, qy[k])))) * 57.3).toBeLessThan(35);
  });

  it.each(['sandpiper', 'wren'] as const)(
    '%s follows a rate step: within 10 %% of it after 0.4 s, overshoot below 30 %%',
    (name) => {
      const sticks = { ...NEUTRAL_STICKS, armed: true, throttle: 0.5 };
      const { record } = runFlight(
        setup(name, { start: { kind: 'free-air', height_m: 50 } }),
        0.6,
        (t, flight) => {
          const { escIdle_us, escMax_us } = flight.craft;
          sticks.throttle = (flight.trim.command_us[0] - escIdle_us) / (escMax_us - escIdle_us);
          sticks.roll = t > 0.1 ? 0.25 : 0;
          return sticks;
        },
      );
      const wanted = 0.25 * demoGains(name).maxRate_dps.roll;
      const rate = record.column('rate_roll_dps');
      const at = (t: number) => rate[Math.round(t * demoGains(name).loop_Hz)];
      expect(Math.abs(at(0.5) / wanted - 1)).toBeLessThan(0.1);
      expect(Math.max(...rate) / wanted).toBeLessThan(1.3);
    },
  );
});

describe('the tick', () => {
  it('is deterministic: same seed, same bytes; another seed, other bytes', () => {
    const text = (seed: number) => {
      const s = setup('sandpiper', { wind: GUSTY, seed });
      const { record } = runFlight(s, 2, () => MOORED);
      return [...recordCsv(record, { ...s, scene: new Flight(s).scene, faults: [] })].join('');
    };
    expect(text(4)).toBe(text(4));
    expect(text(4)).not.toBe(text(5));
  });

  it('continues bit for bit from a snapshot taken at any tick (fast-check)', () => {
    const s = setup('sandpiper', { wind: GUSTY });
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 700 }), (ticks) => {
        const first = new Flight(s);
        for (let k = 0; k < ticks; k++) first.tick(MOORED);
        const snapshot = first.save();
        const second = new Flight(s);
        second.load(snapshot);
        for (let k = 0; k < 60; k++) {
          first.tick(MOORED);
          second.tick(MOORED);
        }
        expect(Array.from(second.state)).toEqual(Array.from(first.state));
        expect(Array.from(second.signals)).toEqual(Array.from(first.signals));
      }),
      { numRuns: 12 },
    );
  });

  it('gyro noise switched off leaves the wind as it was (separate streams)', () => {
    const wind = (noise: number) => {
      const flight = new Flight(setup('sandpiper', { wind: GUSTY }));
      flight.setNoise(noise, noise);
      const seen: number[] = [];
      for (let k = 0; k < 40; k++) {
        flight.tick({ ...MOORED, armed: false });
        seen.push(flight.signals[signalIndex('wind_n_mps')]);
      }
      return seen;
    };
    // A falling craft, whose path no noise reaches while the motors are off.
    expect(wind(0)).toEqual(wind(1));
  });

  it('a disarmed craft in free air falls at 1 g', () => {
    const flight = new Flight(setup('sandpiper', { start: { kind: 'free-air', height_m: 500 } }));
    flight.state.fill(0, 13, 21);
    for (let k = 0; k < 40; k++) flight.tick(NEUTRAL_STICKS);
    expect(flight.state[5]).toBeCloseTo(GRAVITY_MPS2 * 0.1, 1);
  });

  it('delays a command that is no multiple of the step by its true length (mean command over the step)', () => {
    const queue = new CommandQueue();
    queue.force([1000, 1000, 1000, 1000]);
    queue.push(0.0008, new Float64Array([1100, 1100, 1100, 1100]));
    queue.advance(0, 0.0005);
    expect(queue.mean_us[0]).toBe(1000);
    queue.advance(0.0005, 0.0005);
    expect(queue.mean_us[0]).toBeCloseTo(1000 + 100 * 0.4, 9);
    queue.advance(0.001, 0.0005);
    expect(queue.mean_us[0]).toBe(1100);
  });

  it('all four motors get a new command in each 4 ms of a 250 Hz loop (closed form: 1/250 s)', () => {
    const gains = { ...demoGains('sandpiper'), loop_Hz: 250 };
    const flight = new Flight(setup('sandpiper', { gains }));
    expect(flight.tick_s).toBeCloseTo(0.004, 15);
    expect(flight.step_s).toBeLessThanOrEqual(0.0005);
    expect(Math.round(flight.tick_s / flight.step_s) * flight.step_s).toBeCloseTo(flight.tick_s, 15);
    const seen = new Set<string>();
    for (let k = 0; k < 50; k++) {
      flight.tick({ ...MOORED, roll: Math.sin(k), pitch: Math.cos(k) });
      const at = signalIndex('cmd_FL_us');
      seen.add(Array.from(flight.signals.subarray(at, at + 4)).join());
    }
    expect(seen.size).toBeGreaterThan(45);
  });

  it('stops with tick, state and a way back when it diverges in spite of all', () => {
    const flight = new Flight(setup('sandpiper'));
    const before = flight.save();
    flight.tick(MOORED);
    flight.state[10] = 1e9;
    flight.tick(MOORED);
    expect(flight.stopped).toMatchObject({ reason: 'diverged' });
    const tick = flight.tickIndex;
    flight.tick(MOORED);
    expect(flight.tickIndex, 'a stopped flight does not go on').toBe(tick);
    flight.load(before);
    expect(flight.stopped).toBeNull();
    flight.tick(MOORED);
    expect(flight.stopped).toBeNull();
  });

  it('lets the payload go: lighter, and the body origin keeps its place', () => {
    const flight = new Flight(setup('sandpiper'));
    for (let k = 0; k < 100; k++) flight.tick(MOORED);
    const down = flight.state[2];
    flight.dropPayload();
    expect(flight.craft.mass_kg).toBeCloseTo(1.17, 12);
    expect(Math.abs(flight.state[2] - down)).toBeLessThan(0.05);
    for (let k = 0; k < 1200; k++) flight.tick(MOORED);
    expect(Math.abs(flight.state[2] + 5), 'the mooring holds the lighter craft').toBeLessThan(0.2);
  });
});

describe('record', () => {
  it('has the agreed columns first and in order', () => {
    expect(RECORD_SIGNALS.slice(0, 11)).toEqual([
      ...['t_s', 'sp_roll_dps', 'sp_pitch_dps', 'sp_yaw_dps', 'throttle'],
      ...[
        'rate_roll_dps',
        'rate_pitch_dps',
        'rate_yaw_dps',
        'gyro_roll_dps',
        'gyro_pitch_dps',
        'gyro_yaw_dps',
      ],
    ]);
    expect(RECORD_SIGNALS.slice(-5)).toEqual([
      'wind_n_mps',
      'wind_e_mps',
      'wind_d_mps',
      'battery_V',
      'current_A',
    ]);
    expect(new Set(SIGNAL_NAMES).size).toBe(SIGNAL_NAMES.length);
  });
});
