import { readFileSync } from 'node:fs';
import loadMujoco from 'mujoco-js';
import { describe, expect, it } from 'vitest';
import { compileCraft } from '../../src/craft/compile.ts';
import { RungeKutta4, type RateOfChange } from '../../src/math/integration.ts';
import { angleBetween } from '../../src/math/quaternion.ts';
import { FlightDynamics } from '../../src/physics/dynamics.ts';
import { FORCE_X, rigidBodyRates, rotationOf, TORQUE_X, WRENCH_SIZE } from '../../src/physics/rigidBody.ts';
import { ATTITUDE, POSITION, RATES, ROTOR_SPEED, STATE_SIZE, VELOCITY } from '../../src/physics/state.ts';
import { VACUUM_KGPM3, withAirframe } from './builds.ts';

const STEP_S = 0.0005;

interface TorqueFree {
  I: [number, number, number];
  start: number[];
  rows: [number, number, number, number][];
}
const exact = JSON.parse(
  readFileSync(new URL('../reference/physics/torque_free.json', import.meta.url), 'utf8'),
) as TorqueFree;

describe('rigid body', () => {
  it('turns torque-free as the Jacobi elliptic functions say, body rates within 1e-7 after 10 s (Landau & Lifshitz §37, SciPy)', () => {
    const [xx, yy, zz] = exact.I;
    const craft = compileCraft(withAirframe({ inertia_kgm2: { xx, yy, zz, xy: 0, xz: 0, yz: 0 } }));
    const dynamics = new FlightDynamics(craft, VACUUM_KGPM3);
    const s = new Float64Array(STATE_SIZE);
    s[ATTITUDE] = 1;
    s.set(exact.start, RATES);
    const rk = new RungeKutta4(STATE_SIZE);
    const size = Math.hypot(...exact.start);
    let step = 0;
    for (const [t, ...expected] of exact.rows) {
      for (; step < Math.round(t / STEP_S); step++) {
        dynamics.prepare(s);
        rk.step(dynamics, s, STEP_S);
      }
      const error = Math.hypot(...expected.map((value, i) => s[RATES + i] - value)) / size;
      expect(error, `relative body-rate error at ${t} s`).toBeLessThan(1e-7);
    }
  });

  it('keeps angular momentum and energy of a torque-free body with a full tensor and turning rotors', () => {
    const craft = compileCraft(
      withAirframe({ inertia_kgm2: { xx: 0.012, yy: 0.016, zz: 0.022, xy: 0.001, xz: -0.002, yz: 0.0015 } }),
    );
    const dynamics = new FlightDynamics(craft, VACUUM_KGPM3);
    const s = new Float64Array(STATE_SIZE);
    s[ATTITUDE] = 1;
    s.set([2, -1, 3], RATES);
    const momentum = () => {
      const rotation = new Float64Array(9);
      rotationOf(s, rotation);
      const w = s.subarray(RATES, RATES + 3);
      const h = [0, 1, 2].map((row) =>
        [0, 1, 2].reduce((sum, c) => sum + craft.inertia[3 * row + c] * w[c], 0),
      );
      for (let i = 0; i < 4; i++) h[2] += craft.spin[i] * craft.rotor.inertia_kgm2 * s[ROTOR_SPEED + i];
      return [0, 1, 2].map((row) => [0, 1, 2].reduce((sum, c) => sum + rotation[3 * row + c] * h[c], 0));
    };
    // Unequal rotors, so that their momentum does not cancel; unpowered, they only feel bearing friction.
    s.set([400, 0, 0, 300], ROTOR_SPEED);
    const before = momentum();
    const rk = new RungeKutta4(STATE_SIZE);
    for (let k = 0; k < 10_000; k++) {
      dynamics.prepare(s);
      rk.step(dynamics, s, STEP_S);
    }
    const after = momentum();
    const size = Math.hypot(...before);
    for (let i = 0; i < 3; i++) expect(Math.abs(after[i] - before[i]) / size).toBeLessThan(1e-8);
  });

  it('agrees with mujoco-js under the same held wrench, RK4, attitude within 1e-6 rad after 10 s', async () => {
    const inertia_kgm2 = { xx: 0.012, yy: 0.016, zz: 0.022, xy: 0.0008, xz: -0.0011, yz: 0.0006 };
    const craft = compileCraft(withAirframe({ inertia_kgm2 }));
    const wrenchAt = (step: number) => {
      const t = Math.floor(step / 20) * 20 * STEP_S;
      return {
        force: [0.8 * Math.sin(2 * t), 0.5 * Math.cos(3 * t), -13 + 2 * Math.sin(t)],
        torque: [0.02 * Math.sin(5 * t), 0.015 * Math.cos(4 * t), 0.01 * Math.sin(3 * t + 1)],
      };
    };
    // Our body, wrench held in world axes over the step as mujoco holds xfrc_applied.
    const wrench = new Float64Array(WRENCH_SIZE);
    const rotation = new Float64Array(9);
    let held = wrenchAt(0);
    const system: RateOfChange = {
      derivative(s, d) {
        rotationOf(s, rotation);
        for (let i = 0; i < 3; i++) {
          wrench[FORCE_X + i] = [0, 1, 2].reduce(
            (sum, row) => sum + rotation[3 * row + i] * held.force[row],
            0,
          );
          wrench[TORQUE_X + i] = [0, 1, 2].reduce(
            (sum, row) => sum + rotation[3 * row + i] * held.torque[row],
            0,
          );
        }
        rigidBodyRates(craft, s, rotation, wrench, d);
      },
    };
    const s = new Float64Array(STATE_SIZE);
    s[ATTITUDE] = 1;
    s.set([0.5, -0.3, 0.8], RATES);
    const rk = new RungeKutta4(STATE_SIZE);

    // The same body in mujoco: its world is z up here, taken as our axes with gravity along +z.
    const mujoco = await loadMujoco();
    const I = inertia_kgm2;
    mujoco.FS.writeFile(
      '/body.xml',
      `<mujoco><option timestep="${STEP_S}" integrator="RK4" gravity="0 0 9.80665"/><worldbody><body><freejoint/>
       <inertial pos="0 0 0" mass="${craft.mass_kg}" fullinertia="${I.xx} ${I.yy} ${I.zz} ${I.xy} ${I.xz} ${I.yz}"/>
       </body></worldbody></mujoco>`,
    );
    const model = mujoco.MjModel.loadFromXML('/body.xml');
    const data = new mujoco.MjData(model);
    const qvel = data.qvel as Float64Array;
    qvel.set([0, 0, 0, 0.5, -0.3, 0.8]);
    const applied = data.xfrc_applied as Float64Array;

    for (let k = 0; k < 20_000; k++) {
      held = wrenchAt(k);
      applied.set([...held.force, ...held.torque], 6);
      mujoco.mj_step(model, data);
      rk.step(system, s, STEP_S);
    }
    const qpos = data.qpos as Float64Array;
    const attitude = Array.from(qpos.subarray(3, 7));
    expect(angleBetween(attitude, Array.from(s.subarray(ATTITUDE, ATTITUDE + 4)))).toBeLessThan(1e-6);
    for (let i = 0; i < 3; i++) {
      expect(Math.abs(qpos[i] - s[POSITION + i]), `position ${i}, m`).toBeLessThan(1e-6);
      expect(Math.abs((data.qvel as Float64Array)[3 + i] - s[RATES + i]), `rate ${i}`).toBeLessThan(1e-6);
    }
    expect(Number.isFinite(s[VELOCITY])).toBe(true);
  });
});
