/**
 * Speed of one flight's equations of motion, measured side by side in one run: here, the same equations in C
 * (-O2, when a compiler is there), and mujoco-js stepping one free body with RK4 at the same step.
 */
import { execFileSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import path from 'node:path';
import { parseBuild } from '../../src/craft/build.ts';
import { compileCraft } from '../../src/craft/compile.ts';
import { RungeKutta4 } from '../../src/math/integration.ts';
import { FlightDynamics } from '../../src/physics/dynamics.ts';
import { POSITION, RATES, STATE_SIZE } from '../../src/physics/state.ts';
import { findTrim, HOVER } from '../../src/physics/trim.ts';

const STEPS = 1_000_000;
const STEP_S = 0.0005;
const RESET = 2000;

function craftAtHover() {
  const raw: unknown = JSON.parse(readFileSync('scenes/sandpiper.build.json', 'utf8'));
  const craft = compileCraft(parseBuild(raw));
  return { craft, trim: findTrim(craft, { ...HOVER, density_kgpm3: 1.225 }) };
}

/** Steps a second and the check sum that the C program prints too. */
function ours(): { rate: number; sum: number } {
  const { craft, trim } = craftAtHover();
  const dynamics = new FlightDynamics(craft, 1.225);
  dynamics.groundDown_m = 0;
  dynamics.duty.set(trim.duty);
  const s = new Float64Array(STATE_SIZE);
  const rk = new RungeKutta4(STATE_SIZE);
  let rate = 0;
  let sum = 0;
  for (let round = 0; round < 3; round++) {
    sum = 0;
    const start = process.cpuUsage().user;
    for (let k = 0; k < STEPS; k++) {
      if (k % RESET === 0) {
        if (k > 0) sum = sum * 0.5 + s[RATES] + s[POSITION + 2];
        s.set(trim.state);
        s[RATES] = 0.1;
      }
      dynamics.prepare(s);
      rk.step(dynamics, s, STEP_S);
    }
    rate = Math.max(rate, STEPS / ((process.cpuUsage().user - start) / 1e6));
  }
  return { rate, sum };
}

function inC(): { rate: number; sum: number } | string {
  const { craft, trim } = craftAtHover();
  const { rotor, motor } = craft;
  const numbers = [
    ...[STEPS, STEP_S, craft.mass_kg, ...craft.inertia, ...craft.inertiaInverse, ...craft.dragArea_m2],
    ...[
      ...craft.rotorPosition_m,
      ...craft.spin,
      rotor.radius_m,
      rotor.perTwiceArea_m2,
      rotor.tablePerSpeed_s,
    ],
    ...[rotor.inflowSlope_m3, rotor.inPlaneDrag, rotor.inflowRelaxation_per_m, rotor.inertia_kgm2],
    ...[...rotor.thrustFactor, ...rotor.torqueFactor, ...rotor.hoverInflowFactor_m],
    ...[motor.torqueConstant, motor.resistance_ohm, motor.noLoadCurrent_A, craft.batteryResistance_ohm],
    ...[craft.capacity_C, craft.cells * 4.2, 1.225, 0, ...trim.duty, ...trim.state],
  ];
  const folder = mkdtempSync(path.join(tmpdir(), 'gustbench-'));
  try {
    const program = path.join(folder, 'flight');
    execFileSync('cc', ['-O2', '-o', program, 'test/bench/flight.c', '-lm'], { stdio: 'pipe' });
    let rate = 0;
    let sum = 0;
    for (let round = 0; round < 3; round++) {
      const [seconds, check] = execFileSync(program, { input: numbers.join(' '), encoding: 'utf8' })
        .split(' ')
        .map(Number);
      rate = Math.max(rate, STEPS / seconds);
      sum = check;
    }
    return { rate, sum };
  } catch (error) {
    return error instanceof Error ? error.message.split('\n')[0] : String(error);
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

async function inMujoco(): Promise<{ cold: number; warm: number }> {
  const { default: load } = await import('mujoco-js');
  const mujoco = await load();
  const { craft } = craftAtHover();
  const I = craft.build.airframe.inertia_kgm2;
  const text = `<mujoco><option timestep="${STEP_S}" integrator="RK4" gravity="0 0 -9.80665"/><worldbody><body>
    <freejoint/><inertial pos="0 0 0" mass="${craft.mass_kg}"
    fullinertia="${I.xx} ${I.yy} ${I.zz} ${I.xy} ${I.xz} ${I.yz}"/></body></worldbody></mujoco>`;
  mujoco.FS.writeFile('/body.xml', text);
  const model = mujoco.MjModel.loadFromXML('/body.xml');
  const data = new mujoco.MjData(model);
  const rates = [];
  for (let round = 0; round < 4; round++) {
    const start = process.cpuUsage().user;
    for (let k = 0; k < 50_000; k++) mujoco.mj_step(model, data);
    rates.push(50_000 / ((process.cpuUsage().user - start) / 1e6));
  }
  return { cold: rates[0], warm: Math.max(...rates) };
}

const here = ours();
console.log(`one flight, full equations, here:    ${(here.rate / 1e6).toFixed(3)} million RK4 steps/s`);
const c = inC();
if (typeof c === 'string') console.log(`the same in C: left out (${c})`);
else {
  console.log(`the same equations in C -O2:         ${(c.rate / 1e6).toFixed(3)} million RK4 steps/s`);
  console.log(
    `  ratio here/C: ${(here.rate / c.rate).toFixed(2)} (wanted 0.5); check sums differ by ${Math.abs(here.sum / c.sum - 1).toExponential(1)}`,
  );
}
const m = await inMujoco();
console.log(
  `mujoco-js, one free body, first 50k: ${(m.cold / 1e6).toFixed(3)}, warm: ${(m.warm / 1e6).toFixed(3)} million steps/s`,
);
console.log(
  `  ratio here/mujoco-js: ${(here.rate / m.cold).toFixed(1)} first 50k, ${(here.rate / m.warm).toFixed(1)} warm (wanted 15)`,
);
