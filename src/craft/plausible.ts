/**
 * Physical plausibility of a build: things each field may say alone but no real craft says together.
 * Every rule names the field to mend, the value found and the bound it broke.
 */
import { GRAVITY_MPS2, RPM_PER_RAD_PER_S } from '../math/angles.ts';
import type { Build } from './buildSchema.ts';
import { fullCellVoltage_V } from './cell.ts';
import { InputError, showValue, type Problem } from './problem.ts';
import { staticCoefficients, staticThrustAtSpeed_N } from './propellerTable.ts';

/** Thrust-to-weight below which nothing is left for control; common practice, no source. */
const LEAST_THRUST_TO_WEIGHT = 1.2;
const SEA_LEVEL_DENSITY = 1.225;

/** @throws InputError with every rule broken. */
export function checkPlausible(build: Build, file: string): void {
  const problems = [
    ...inertiaProblems(build),
    ...rotorProblems(build),
    ...propellerProblems(build),
    ...escProblems(build),
    ...payloadProblems(build),
  ];
  if (problems.length === 0) problems.push(...hoverProblems(build));
  if (problems.length > 0) throw new InputError(file, problems);
}

function problem(path: string, value: unknown, allowed: string): Problem {
  return { path, value: showValue(value), allowed };
}

/** Eigenvalues of a symmetric 3 × 3 tensor, ascending, by Smith's trigonometric form (CACM 4, 1961, 168). */
function principalMoments(xx: number, yy: number, zz: number, xy: number, xz: number, yz: number): number[] {
  const mean = (xx + yy + zz) / 3;
  const [a, b, c] = [xx - mean, yy - mean, zz - mean];
  const p = Math.sqrt((a * a + b * b + c * c + 2 * (xy * xy + xz * xz + yz * yz)) / 6);
  if (p === 0) return [mean, mean, mean];
  const determinant = a * (b * c - yz * yz) - xy * (xy * c - yz * xz) + xz * (xy * yz - b * xz);
  const angle = Math.acos(Math.max(-1, Math.min(1, determinant / (2 * p * p * p)))) / 3;
  const most = mean + 2 * p * Math.cos(angle);
  const least = mean + 2 * p * Math.cos(angle + (2 * Math.PI) / 3);
  return [least, 3 * mean - most - least, most];
}

function inertiaProblems(build: Build): Problem[] {
  const { xx, yy, zz, xy, xz, yz } = build.airframe.inertia_kgm2;
  const principal = principalMoments(xx, yy, zz, xy, xz, yz);
  const shown = principal.map((value) => Number(value.toPrecision(4)));
  if (principal[0] <= 0) {
    return [
      problem('airframe.inertia_kgm2', shown, 'a positive definite tensor (all principal moments above 0)'),
    ];
  }
  // A thin plate reaches equality; a little slack for rounding of measured values.
  if (principal[2] > (principal[0] + principal[1]) * (1 + 1e-6)) {
    return [
      problem(
        'airframe.inertia_kgm2',
        shown,
        'principal moments of which none exceeds the sum of the other two (triangle inequality of a real mass)',
      ),
    ];
  }
  const problems: Problem[] = [];
  const span = Math.max(...build.rotors.map((rotor) => Math.hypot(rotor.position_m[0], rotor.position_m[1])));
  const gyration_m = Math.sqrt(principal[2] / build.airframe.mass_kg);
  const reach_m = span + build.propeller.diameter_m / 2;
  if (gyration_m > reach_m) {
    problems.push(
      problem(
        'airframe.inertia_kgm2',
        shown,
        `a largest radius of gyration inside the craft, up to ${reach_m.toPrecision(3)} m (found ${gyration_m.toPrecision(3)} m)`,
      ),
    );
  }
  return problems;
}

function rotorProblems(build: Build): Problem[] {
  const problems: Problem[] = [];
  const corners = build.rotors.map((rotor) => rotor.corner);
  if (new Set(corners).size !== 4) {
    problems.push(problem('rotors', corners, 'the four corners FL, FR, RL, RR, each once'));
  }
  const com = build.airframe.centreOfMass_m;
  build.rotors.forEach((rotor, index) => {
    const x = rotor.position_m[0] - com[0];
    const y = rotor.position_m[1] - com[1];
    const front = rotor.corner.startsWith('F');
    const left = rotor.corner.endsWith('L');
    if (x > 0 !== front || y < 0 !== left || x === 0 || y === 0) {
      problems.push(
        problem(
          `rotors[${index}].position_m`,
          rotor.position_m,
          `a place ${front ? 'ahead of' : 'behind'} and ${left ? 'left of' : 'right of'} the centre of mass for corner ${rotor.corner} (x forward, y right)`,
        ),
      );
    }
  });
  const spinOf = (corner: string) => build.rotors.find((rotor) => rotor.corner === corner)?.spin;
  const diagonalsAgree = spinOf('FL') === spinOf('RR') && spinOf('FR') === spinOf('RL');
  if (problems.length === 0 && (!diagonalsAgree || spinOf('FL') === spinOf('FR'))) {
    problems.push(
      problem(
        'rotors',
        build.rotors.map((rotor) => `${rotor.corner} ${rotor.spin}`),
        'one spin on the diagonal FL-RR and the other on FR-RL, so that yaw can be controlled without roll or pitch',
      ),
    );
  }
  return [...problems, ...overlapProblems(build)];
}

