/**
 * How true the 95 % intervals of Match are: 200 runs in closed loop on three axes, plants known in closed form,
 * noise, jitter 0.2 ms, 1 % lost. Wanted: 90–98 % of the intervals hold the truth, gain within 3 %, lag within
 * 5 %, delay within 0.5 ms. Then a log of 30 minutes at 2 kHz through the command line. Wanted: 60 s, 1 GB.
 */
import { spawnSync } from 'node:child_process';
import { closeSync, mkdtempSync, openSync, readFileSync, rmSync, statSync, writeSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { parseBuild } from '../../src/craft/build.ts';
import { AXES, type AxisName } from '../../src/craft/gains.ts';
import { matchLog } from '../../src/matching/matchLog.ts';
import { asLog, flyThreeAxes, motorsOf, PLANTS } from '../matching/logs.ts';

const build = parseBuild(JSON.parse(readFileSync('scenes/sandpiper.build.json', 'utf8')));
const HALF_95 = 1.959964;
const FIGURES = ['gain_dps2_per_us', 'lag_s', 'delay_s'] as const;
type Figure = (typeof FIGURES)[number];
const NAMES = { gain_dps2_per_us: 'gain', lag_s: 'lag', delay_s: 'delay' } as const;

interface Tally {
  held: number;
  readonly errors: number[];
}

/** Delay errors in ms, the others in per cent of the truth. */
function errorOf(figure: Figure, value: number, truth: number): number {
  return figure === 'delay_s' ? 1000 * (value - truth) : 100 * (value / truth - 1);
}

function coverage(runs: number): void {
  const tallies = new Map<string, Tally>();
  let without = 0;
  const begun = performance.now();
  for (let seed = 1; seed <= runs; seed++) {
    const { axes } = matchLog(asLog(flyThreeAxes(1000 + seed)), build);
    for (const axis of AXES) {
      const { estimates } = axes[axis];
      if (estimates === null) {
        without++;
        continue;
      }
      for (const figure of FIGURES) {
        const { value, sigma } = estimates[figure];
        const truth = PLANTS[axis][figure];
        const key = `${axis} ${figure}`;
        const tally = tallies.get(key) ?? { held: 0, errors: [] };
        if (Math.abs(value - truth) <= HALF_95 * sigma) tally.held++;
        tally.errors.push(errorOf(figure, value, truth));
        tallies.set(key, tally);
      }
    }
  }
  console.log(
    `${runs} runs of 20 s at 400 Hz, ${((performance.now() - begun) / 1000).toFixed(0)} s; axes without numbers: ${without}`,
  );
  for (const axis of AXES) for (const figure of FIGURES) say(axis, figure, tallies.get(`${axis} ${figure}`));
}

function say(axis: AxisName, figure: Figure, tally: Tally | undefined): void {
  if (tally === undefined) return;
  const { errors, held } = tally;
  const sizes = errors.map(Math.abs).sort((a, b) => a - b);
  const mean = errors.reduce((sum, one) => sum + one, 0) / errors.length;
  const unit = figure === 'delay_s' ? 'ms' : '%';
  const at = (share: number) => sizes[Math.floor(share * (sizes.length - 1))].toFixed(2);
  console.log(
    `${axis.padEnd(5)} ${NAMES[figure].padEnd(5)}: interval holds the truth in ${((100 * held) / errors.length).toFixed(1)} %; ` +
      `error 95 of 100 within ${at(0.95)} ${unit}, worst ${at(1)} ${unit}, mean ${mean.toFixed(3)} ${unit}`,
  );
}

const MINUTES = 30;
const RATE_HZ = 2000;

/** One minute flown, written again and again with its time going on. */
function writeLongLog(file: string): void {
  const minute = flyThreeAxes(7, () => ({ loop_Hz: RATE_HZ, duration_s: 60 }));
  const rest = Array.from(minute.t_s, (_, k) =>
    [
      ...AXES.map((axis) => minute[axis].sp_dps[k].toFixed(2)),
      '0.5',
      ...AXES.map((axis) => minute[axis].gyro_dps[k].toFixed(3)),
      ...motorsOf(minute, build, k, 1497).map((value) => value.toFixed(1)),
      // A column that Match leaves aside, as in any log.
      '15.81',
    ].join(','),
  );
  const heads = [
    't_s',
    ...AXES.map((axis) => `sp_${axis}_dps`),
    'throttle',
    ...AXES.map((axis) => `gyro_${axis}_dps`),
    ...['FL', 'FR', 'RL', 'RR'].map((corner) => `cmd_${corner}_us`),
    'battery_V',
  ];
  const out = openSync(file, 'w');
  writeSync(out, `# gustbench.record/1\n${heads.join(',')}\n`);
  for (let m = 0; m < MINUTES; m++) {
    let part = '';
    for (let k = 0; k < rest.length; k++) part += `${(minute.t_s[k] + 60 * m).toFixed(6)},${rest[k]}\n`;
    writeSync(out, part);
  }
  closeSync(out);
}

/** Has a node process say its peak memory, KiB, when it ends. */
const PEAK = `--import=data:text/javascript,${encodeURIComponent(
  'process.on("exit",()=>process.stderr.write("peak "+process.resourceUsage().maxRSS+"\\n"))',
)}`;

function longLog(): void {
  const folder = mkdtempSync(path.join(tmpdir(), 'gustbench-long-'));
  try {
    const file = path.join(folder, 'long.csv');
    writeLongLog(file);
    const begun = performance.now();
    const run = spawnSync(
      process.execPath,
      ['src/cli/launch.mjs', 'match', '--log', file, '--build', 'scenes/sandpiper.build.json'],
      { encoding: 'utf8', env: { ...process.env, NODE_OPTIONS: PEAK }, maxBuffer: 1e8 },
    );
    const seconds = (performance.now() - begun) / 1000;
    const peaks = [...run.stderr.matchAll(/^peak (\d+)$/gm)].map((one) => Number(one[1]) / 1e6);
    console.log(
      `${MINUTES} minutes at ${RATE_HZ} Hz, ${(statSync(file).size / 1e6).toFixed(0)} MB: match in ${seconds.toFixed(1)} s ` +
        `(wanted 60), peak memory ${Math.max(...peaks).toFixed(2)} GB (wanted 1), exit ${String(run.status)}`,
    );
    if (run.status !== 0) console.log(run.stderr.slice(-500));
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

longLog();
coverage(Number(process.env.RUNS ?? 200));
