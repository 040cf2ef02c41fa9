/** Logs of three axes from the closed-loop plants of closedLoop.ts: as typed arrays and as CSV text. */
import type { Build } from '../../src/craft/build.ts';
import { AXES, type AxisName } from '../../src/craft/gains.ts';
import type { PlantParameters } from '../../src/matching/axisData.ts';
import { axisSigns } from '../../src/matching/axisCommand.ts';
import type { FlightLog } from '../../src/matching/log.ts';
import { doublets, flyLoop, type LoopLog, type LoopSetup } from './closedLoop.ts';

/** Plants near those of a 1.35 kg craft with 10-inch propellers; invented. */
export const PLANTS: Readonly<Record<AxisName, PlantParameters>> = {
  roll: { gain_dps2_per_us: 30, lag_s: 0.035, delay_s: 0.0042 },
  pitch: { gain_dps2_per_us: 26, lag_s: 0.038, delay_s: 0.0047 },
  yaw: { gain_dps2_per_us: 6, lag_s: 0.045, delay_s: 0.0052 },
};

const GAINS: Readonly<Record<AxisName, Pick<LoopSetup, 'p_us_per_dps' | 'i_us_per_deg' | 'd_us_per_dps2'>>> =
  {
    roll: { p_us_per_dps: 0.7, i_us_per_deg: 2, d_us_per_dps2: 0.011 },
    pitch: { p_us_per_dps: 0.75, i_us_per_deg: 2, d_us_per_dps2: 0.012 },
    yaw: { p_us_per_dps: 2, i_us_per_deg: 3, d_us_per_dps2: 0.03 },
  };

export type LoopChange = Partial<LoopSetup>;

/** One axis flown; doublets of ±70 deg/s, 0.15 deg/s gyro noise, 50 deg/s² of gusts, jitter 0.2 ms, 1 % lost. */
export function flyAxis(axis: AxisName, seed: number, change: LoopChange = {}): LoopLog {
  return flyLoop({
    plant: PLANTS[axis],
    loop_Hz: 400,
    duration_s: 20,
    seed: seed * 3 + AXES.indexOf(axis),
    ...GAINS[axis],
    derivativeLowPass_Hz: 45,
    setpoint_dps: doublets(70),
    gyroNoise_dps: 0.15,
    gust_dps2: axis === 'yaw' ? 15 : 50,
    gustDecay_per_s: 3,
    trim_dps2: 60,
    jitter_s: 0.0002,
    jitterOf: 'ticks',
    lostShare: 0.01,
    ...change,
  });
}

/** Three axes flown on one clock (rows are lost together). */
export function flyThreeAxes(seed: number, change: (axis: AxisName) => LoopChange = () => ({})) {
  const clock = { jitterSeed: seed, lossSeed: seed };
  const logs = AXES.map((axis) => flyAxis(axis, seed, { ...clock, ...change(axis) }));
  return { t_s: logs[0].t_s, roll: logs[0], pitch: logs[1], yaw: logs[2] };
}

export type ThreeAxes = ReturnType<typeof flyThreeAxes>;

/** As the reader would give it, with axis commands. */
export function asLog(flown: ThreeAxes): FlightLog {
  const per = (key: 'gyro_dps' | 'sp_dps' | 'u_us') =>
    Object.fromEntries(AXES.map((axis) => [axis, flown[axis][key]])) as Record<AxisName, Float64Array>;
  return {
    name: 'made.csv',
    t_s: flown.t_s.map((t) => t - flown.t_s[0]),
    gyro_dps: per('gyro_dps'),
    setpoint_dps: per('sp_dps'),
    axisCommand_us: per('u_us'),
    motorCommand_us: {},
    rotorSpeed_rpm: {},
    angle_deg: {},
    remarks: [],
  };
}

/** Motor commands of a row, FL, FR, RL, RR, about `hover_us`. */
export function motorsOf(flown: ThreeAxes, build: Build, row: number, hover_us: number): number[] {
  return [0, 1, 2, 3].map(
    (motor) =>
      hover_us + AXES.reduce((sum, axis) => sum + axisSigns(build, axis)[motor] * flown[axis].u_us[row], 0),
  );
}

const RAD = Math.PI / 180;

/** A CSV with heads of its own, times in µs, rates in rad/s: needs a columns file. */
export function foreignCsv(flown: ThreeAxes, build: Build): string {
  const lines = ['time,p,q,r,want_p,want_q,want_r,thr,m1,m2,m3,m4'];
  for (let k = 0; k < flown.t_s.length; k++) {
    const rates = AXES.map((axis) => (flown[axis].gyro_dps[k] * RAD).toFixed(6));
    const wanted = AXES.map((axis) => (flown[axis].sp_dps[k] * RAD).toFixed(6));
    const motors = motorsOf(flown, build, k, 1497).map((value) => value.toFixed(2));
    lines.push([Math.round(flown.t_s[k] * 1e6), ...rates, ...wanted, '0.5', ...motors].join(','));
  }
  return `${lines.join('\n')}\n`;
}

export const FOREIGN_COLUMNS = {
  t: { column: 'time', unit: 'us' },
  gyro_roll: { column: 'p', unit: 'rad/s', sign: 1 },
  gyro_pitch: { column: 'q', unit: 'rad/s' },
  gyro_yaw: { column: 'r', unit: 'rad/s' },
  sp_roll: { column: 'want_p', unit: 'rad/s' },
  sp_pitch: { column: 'want_q', unit: 'rad/s' },
  sp_yaw: { column: 'want_r', unit: 'rad/s' },
  throttle: { column: 'thr', unit: '1' },
  cmd_FL: { column: 'm1', unit: 'us' },
  cmd_FR: { column: 'm2', unit: 'us' },
  cmd_RL: { column: 'm3', unit: 'us' },
  cmd_RR: { column: 'm4', unit: 'us' },
};

/** The bench's own record heads, as far as a match reads them. */
export function ownCsv(flown: ThreeAxes, build: Build): string {
  const heads = [
    't_s',
    ...AXES.map((axis) => `sp_${axis}_dps`),
    'throttle',
    ...AXES.map((axis) => `gyro_${axis}_dps`),
    ...['FL', 'FR', 'RL', 'RR'].map((corner) => `cmd_${corner}_us`),
  ];
  const lines = ['# gustbench.record/1', heads.join(',')];
  for (let k = 0; k < flown.t_s.length; k++) {
    lines.push(
      [
        flown.t_s[k].toFixed(6),
        ...AXES.map((axis) => flown[axis].sp_dps[k].toFixed(4)),
        '0.5',
        ...AXES.map((axis) => flown[axis].gyro_dps[k].toFixed(4)),
        ...motorsOf(flown, build, k, 1497).map((value) => value.toFixed(2)),
      ].join(','),
    );
  }
  return `${lines.join('\n')}\n`;
}
