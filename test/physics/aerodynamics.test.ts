import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { compileCraft } from '../../src/craft/compile.ts';
import { parseBuild } from '../../src/craft/build.ts';
import { GRAVITY_MPS2 } from '../../src/math/angles.ts';
import { RungeKutta4 } from '../../src/math/integration.ts';
import { densityAltitude_m, siteAir, standardAir } from '../../src/physics/atmosphere.ts';
import { FlightDynamics } from '../../src/physics/dynamics.ts';
import {
  axialInflowRatio,
  FLOW_DENSITY,
  FLOW_DOWN_Z,
  FLOW_HEIGHT,
  FLOW_W,
  groundEffect,
  RotorSet,
} from '../../src/physics/rotor.ts';
import {
  ATTITUDE,
  CHARGE,
  INFLOW,
  POSITION,
  ROTOR_SPEED,
  STATE_SIZE,
  VELOCITY,
} from '../../src/physics/state.ts';
import { findTrim, HOVER } from '../../src/physics/trim.ts';
import { demoBuild, rawDemo, withAirframe } from './builds.ts';

const SEA_LEVEL = 1.225;

describe('standard atmosphere (ISO 2533:1975)', () => {
  it.each([
    [0, 288.15, 1.225],
    [500, 284.9, 1.16727],
    [1000, 281.65, 1.11164],
    [1500, 278.4, 1.05807],
    [2000, 275.15, 1.00649],
    [3000, 268.65, 0.90912],
    [4000, 262.15, 0.81913],
    [5000, 255.65, 0.73612],
  ])('at %d m has the table’s temperature and density', (altitude, temperature, density) => {
    const air = standardAir(altitude);
    expect(air.temperature_K).toBeCloseTo(temperature, 9);
    expect(air.density_kgpm3).toBeCloseTo(density, 5);
    expect(densityAltitude_m(air.density_kgpm3)).toBeCloseTo(altitude, 6);
  });

  it('takes the day’s temperature and pressure (ideal gas law)', () => {
    const hot = siteAir({ elevation_m: 1200, temperature_K: 308.15 });
    const standard = standardAir(1200);
    expect(hot.density_kgpm3 / standard.density_kgpm3).toBeCloseTo(standard.temperature_K / 308.15, 12);
  });
});

describe('body drag', () => {
  const craftWith = (area: [number, number, number]) => compileCraft(withAirframe({ dragArea_m2: area }));

  it('lets a falling craft approach terminal speed as tanh, closed form within 1e-6', () => {
    // Propellers held still (they would windmill), level, falling along body z: v = v_t tanh(g t/v_t), h = v_t²/g ln cosh(g t/v_t).
    const craft = craftWith([0, 0, 0.09]);
    const dynamics = new FlightDynamics(craft, SEA_LEVEL);
    dynamics.groundDown_m = Infinity;
    dynamics.stopped.fill(1);
    const terminal = Math.sqrt((2 * craft.mass_kg * GRAVITY_MPS2) / (SEA_LEVEL * 0.09));
    const s = new Float64Array(STATE_SIZE);
    s[ATTITUDE] = 1;
    const rk = new RungeKutta4(STATE_SIZE);
    for (let k = 1; k <= 10_000; k++) {
      dynamics.prepare(s);
      rk.step(dynamics, s, 0.0005);
      if (k % 2000 === 0) {
        const t = k * 0.0005;
        const speed = terminal * Math.tanh((GRAVITY_MPS2 * t) / terminal);
        const fallen = (terminal ** 2 / GRAVITY_MPS2) * Math.log(Math.cosh((GRAVITY_MPS2 * t) / terminal));
        expect(Math.abs(s[VELOCITY + 2] / speed - 1), `speed at ${t} s`).toBeLessThan(1e-6);
        expect(Math.abs(s[POSITION + 2] / fallen - 1), `fall at ${t} s`).toBeLessThan(1e-6);
      }
    }
  });
});

