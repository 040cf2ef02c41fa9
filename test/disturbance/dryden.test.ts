import { readFileSync } from 'node:fs';
import { Matrix, solve } from 'ml-matrix';
import { describe, expect, test } from 'vitest';
import { OPEN_FIELD } from '../../src/craft/scene.ts';
import { parseWind, type Wind } from '../../src/craft/wind.ts';
import { ExactStep } from '../../src/disturbance/exactStep.ts';
import { transverseSystem } from '../../src/disturbance/formingFilters.ts';
import { Turbulence } from '../../src/disturbance/turbulence.ts';
import { emptyLevels, levelsAt, type TurbulenceLevels } from '../../src/disturbance/turbulenceLevels.ts';
import { WindField } from '../../src/disturbance/windField.ts';
import {
  COMPONENTS,
  Periodogram,
  bandEdges,
  decibels,
  integral,
  lengthOf,
  phi,
  type Component,
  type Document,
} from './spectra.ts';

const FOOT = 0.3048;
const KNOT = 1852 / 3600;
const DOCUMENTS: readonly Document[] = ['MIL-F-8785C', 'MIL-HDBK-1797'];
const SPAN_M = 0.7;

function levels(doc: Document, height_m: number, windAt20ft_mps: number): TurbulenceLevels {
  const out = emptyLevels();
  levelsAt(doc, height_m, windAt20ft_mps, out);
  return out;
}

function system(beta: number): { A: Float64Array; B: Float64Array } {
  const A = new Float64Array(9);
  const B = new Float64Array(3);
  transverseSystem(beta, A, B);
  return { A, B };
}

/** P = Φ P Φᵀ + N Nᵀ, solved as a linear system (Kronecker). */
function discreteStationary(transition: Float64Array, noise: Float64Array): number[] {
  const F = new Matrix([0, 3, 6].map((row) => [...transition.slice(row, row + 3)]));
  const N = new Matrix([0, 3, 6].map((row) => [...noise.slice(row, row + 3)]));
  const left = Matrix.sub(Matrix.eye(9), F.kroneckerProduct(F));
  return solve(left, Matrix.columnVector(N.mmul(N.transpose()).to1DArray())).to1DArray();
}

/** Closed form of the gradient's variance over β, partial fractions of (1/π)∫ν²(1+3ν²)/((1+ν²)²(1+β²ν²))dν. */
function gradientVariance(beta: number): number {
  const b2 = beta * beta;
  const c = (3 - b2) / (1 - b2) ** 2;
  return (3 - c) / b2 / 2 + 2 / (1 - b2) / 4 + c / (2 * beta);
}

describe('scale lengths and intensities', () => {
  // MIL-F-8785C 3.7.3.4 for W20 = 15 kn; lengths in feet, intensities in m/s, computed from the standard.
  test.each([
    [20, 143.6, 1.489],
    [50, 310.8, 1.419],
    [100, 505.2, 1.324],
  ])('at %d ft L_u = %d ft and σ_u = %d m/s, in both documents', (height_ft, lengthU_ft, sigmaU) => {
    for (const doc of DOCUMENTS) {
      const at = levels(doc, height_ft * FOOT, 15 * KNOT);
      const half = doc === 'MIL-HDBK-1797' ? 0.5 : 1;
      expect(at.lengthU_m / FOOT).toBeCloseTo(lengthU_ft, 1);
      expect(at.lengthV_m / FOOT).toBeCloseTo(half * at.lengthU_m * (1 / FOOT), 9);
      expect(at.lengthW_m / FOOT).toBeCloseTo(half * height_ft, 9);
      expect(at.sigmaU_mps).toBeCloseTo(sigmaU, 3);
      expect(at.sigmaV_mps).toBe(at.sigmaU_mps);
      expect(at.sigmaW_mps).toBeCloseTo(0.772, 3);
    }
  });

  test('below 10 ft the values of 10 ft hold, above 1000 ft the isotropic ones of 1000 ft', () => {
    for (const doc of DOCUMENTS) {
      expect(levels(doc, 0.2, 7)).toEqual(levels(doc, 10 * FOOT, 7));
      expect(levels(doc, -50, 7)).toEqual(levels(doc, 10 * FOOT, 7));
      expect(levels(doc, 1e6, 7)).toEqual(levels(doc, 1000 * FOOT, 7));
    }
    const top = levels('MIL-F-8785C', 1e6, 7);
    expect(top.lengthU_m).toBeCloseTo(1000 * FOOT, 9);
    expect(top.lengthW_m).toBeCloseTo(1000 * FOOT, 9);
    expect(top.sigmaU_mps).toBeCloseTo(top.sigmaW_mps, 12);
  });
});