function overlapProblems(build: Build): Problem[] {
  const problems: Problem[] = [];
  for (let a = 0; a < 4; a++) {
    for (let b = a + 1; b < 4; b++) {
      const [pa, pb] = [build.rotors[a].position_m, build.rotors[b].position_m];
      const distance_m = Math.hypot(pa[0] - pb[0], pa[1] - pb[1], pa[2] - pb[2]);
      if (distance_m < build.propeller.diameter_m * 0.5) {
        problems.push(
          problem(
            `rotors[${b}].position_m`,
            pb,
            `at least half a propeller diameter from rotors[${a}] (found ${distance_m.toPrecision(3)} m)`,
          ),
        );
      }
    }
  }
  return problems;
}

/** C_T^1.5·√(2/π)/C_P in propeller notation: the share of shaft power that ideal momentum theory needs. */
export function figureOfMerit(ct: number, cp: number): number {
  return (Math.pow(ct, 1.5) * Math.sqrt(2 / Math.PI)) / cp;
}

function propellerProblems(build: Build): Problem[] {
  const { thrustCoefficient, powerCoefficient, staticTable, advanceTable } = build.propeller;
  const problems: Problem[] = [];
  const merit = figureOfMerit(thrustCoefficient, powerCoefficient);
  if (merit >= 1) {
    problems.push(
      problem(
        'propeller.powerCoefficient',
        powerCoefficient,
        `above ${(powerCoefficient * merit).toPrecision(4)}, the ideal power for this thrustCoefficient (figure of merit below 1)`,
      ),
    );
  }
  staticTable?.forEach((row, index) => {
    if (index > 0 && row.rpm <= staticTable[index - 1].rpm) {
      problems.push(problem(`propeller.staticTable[${index}].rpm`, row.rpm, 'rising speeds, row by row'));
    }
    if (figureOfMerit(row.ct, row.cp) >= 1) {
      problems.push(
        problem(`propeller.staticTable[${index}].cp`, row.cp, 'above the ideal power for its ct'),
      );
    }
  });
  advanceTable?.forEach((row, index) => {
    if (index > 0 && row.j <= advanceTable[index - 1].j) {
      problems.push(
        problem(`propeller.advanceTable[${index}].j`, row.j, 'rising advance ratios, row by row'),
      );
    }
  });
  if (advanceTable !== undefined && advanceTable[0].ct <= 0) {
    problems.push(
      problem('propeller.advanceTable[0].ct', advanceTable[0].ct, 'above 0 at the lowest advance ratio'),
    );
  }
  return problems;
}

function escProblems(build: Build): Problem[] {
  const { min_us, max_us, idle_us } = build.esc;
  const problems: Problem[] = [];
  if (max_us <= min_us) {
    problems.push(problem('esc.max_us', max_us, `above esc.min_us, ${min_us} µs`));
  } else if (idle_us < min_us || idle_us >= max_us) {
    problems.push(
      problem('esc.idle_us', idle_us, `from esc.min_us, ${min_us} µs, to below esc.max_us, ${max_us} µs`),
    );
  }
  return problems;
}

function payloadProblems(build: Build): Problem[] {
  const payload = build.payload;
  if (payload === undefined || payload.mass_kg < build.airframe.mass_kg * 0.8) return [];
  return [
    problem(
      'payload.mass_kg',
      payload.mass_kg,
      `below 80 % of airframe.mass_kg, ${build.airframe.mass_kg} kg, which includes it`,
    ),
  ];
}

/** Highest steady rotor speed at full command and full battery, rad/s. */
export function topSpeed_radps(build: Build): number {
  const motor = build.motor;
  if ('maxSpeed_rpm' in motor) return motor.maxSpeed_rpm / RPM_PER_RAD_PER_S;
  const torqueConstant = 60 / (2 * Math.PI * motor.kv_rpm_per_V);
  const openVoltage_V = build.battery.cells * fullCellVoltage_V();
  const noLoad = openVoltage_V / torqueConstant;
  let low = 0;
  let high = noLoad;
  // Bisection on torque balance, all four motors drawing on the pack.
  for (let i = 0; i < 60; i++) {
    const speed = (low + high) / 2;
    const n = speed / (2 * Math.PI);
    const { cp } = staticCoefficients(build.propeller, speed);
    const load = (cp / (2 * Math.PI)) * SEA_LEVEL_DENSITY * n * n * Math.pow(build.propeller.diameter_m, 5);
    const current =
      (openVoltage_V - torqueConstant * speed) / (motor.resistance_ohm + 4 * build.battery.resistance_ohm);
    if (torqueConstant * (current - motor.noLoadCurrent_A) > load) low = speed;
    else high = speed;
  }
  return low;
}

function hoverProblems(build: Build): Problem[] {
  const weight_N = build.airframe.mass_kg * GRAVITY_MPS2;
  const top = topSpeed_radps(build);
  const thrust_N = 4 * staticThrustAtSpeed_N(build.propeller, top).thrust_N;
  const ratio = thrust_N / weight_N;
  if (!(ratio >= LEAST_THRUST_TO_WEIGHT)) {
    return [
      problem(
        'airframe.mass_kg',
        build.airframe.mass_kg,
        `at most ${(thrust_N / GRAVITY_MPS2 / LEAST_THRUST_TO_WEIGHT).toPrecision(3)} kg for these propellers, motors and battery (thrust-to-weight found ${ratio.toPrecision(3)}, least ${LEAST_THRUST_TO_WEIGHT})`,
      ),
    ];
  }
  const hoverShare = Math.sqrt(1 / ratio);
  const idleShare = (build.esc.idle_us - build.esc.min_us) / (build.esc.max_us - build.esc.min_us);
  if (hoverShare <= idleShare) {
    return [
      problem(
        'esc.idle_us',
        build.esc.idle_us,
        `below the hover command, about ${(build.esc.min_us + hoverShare * (build.esc.max_us - build.esc.min_us)).toFixed(0)} µs`,
      ),
    ];
  }
  return [];
}