describe('rotor', () => {
  const craft = compileCraft(
    parseBuild({
      ...(rawDemo('sandpiper.build.json') as object),
      propeller: {
        diameter_m: 0.254,
        thrustCoefficient: 0.1165,
        powerCoefficient: 0.0475,
        inertia_kgm2: 4.2e-5,
      },
    }),
  );

  it('hovers at the induced speed √(T/2ρA) and the speed that C_T = T/(ρn²D⁴) asks for, within 1e-6', () => {
    const level = compileCraft(withAirframe({}));
    const trim = findTrim(level, { ...HOVER, density_kgpm3: SEA_LEVEL });
    const thrust = (level.mass_kg * GRAVITY_MPS2) / 4;
    const area = Math.PI * 0.127 ** 2;
    for (let i = 0; i < 4; i++) {
      expect(trim.state[INFLOW + i] / Math.sqrt(thrust / (2 * SEA_LEVEL * area))).toBeCloseTo(1, 8);
    }
    const constant = compileCraft(
      parseBuild({
        ...(rawDemo('sandpiper.build.json') as object),
        airframe: { ...withAirframe({}).airframe },
        propeller: {
          diameter_m: 0.254,
          thrustCoefficient: 0.1165,
          powerCoefficient: 0.0475,
          inertia_kgm2: 4.2e-5,
        },
      }),
    );
    const hover = findTrim(constant, { ...HOVER, density_kgpm3: SEA_LEVEL });
    const n = Math.sqrt(thrust / (0.1165 * SEA_LEVEL * 0.254 ** 4));
    expect(hover.state[ROTOR_SPEED] / (2 * Math.PI * n)).toBeCloseTo(1, 8);
    // Electrical balance: u V_b = K Ω + R (Q/K + i₀), K = 60/(2π KV).
    const K = 60 / (2 * Math.PI * 580);
    const torque = (0.0475 / (2 * Math.PI)) * SEA_LEVEL * n * n * 0.254 ** 5;
    const volts = K * 2 * Math.PI * n + 0.14 * (torque / K + 0.55);
    expect((hover.duty[0] * hover.voltage_V) / volts).toBeCloseTo(1, 8);
  });

  it('settles in axial climb to v_i = −V/2 + √(V²/4 + v_h²) (momentum theory) for its own thrust', () => {
    for (const climb of [0, 1, 3, 6]) {
      const rotors = new RotorSet();
      const s = new Float64Array(STATE_SIZE);
      s.fill(470, ROTOR_SPEED, ROTOR_SPEED + 4);
      rotors.flow[FLOW_W] = -climb;
      rotors.flow[FLOW_DENSITY] = SEA_LEVEL;
      rotors.flow[FLOW_HEIGHT] = 100;
      rotors.flow[FLOW_DOWN_Z] = 1;
      for (let k = 0; k < 4000; k++) {
        rotors.hold(craft.rotor, s);
        rotors.loads(craft.rotor, craft.rotorPosition_m, craft.spin, s);
        for (let i = 0; i < 4; i++) s[INFLOW + i] += 0.0005 * rotors.inflowRate_mps2[i];
      }
      const vh = Math.sqrt(rotors.thrust_N[0] / (2 * SEA_LEVEL * craft.rotor.discArea_m2));
      expect(s[INFLOW] / (vh * axialInflowRatio(climb / vh)), `climb ${climb} m/s`).toBeCloseTo(1, 8);
    }
  });

  it('follows the measured fall of C_T with J of a 10 × 4.7 propeller within 12 % without a table (UIUC kt0835, rd0841)', () => {
    // Rows of rd0841 at 6512 rev/min; static C_T 0.1299 and C_P 0.0531 of kt0835 at 6528 rev/min.
    const measured = [
      [0.089, 0.1201],
      [0.199, 0.1019],
      [0.308, 0.0833],
      [0.395, 0.0669],
    ];
    const uiuc = compileCraft(
      parseBuild({
        ...(rawDemo('sandpiper.build.json') as object),
        propeller: {
          diameter_m: 0.254,
          thrustCoefficient: 0.1299,
          powerCoefficient: 0.0531,
          inertia_kgm2: 4e-5,
        },
      }),
    );
    const n = 6512 / 60;
    for (const [j, ct] of measured) {
      const rotors = new RotorSet();
      const s = new Float64Array(STATE_SIZE);
      s.fill(2 * Math.PI * n, ROTOR_SPEED, ROTOR_SPEED + 4);
      rotors.flow[FLOW_W] = -j * n * 0.254;
      rotors.flow[FLOW_DENSITY] = SEA_LEVEL;
      rotors.flow[FLOW_HEIGHT] = 100;
      rotors.flow[FLOW_DOWN_Z] = 1;
      for (let k = 0; k < 4000; k++) {
        rotors.hold(uiuc.rotor, s);
        rotors.loads(uiuc.rotor, uiuc.rotorPosition_m, uiuc.spin, s);
        for (let i = 0; i < 4; i++) s[INFLOW + i] += 0.0005 * rotors.inflowRate_mps2[i];
      }
      const found = rotors.thrust_N[0] / (SEA_LEVEL * n * n * 0.254 ** 4);
      expect(Math.abs(found / ct - 1), `C_T at J = ${j}: ${found.toFixed(4)} for ${ct}`).toBeLessThan(0.12);
    }
  });

  it('takes a measured advance table exactly at its rows', () => {
    const table = [
      { j: 0, ct: 0.12, cp: 0.05 },
      { j: 0.2, ct: 0.1, cp: 0.048 },
      { j: 0.4, ct: 0.06, cp: 0.04 },
    ];
    const tabled = compileCraft(
      parseBuild({
        ...(rawDemo('sandpiper.build.json') as object),
        propeller: {
          diameter_m: 0.254,
          thrustCoefficient: 0.12,
          powerCoefficient: 0.05,
          inertia_kgm2: 4e-5,
          advanceTable: table,
        },
      }),
    );
    const n = 80;
    for (const row of table) {
      const rotors = new RotorSet();
      const s = new Float64Array(STATE_SIZE);
      s.fill(2 * Math.PI * n, ROTOR_SPEED, ROTOR_SPEED + 4);
      s.fill(5, INFLOW, INFLOW + 4);
      rotors.flow[FLOW_W] = -row.j * n * 0.254;
      rotors.flow[FLOW_DENSITY] = SEA_LEVEL;
      rotors.flow[FLOW_HEIGHT] = 100;
      rotors.flow[FLOW_DOWN_Z] = 1;
      rotors.hold(tabled.rotor, s);
      rotors.loads(tabled.rotor, tabled.rotorPosition_m, tabled.spin, s);
      expect(rotors.thrust_N[0] / (row.ct * SEA_LEVEL * n * n * 0.254 ** 4)).toBeCloseTo(1, 6);
      expect((rotors.torque_Nm[0] * 2 * Math.PI) / (row.cp * SEA_LEVEL * n * n * 0.254 ** 5)).toBeCloseTo(
        1,
        6,
      );
    }
  });

  it.each([
    [0.5, 1.33333],
    [1, 1.06667],
    [1.5, 1.02857],
    [2, 1.01587],
    [3, 1.00699],
  ])(
    'gains T/T∞ near the ground at z/R = %d as Cheeseman & Bennett (1955), bounded below half a radius',
    (z, ratio) => {
      expect(groundEffect(0.127, z * 0.127)).toBeCloseTo(ratio, 5);
      expect(Math.abs(groundEffect(0.127, z * 0.127) * (1 - (1 / (4 * z)) ** 2) - 1)).toBeLessThan(1e-12);
      expect(groundEffect(0.127, 0.01)).toBeCloseTo(4 / 3, 12);
    },
  );

  it('joins the branches of axial flow: hover 1, windmill boundary near 1 (Leishman eq. 2.96)', () => {
    expect(axialInflowRatio(0)).toBe(1);
    expect(axialInflowRatio(-2)).toBeCloseTo(1, 1);
    expect(axialInflowRatio(-2 - 1e-12)).toBeCloseTo(1, 5);
    fc.assert(
      fc.property(fc.double({ min: -6, max: 6, noNaN: true }), (x) => {
        const ratio = axialInflowRatio(x);
        return Number.isFinite(ratio) && ratio > 0 && ratio < 2.5;
      }),
    );
  });
});