describe('exact discretisation', () => {
  const fixture = JSON.parse(
    readFileSync(new URL('../reference/disturbance/transverse.json', import.meta.url), 'utf8'),
  ) as {
    cases: { beta: number; h: number; transition: number[]; covariance: number[]; stationary: number[] }[];
  };

  test.each(fixture.cases)(
    'agrees with SciPy (Van Loan, Lyapunov) at β = $beta, h = $h',
    ({ beta, h, transition, covariance, stationary }) => {
      const { A, B } = system(beta);
      const step = new ExactStep();
      step.set(A, B, h);
      transition.forEach((value, e) => expect(step.transition[e]).toBeCloseTo(value, 12));
      covariance.forEach((value, e) => expect(step.covariance[e]).toBeCloseTo(value, 12));
      step.setStationary(A, B);
      stationary.forEach((value, e) => expect(step.covariance[e]).toBeCloseTo(value, 12));
    },
  );

  test('the sampled filter keeps the closed-form stationary covariance to 1e-9 at any step', () => {
    for (const beta of [0.004, 0.03, 0.1, 0.4]) {
      for (const h of [1e-4, 1e-3, 0.01, 0.2, 3]) {
        const { A, B } = system(beta);
        const step = new ExactStep();
        step.set(A, B, h);
        const P = discreteStationary(step.transition, step.noise);
        const message = `β = ${beta}, h = ${h}`;
        // y'' + 2y' + y = w: var y = var y' = 1/4, uncorrelated; gust variance 1/4 + 3/4 = 1.
        expect(Math.abs(P[0] - 0.25), message).toBeLessThan(1e-9);
        expect(Math.abs(P[1]), message).toBeLessThan(1e-9);
        expect(Math.abs(P[4] - 0.25), message).toBeLessThan(1e-9);
        expect(Math.abs(P[8] - beta * gradientVariance(beta)), message).toBeLessThan(1e-9);
      }
    }
  });

  test('ten steps of 0.5 ms are one step of 5 ms', () => {
    const { A, B } = system(0.1);
    const [fine, coarse] = [new ExactStep(), new ExactStep()];
    fine.set(A, B, (7 * 0.0005) / 6);
    coarse.set(A, B, (7 * 0.005) / 6);
    const F = new Matrix([0, 3, 6].map((row) => [...fine.transition.slice(row, row + 3)]));
    const Q = new Matrix([0, 3, 6].map((row) => [...fine.covariance.slice(row, row + 3)]));
    let sum = Matrix.zeros(3, 3);
    for (let k = 0; k < 10; k++) sum = F.mmul(sum).mmul(F.transpose()).add(Q);
    const power = F.mmul(F).mmul(F).mmul(F).mmul(F).mmul(F).mmul(F).mmul(F).mmul(F).mmul(F).to1DArray();
    sum.to1DArray().forEach((value, e) => expect(coarse.covariance[e]).toBeCloseTo(value, 14));
    power.forEach((value, e) => expect(coarse.transition[e]).toBeCloseTo(value, 13));
  });

  test('sampled at 0.5 ms and at 5 ms the gust has the standard’s spectrum folded at that rate, without estimating it', () => {
    // Spectrum of C x for x ← Φx + Nn: Δt/π |C (e^{jωΔt} − Φ)⁻¹ N|² over ω; the standard's in units of L and V = 1.
    const beta = 0.1;
    const outputs: [C: number[], theory: (nu: number) => number][] = [
      [[1, Math.sqrt(3), 0], (nu) => (1 + 3 * nu * nu) / (1 + nu * nu) ** 2 / Math.PI],
      [
        [0, 0, 1 / Math.sqrt(beta)],
        (nu) =>
          ((nu * nu) / (1 + (beta * nu) ** 2)) * ((1 + 3 * nu * nu) / (1 + nu * nu) ** 2) * (1 / Math.PI),
      ],
    ];
    for (const step_s of [0.0005, 0.005]) {
      const h = (step_s * 7) / 6.096;
      const { A, B } = system(beta);
      const step = new ExactStep();
      step.set(A, B, h);
      for (let nu = 0.1; nu <= 10; nu *= 1.25) {
        for (const [C, theory] of outputs) {
          let folded = theory(nu);
          for (let image = 1; image <= 20_000; image++) {
            const turn = (2 * Math.PI * image) / h;
            folded += theory(turn - nu) + theory(turn + nu);
          }
          const ratio = (sampledSpectrum(step, C, nu * h) * h) / folded;
          expect(Math.abs(decibels(ratio)), `step ${step_s} s, ν = ${nu}`).toBeLessThan(0.001);
        }
      }
    }
  });
});

