/**
 * A craft's one axis in closed loop for the tests: exactly K e^(−sTd)/(s(τs+1)), a discrete PID with a
 * filtered derivative, coloured disturbance torque, gyro noise, jittered and lost rows. Not the program's own
 * simulation: the plant is known in closed form.
 */
import type { PlantParameters } from '../../src/matching/axisData.ts';
import { RandomStream } from '../../src/math/random.ts';

export interface LoopSetup {
  readonly plant: PlantParameters;
  readonly loop_Hz: number;
  readonly duration_s: number;
  readonly seed: number;
  readonly p_us_per_dps: number;
  readonly i_us_per_deg: number;
  readonly d_us_per_dps2: number;
  readonly derivativeLowPass_Hz: number;
  /** Rate setpoint, deg/s. */
  readonly setpoint_dps: (t_s: number) => number;
  readonly gyroNoise_dps: number;
  /** Standard deviation of the disturbance, deg/s², and how fast it forgets, 1/s. */
  readonly gust_dps2: number;
  readonly gustDecay_per_s: number;
  /** Constant disturbance, deg/s²: a trim error. */
  readonly trim_dps2?: number;
  /** Uniform within ± this; of the ticks themselves or only of the time stamps. */
  readonly jitter_s: number;
  readonly jitterOf: 'ticks' | 'stamps';
  readonly lostShare: number;
  /** Added to the gyro sample, deg/s: vibration. */
  readonly vibration_dps?: (t_s: number) => number;
  readonly commandStep_us?: number;
  /** Several axes on one clock share these. */
  readonly jitterSeed?: number;
  readonly lossSeed?: number;
}

export interface LoopLog {
  readonly t_s: Float64Array;
  readonly sp_dps: Float64Array;
  readonly gyro_dps: Float64Array;
  readonly u_us: Float64Array;
}

export function flyLoop(setup: LoopSetup): LoopLog {
  const { plant, loop_Hz, seed } = setup;
  const n = Math.round(setup.duration_s * loop_Hz);
  const T = 1 / loop_Hz;
  const stream = (name: string, of = seed) => new RandomStream(of, name);
  const noise = stream('noise');
  const gust = stream('gust');
  const jitter = stream('jitter', setup.jitterSeed);
  const loss = stream('loss', setup.lossSeed);
  const tau = plant.lag_s;
  let rate = 0;
  let acceleration = 0;
  let disturbance = setup.gust_dps2 * gust.gaussian();
  let now = 0;
  let active = 0;
  const events: { at: number; u: number }[] = [];
  let nextEvent = 0;
  let integral = 0;
  let lastGyro = 0;
  let derivative = 0;
  const keepD = Math.exp(-2 * Math.PI * setup.derivativeLowPass_Hz * T);
  const kept = { t: [] as number[], sp: [] as number[], y: [] as number[], u: [] as number[] };

  const advance = (to: number) => {
    while (now < to) {
      // Short steps for the disturbance (held over each), exact for the lag.
      let stop = Math.min(to, now + 0.0005);
      if (nextEvent < events.length) stop = Math.min(stop, events[nextEvent].at);
      const h = stop - now;
      if (h > 0) {
        const decay = Math.exp(-h / tau);
        const input = plant.gain_dps2_per_us * active;
        rate +=
          input * h + (acceleration - input) * tau * (1 - decay) + (disturbance + (setup.trim_dps2 ?? 0)) * h;
        acceleration = input + (acceleration - input) * decay;
        const forget = Math.exp(-setup.gustDecay_per_s * h);
        disturbance =
          forget * disturbance + setup.gust_dps2 * Math.sqrt(1 - forget * forget) * gust.gaussian();
      }
      now = stop;
      while (nextEvent < events.length && events[nextEvent].at <= now) active = events[nextEvent++].u;
    }
  };

  for (let k = 0; k < n; k++) {
    const off = setup.jitter_s * (2 * jitter.uniform() - 1);
    const tick = Math.max(0, k * T + (setup.jitterOf === 'ticks' ? off : 0));
    advance(tick);
    const sp = setup.setpoint_dps(tick);
    const y = rate + setup.gyroNoise_dps * noise.gaussian() + (setup.vibration_dps?.(tick) ?? 0);
    const error = sp - y;
    integral += setup.i_us_per_deg * T * error;
    derivative = keepD * derivative + (1 - keepD) * ((-setup.d_us_per_dps2 * (y - lastGyro)) / T);
    lastGyro = y;
    let u = setup.p_us_per_dps * error + integral + derivative;
    const step = setup.commandStep_us ?? 0;
    if (step > 0) u = Math.round(u / step) * step;
    events.push({ at: tick + plant.delay_s, u });
    if (loss.uniform() >= setup.lostShare) {
      kept.t.push(k * T + off);
      kept.sp.push(sp);
      kept.y.push(y);
      kept.u.push(u);
    }
  }
  return {
    t_s: Float64Array.from(kept.t),
    sp_dps: Float64Array.from(kept.sp),
    gyro_dps: Float64Array.from(kept.y),
    u_us: Float64Array.from(kept.u),
  };
}

/** Doublets of changing length, as a pilot would fly them. */
export function doublets(amplitude_dps: number): (t_s: number) => number {
  const halves = [0.25, 0.4, 0.15, 0.3, 0.2];
  const period = 2;
  return (t) => {
    const half = halves[Math.floor(t / period) % halves.length];
    const inside = t % period;
    if (inside < 0.3) return 0;
    if (inside < 0.3 + half) return amplitude_dps;
    if (inside < 0.3 + 2 * half) return -amplitude_dps;
    return 0;
  };
}

/** Sum of sines with fixed phases. */
export function multisine(amplitude_dps: number, frequencies_Hz: readonly number[]): (t_s: number) => number {
  return (t) =>
    frequencies_Hz.reduce(
      (sum, f, i) => sum + amplitude_dps * Math.sin(2 * Math.PI * f * t + 1.7 * i * i),
      0,
    );
}