describe('motor and battery', () => {
  it('has K_t = 60/(2π·KV): 0.013642 N·m/A for 700 rev/min per V (closed form)', () => {
    const build = demoBuild('sandpiper');
    const craft = compileCraft({
      ...build,
      motor: { kv_rpm_per_V: 700, resistance_ohm: 0.1, noLoadCurrent_A: 0.5 },
    });
    expect(craft.motor.torqueConstant).toBeCloseTo(0.013642, 6);
  });

  it('keeps the power balance: battery gives what motors take, with and without braking', () => {
    for (const braking of [true, false]) {
      const build = demoBuild('sandpiper');
      const craft = compileCraft({ ...build, esc: { ...build.esc, braking } });
      fc.assert(
        fc.property(
          fc.array(fc.double({ min: 0, max: 1, noNaN: true }), { minLength: 4, maxLength: 4 }),
          fc.array(fc.double({ min: 0, max: 850, noNaN: true }), { minLength: 4, maxLength: 4 }),
          (duty, speeds) => {
            const dynamics = new FlightDynamics(craft, SEA_LEVEL);
            const s = new Float64Array(STATE_SIZE);
            s[ATTITUDE] = 1;
            s[CHARGE] = 0.8;
            s.set(speeds, ROTOR_SPEED);
            dynamics.duty.set(duty);
            dynamics.prepare(s);
            dynamics.derivative(s, new Float64Array(STATE_SIZE));
            const V = dynamics.batteryVoltage_V;
            let sum = 0;
            for (let i = 0; i < 4; i++) {
              const current = dynamics.motorCurrent_A[i];
              if (!braking) expect(current).toBeGreaterThanOrEqual(-1e-9);
              sum += duty[i] * current;
              if (current !== 0) {
                const emf = craft.motor.torqueConstant * speeds[i];
                expect(current * craft.motor.resistance_ohm + emf).toBeCloseTo(duty[i] * V, 8);
              }
            }
            expect(dynamics.batteryCurrent_A).toBeCloseTo(sum, 8);
            expect(V + craft.batteryResistance_ohm * sum).toBeCloseTo(dynamics.openVoltage_V, 8);
          },
        ),
        { numRuns: 200 },
      );
    }
  });
});