/** (1/π) |C (e^{jθ} − Φ)⁻¹ N|², one-sided, per radian of θ/Δt with Δt = 1. */
function sampledSpectrum(step: ExactStep, C: readonly number[], theta: number): number {
  const [c, s] = [Math.cos(theta), Math.sin(theta)];
  // Real form of the complex system: [cI − Φ, −sI; sI, cI − Φ] [re; im] = [N column; 0].
  const M = Matrix.zeros(6, 6);
  for (let i = 0; i < 3; i++) {
    for (let j = 0; j < 3; j++) {
      const value = (i === j ? c : 0) - step.transition[i * 3 + j];
      M.set(i, j, value);
      M.set(i + 3, j + 3, value);
    }
    M.set(i, i + 3, -s);
    M.set(i + 3, i, s);
  }
  let power = 0;
  for (let column = 0; column < 3; column++) {
    const right = [0, 1, 2].map((row) => step.noise[row * 3 + column]);
    const x = solve(M, Matrix.columnVector([...right, 0, 0, 0])).to1DArray();
    const re = C[0] * x[0] + C[1] * x[1] + C[2] * x[2];
    const im = C[0] * x[3] + C[1] * x[4] + C[2] * x[5];
    power += re * re + im * im;
  }
  return power / Math.PI;
}

function turbulentWind(model: Document, windAt20ft_mps: number, more: object = {}): Wind {
  return parseWind({ format: 'gustbench.wind/1', turbulence: { model, windAt20ft_mps }, ...more });
}

/**
 * One record of all six components by a WindField in still mean air, flown north at `airspeed_mps`: turbulence axes
 * are then those of the world, and of a level body.
 */
function fly(
  doc: Document,
  seed: number,
  airspeed_mps: number,
  height_m: number,
  steps: number,
  step_s: number,
): Record<Component, Float64Array> {
  const field = new WindField({
    wind: turbulentWind(doc, 15 * KNOT),
    scene: OPEN_FIELD,
    step_s,
    seed,
    span_m: SPAN_M,
  });
  const record = {} as Record<Component, Float64Array>;
  for (const component of COMPONENTS) record[component] = new Float64Array(steps);
  const state = new Float64Array([0, 0, -height_m, airspeed_mps, 0, 0, 1, 0, 0, 0]);
  const { sample } = field;
  for (let i = 0; i < steps; i++) {
    field.advance(i * step_s, state);
    record.u[i] = sample.north_mps;
    record.v[i] = sample.east_mps;
    record.w[i] = sample.down_mps;
    record.p[i] = sample.p_radps;
    record.q[i] = sample.q_radps;
    record.r[i] = sample.r_radps;
  }
  return record;
}

describe('turbulence as flown', () => {
  const height_m = 20 * FOOT;

  test.each(DOCUMENTS)(
    '%s: spectra of 10 seeds of more than 300 s are within 1 dB from 0.1 to 10 V/L, all six components',
    (doc) => {
      // Fast, so that even 0.1 V/L is seen often enough in 300 s for the estimate itself to be sure of 1 dB.
      const [airspeed, step_s, steps, perDecade, seeds] = [40, 0.001, 524_288, 2, 10];
      const at = levels(doc, height_m, 15 * KNOT);
      const periodogram = new Periodogram(steps, step_s);
      const sums = COMPONENTS.map(() => new Float64Array(2 * perDecade));
      for (let seed = 1; seed <= seeds; seed++) {
        const record = fly(doc, seed, airspeed, height_m, steps, step_s);
        COMPONENTS.forEach((component, i) => {
          const theory = (f: number): number =>
            ((2 * Math.PI) / airspeed) * phi(doc, component, at, SPAN_M, (2 * Math.PI * f) / airspeed);
          const edges = bandEdges(airspeed, lengthOf(component, at), perDecade);
          periodogram.addRatios(record[component], edges, theory, sums[i]);
        });
      }
      COMPONENTS.forEach((component, i) => {
        const off_dB = [...sums[i]].map((sum) => decibels(sum / seeds));
        for (const off of off_dB)
          expect(Math.abs(off), `${component}: ${off_dB.join(', ')} dB`).toBeLessThan(1);
      });
    },
  );

  test.each(DOCUMENTS)(
    '%s: at 25 m/s, bands of a third of a decade are within 0.6 dB and variances within 5 percent over 100 records',
    (doc) => {
      const [airspeed, step_s, steps, perDecade, seeds] = [25, 0.02, 16_384, 3, 100];
      const at = levels(doc, height_m, 15 * KNOT);
      const periodogram = new Periodogram(steps, step_s);
      const sums = COMPONENTS.map(() => new Float64Array(2 * perDecade));
      const squares = new Float64Array(6);
      for (let seed = 1; seed <= seeds; seed++) {
        const record = fly(doc, 1000 + seed, airspeed, height_m, steps, step_s);
        COMPONENTS.forEach((component, i) => {
          // Sampled at 20 ms the spectrum folds: the first pair of images is added to the theory.
          const density = (f: number): number =>
            ((2 * Math.PI) / airspeed) * phi(doc, component, at, SPAN_M, (2 * Math.PI * f) / airspeed);
          const folded = (f: number): number => {
            let sum = density(f);
            for (let image = 1; image <= 20; image++)
              sum += density(image / step_s - f) + density(image / step_s + f);
            return sum;
          };
          const edges = bandEdges(airspeed, lengthOf(component, at), perDecade);
          periodogram.addRatios(record[component], edges, folded, sums[i]);
          for (const value of record[component]) squares[i] += value * value;
        });
      }
      COMPONENTS.forEach((component, i) => {
        const off_dB = [...sums[i]].map((sum) => decibels(sum / seeds));
        for (const off of off_dB)
          expect(Math.abs(off), `${component}: ${off_dB.join(', ')} dB`).toBeLessThan(0.6);
        const variance = squares[i] / (seeds * steps);
        const expected = integral((omega) => phi(doc, component, at, SPAN_M, omega));
        expect(variance / expected, `${component}: variance over the standard's`).toBeGreaterThan(0.95);
        expect(variance / expected, `${component}: variance over the standard's`).toBeLessThan(1.05);
      });
    },
  );

  test('the first sample is already stationary: variance over 4000 seeds within 8 %', () => {
    const at = levels('MIL-F-8785C', height_m, 15 * KNOT);
    const squares = new Float64Array(6);
    const seeds = 4000;
    for (let seed = 1; seed <= seeds; seed++) {
      const record = fly('MIL-F-8785C', seed, 7, height_m, 1, 0.0005);
      COMPONENTS.forEach((component, i) => (squares[i] += record[component][0] ** 2));
    }
    COMPONENTS.forEach((component, i) => {
      const expected = integral((omega) => phi('MIL-F-8785C', component, at, SPAN_M, omega));
      expect(Math.abs(squares[i] / seeds / expected - 1), component).toBeLessThan(0.08);
    });
  });

  test('the handbook, with its own lengths and spectra, is the same air as the specification', () => {
    const a = fly('MIL-F-8785C', 5, 12, 30, 2000, 0.005);
    const b = fly('MIL-HDBK-1797', 5, 12, 30, 2000, 0.005);
    for (const component of COMPONENTS) {
      a[component].forEach((value, i) => expect(b[component][i]).toBeCloseTo(value, 9));
    }
    const [one, other] = DOCUMENTS.map((doc) => levels(doc, 30, 7));
    for (const omega of [1e-3, 0.02, 0.3, 4]) {
      for (const component of COMPONENTS) {
        const ratio =
          phi('MIL-F-8785C', component, one, SPAN_M, omega) /
          phi('MIL-HDBK-1797', component, other, SPAN_M, omega);
        expect(ratio, component).toBeCloseTo(1, 12);
      }
    }
  });

  test('q is minus the gradient of w along the path, r the gradient of v: slow changes over V', () => {
    // Over times long against b/V q = −(dw/dt)/V and r = (dv/dt)/V.
    const [step_s, airspeed] = [1e-4, 10];
    const turbulence = new Turbulence(step_s, 0.05, 3, 'turbulence');
    turbulence.start(levels('MIL-F-8785C', 60, 10), airspeed, true);
    turbulence.step();
    const [, v0, w0] = turbulence.air;
    let [sumQ, sumR] = [0, 0];
    for (let i = 0; i < 100_000; i++) {
      turbulence.step();
      sumQ += turbulence.air[4] * step_s;
      sumR += turbulence.air[5] * step_s;
    }
    const [fallQ, riseR] = [-(turbulence.air[2] - w0) / airspeed, (turbulence.air[1] - v0) / airspeed];
    expect(Math.abs(sumQ - fallQ)).toBeLessThan(0.15 * Math.abs(fallQ));
    expect(Math.abs(sumR - riseR)).toBeLessThan(0.15 * Math.abs(riseR));
  });
});
