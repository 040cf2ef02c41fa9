/**
 * Moments of inertia from swing tests.
 *
 * Bifilar (two parallel wires of equal length, turning about the vertical): I = m g D² T²/(16 π² L), Jardin &
 * Mueller, AIAA 2007-6822. Compound pendulum (whole craft swinging about a pivot): I = m g d T²/(4 π²) − m d².
 * Where an amplitude is given its effect on the period is taken out, otherwise small angles are assumed.
 */
import { InputError, refuse, showValue } from '../craft/problem.ts';
import { median } from 'simple-statistics';
import {
  halfWidth95,
  loopGainSentence,
  percent,
  propagate,
  quantified,
  smallSampleFactor,
  stepSigma,
  type Contribution,
  type Estimate,
  type Input,
  type Quantified,
} from './estimate.ts';
import type { AxisName } from '../craft/gains.ts';
import type { BifilarTest, CompoundTest, SwingFile, SwingTest, SwingTools, Timing } from './swingFile.ts';

/** Spread of one hand-stopped timing, start and stop together; common practice, no source. */
const HAND_TIMING_S = 0.1;
/** A clock with a finer step than this is taken for a gate or a log, not a hand. */
const FINEST_HAND_STEP_S = 0.005;
/** A timing this far from the others, in swings, was counted wrongly. */
const MISCOUNT_SWINGS = 0.4;
const RAD = Math.PI / 180;

export interface TimingResidual extends Timing {
  readonly residual_s: number;
  /** Why the timing was left out of the fit; null when it was used. */
  readonly leftOut: string | null;
  readonly body: 'craft' | 'support';
}

export interface AxisSwing {
  readonly axis: AxisName;
  readonly method: SwingTest['method'];
  readonly inertia: Quantified;
  readonly period: Estimate;
  /** Part of the swinging inertia that was the support's, taken out. */
  readonly support_kgm2: number;
  /** Period at the stated amplitude over that at small angles. */
  readonly largeAngleFactor: number;
  /** Pivot to centre of mass, compound pendulum only. */
  readonly pivotDistance: Estimate | null;
  readonly contributions: readonly Contribution[];
  readonly timings: readonly TimingResidual[];
  readonly notes: readonly string[];
}

export interface SwingResult {
  readonly measurement: 'swing';
  readonly quantities: Partial<Record<'inertia_xx_kgm2' | 'inertia_yy_kgm2' | 'inertia_zz_kgm2', Quantified>>;
  /** As the build file takes them. */
  readonly inertia_kgm2: { readonly xx?: number; readonly yy?: number; readonly zz?: number };
  readonly tests: readonly AxisSwing[];
  readonly notes: readonly string[];
}

const MOMENT = { roll: 'inertia_xx_kgm2', pitch: 'inertia_yy_kgm2', yaw: 'inertia_zz_kgm2' } as const;

/**
 * Evaluates every test; several tests of one axis are joined, weighted by their uncertainty.
 * @throws InputError when a test's numbers cannot belong to a swinging body.
 */
export function analyseSwing(swing: SwingFile, file = 'swing'): SwingResult {
  const tests = swing.tests.map((test, i) =>
    test.method === 'bifilar'
      ? bifilarSwing(test, swing, `tests[${i}]`, file)
      : compoundSwing(test, swing, `tests[${i}]`, file),
  );
  return joinSwings(tests);
}

/** Joins tests from one or more files into one moment an axis. */
export function joinSwings(tests: readonly AxisSwing[]): SwingResult {
  const notes: string[] = [];
  const quantities: Partial<Record<(typeof MOMENT)[AxisName], Quantified>> = {};
  for (const axis of ['roll', 'pitch', 'yaw'] as const) {
    const own = tests.filter((test) => test.axis === axis);
    if (own.length === 0) continue;
    const joined = joinEstimates(own.map((test) => test.inertia));
    if (joined.disagreement > 2) {
      notes.push(
        `The ${own.length} tests of ${axis} disagree by more than their uncertainty (${joined.disagreement.toFixed(1)} times); sigma is widened to match. Look for a wire that slips or a miscounted swing.`,
      );
    }
    quantities[MOMENT[axis]] = quantified(
      joined,
      loopGainSentence(`The moment of inertia about ${axis}`, joined, axis),
    );
  }
  notes.push(...triangleNotes(quantities));
  notes.push(...tests.flatMap((test) => test.notes.map((note) => `${test.axis}: ${note}`)));
  const inertia_kgm2 = Object.fromEntries(
    Object.entries(quantities).map(([name, one]) => [name.split('_')[1], one.value]),
  );
  return { measurement: 'swing', quantities, inertia_kgm2, tests, notes };
}

/** Inverse-variance mean; sigma widened by the Birge ratio where the parts disagree. */
export function joinEstimates(parts: readonly Estimate[]): Estimate & { disagreement: number } {
  const [first] = parts;
  if (parts.length === 1) return { ...first, disagreement: 0 };
  const floor = Math.max(...parts.map((part) => Math.abs(part.value))) * 1e-9;
  const weights = parts.map((part) => 1 / Math.max(part.sigma, floor) ** 2);
  const total = weights.reduce((sum, weight) => sum + weight, 0);
  const value = parts.reduce((sum, part, i) => sum + weights[i] * part.value, 0) / total;
  const chi2 = parts.reduce((sum, part, i) => sum + weights[i] * (part.value - value) ** 2, 0);
  const birge = Math.sqrt(chi2 / (parts.length - 1));
  // Only a disagreement beyond chance widens, by as much as it takes and with the few tests counted.
  const widen = birge > 1.5 ? birge * smallSampleFactor(parts.length - 1) : 1;
  return { value, sigma: widen / Math.sqrt(total), unit: first.unit, disagreement: birge };
}

function triangleNotes(quantities: SwingResult['quantities']): string[] {
  const { inertia_xx_kgm2: x, inertia_yy_kgm2: y, inertia_zz_kgm2: z } = quantities;
  if (x === undefined || y === undefined || z === undefined) return [];
  const sorted = [x, y, z].sort((a, b) => a.value - b.value);
  const excess = sorted[2].value - sorted[0].value - sorted[1].value;
  if (excess <= 0) return [];
  return [
    `The largest moment exceeds the sum of the other two by ${excess.toPrecision(2)} kg·m², which no real mass does: one of the three is wrong.`,
  ];
}

interface Period {
  readonly value_s: number;
  readonly sigma_s: number;
  readonly residuals: readonly TimingResidual[];
  readonly notes: readonly string[];
}

/** Period from several timings, each with the same spread; weights are the numbers of swings squared. */
export function periodOf(
  timings: readonly Timing[],
  tools: SwingTools,
  body: TimingResidual['body'],
): Period {
  const middle = median(timings.map((one) => one.time_s / one.swings));
  const miscounted = timings.map(
    (one) => Math.abs(one.time_s - one.swings * middle) > MISCOUNT_SWINGS * middle,
  );
  const enough = timings.length >= 3 && miscounted.filter(Boolean).length * 3 <= timings.length;
  const used = timings.filter((_, i) => !(enough && miscounted[i]));
  const squares = used.reduce((sum, one) => sum + one.swings ** 2, 0);
  const value_s = used.reduce((sum, one) => sum + one.swings * one.time_s, 0) / squares;
  const notes: string[] = [];
  const degrees = used.length - 1;
  const byStep = stepSigma(tools.time_s) / Math.sqrt(squares);
  let sigma_s: number;
  if (degrees === 0) {
    const spread = tools.time_s < FINEST_HAND_STEP_S ? 0 : HAND_TIMING_S;
    sigma_s = Math.hypot(spread / Math.sqrt(squares), byStep);
    if (spread > 0) {
      notes.push(
        `One timing only (${body}): its spread is taken as ${spread} s, a hand on a stopwatch. Time it at least five times.`,
      );
    }
  } else {
    const chi2 = used.reduce((sum, one) => sum + (one.time_s - one.swings * value_s) ** 2, 0);
    const scatter = Math.sqrt(chi2 / degrees / squares);
    sigma_s = Math.hypot(scatter * smallSampleFactor(degrees), byStep);
  }
  const residuals = timings.map((one, i) => ({
    ...one,
    residual_s: one.time_s - one.swings * value_s,
    leftOut: enough && miscounted[i] ? 'swings miscounted' : null,
    body,
  }));
  if (used.length < timings.length) {
    notes.push(
      `${timings.length - used.length} timings lie about a whole swing from the others, counted wrongly; shown, not used.`,
    );
  }
  return { value_s, sigma_s, residuals, notes };
}

/** Root-mean-square-like amplitude, rad, of a swing that decays from start to end. */
function meanAmplitude(test: SwingTest): number {
  const start = (test.amplitude_deg ?? 0) * RAD;
  const end = (test.amplitudeEnd_deg ?? test.amplitude_deg ?? 0) * RAD;
  if (start === 0 || end <= 0 || start === end) return start;
  // The period's excess goes with the square, averaged over an exponential decay.
  return Math.sqrt((start ** 2 - end ** 2) / (2 * Math.log(start / end)));
}

const QUADRATURE_POINTS = 48;

/**
 * Period of a bifilar pendulum of inertia `inertia` at amplitude `amplitude` (rad), by its energy: the mass
 * rises by L − √(L² − D² sin²(θ/2)), and its rising is counted in the kinetic energy. Midpoint rule in
 * θ = θ₀ sin φ, where the integrand is smooth and periodic.
 */
function bifilarPeriod(
  inertia: number,
  mass: number,
  distance: number,
  length: number,
  amplitude: number,
  gravity: number,
): number {
  const height = (angle: number) => Math.sqrt(length ** 2 - (distance * Math.sin(angle / 2)) ** 2);
  const lowest = height(amplitude);
  let sum = 0;
  for (let i = 0; i < QUADRATURE_POINTS; i++) {
    const phi = ((i + 0.5) / QUADRATURE_POINTS) * (Math.PI / 2);
    const angle = amplitude * Math.sin(phi);
    const h = height(angle);
    const difference =
      (mass *
        gravity *
        distance ** 2 *
        Math.sin((amplitude + angle) / 2) *
        Math.sin((amplitude - angle) / 2)) /
      (h + lowest);
    const rise = (distance ** 2 * Math.sin(angle)) / (4 * h);
    sum += amplitude * Math.cos(phi) * Math.sqrt((inertia + mass * rise ** 2) / (2 * difference));
  }
  return 4 * sum * (Math.PI / 2 / QUADRATURE_POINTS);
}

/** Moment of inertia that swings with `period`; amplitude 0: the small-angle formula. */
export function bifilarInertia(
  period: number,
  mass: number,
  distance: number,
  length: number,
  amplitude: number,
  gravity: number,
): number {
  let inertia = (mass * gravity * distance ** 2 * period ** 2) / (16 * Math.PI ** 2 * length);
  if (amplitude === 0) return inertia;
  for (let i = 0; i < 8; i++) {
    inertia *= (period / bifilarPeriod(inertia, mass, distance, length, amplitude, gravity)) ** 2;
  }
  return inertia;
}

/** Small-angle period over the period at `amplitude` (rad) of a pendulum: arithmetic-geometric mean of 1, cos(θ₀/2). */
export function pendulumShortening(amplitude: number): number {
  let a = 1;
  let b = Math.cos(amplitude / 2);
  for (let i = 0; i < 8; i++) [a, b] = [(a + b) / 2, Math.sqrt(a * b)];
  return a;
}

const amplitudeInput = (amplitude: number): Input => ({
  name: 'amplitude',
  value: amplitude,
  // Read by eye against a protractor; common practice, no source.
  sigma: amplitude === 0 ? 0 : Math.max(1 * RAD, 0.1 * amplitude) / Math.sqrt(3),
});

function amplitudeNote(test: SwingTest): string[] {
  if (test.amplitude_deg !== undefined) return [];
  return [
    'No amplitude was given: small angles are assumed. Swinging through ±10° makes the inertia read 0.4 % too large, ±20° 1.5 %, ±30° 3.5 %.',
  ];
}

function bifilarSwing(test: BifilarTest, swing: SwingFile, path: string, file: string): AxisSwing {
  const { tools, gravity_mps2: g } = swing;
  const amplitude = meanAmplitude(test);
  if (test.wireDistance_m * Math.sin(Math.max(amplitude, 0) / 2) >= test.wireLength_m) {
    throw refuse(
      file,
      `${path}.wireLength_m`,
      test.wireLength_m,
      'long enough for the amplitude; use more than wireDistance_m',
    );
  }
  const whole = periodOf(test.timings, tools, 'craft');
  const held = test.support;
  const alone = held?.timings === undefined ? null : periodOf(held.timings, tools, 'support');
  const inputs: Input[] = [
    { name: 'mass', value: swing.mass_kg, sigma: stepSigma(tools.mass_kg) },
    { name: 'wire distance', value: test.wireDistance_m, sigma: stepSigma(tools.length_m) },
    { name: 'wire length', value: test.wireLength_m, sigma: stepSigma(tools.length_m) },
    { name: 'period', value: whole.value_s, sigma: whole.sigma_s },
    amplitudeInput(amplitude),
    { name: 'offset', value: test.offset_m, sigma: test.offset_m === 0 ? 0 : stepSigma(tools.length_m) },
    {
      name: 'support mass',
      value: held?.mass_kg ?? 0,
      sigma: held === undefined ? 0 : stepSigma(tools.mass_kg),
    },
    { name: 'support period', value: alone?.value_s ?? 0, sigma: alone?.sigma_s ?? 0 },
  ];
  const ofSupport = (mass: number, D: number, L: number, T: number): number =>
    alone !== null ? bifilarInertia(T, mass, D, L, 0, g) : (held?.inertia_kgm2 ?? 0);
  const result = propagate('kg·m²', inputs, ([m, D, L, T, angle, offset, mS, tS]) => {
    const total = bifilarInertia(T, m + mS, D, L, angle, g);
    return total - ofSupport(mS, D, L, tS) - m * offset ** 2;
  });
  const small = bifilarInertia(whole.value_s, swing.mass_kg, test.wireDistance_m, test.wireLength_m, 0, g);
  const exact = bifilarInertia(
    whole.value_s,
    swing.mass_kg,
    test.wireDistance_m,
    test.wireLength_m,
    amplitude,
    g,
  );
  const notes = [...whole.notes, ...(alone?.notes ?? []), ...amplitudeNote(test)];
  if (test.wireLength_m < 2 * test.wireDistance_m) {
    notes.push(
      'Wires shorter than twice their distance: a small error in hanging parallel matters; hang it longer.',
    );
  }
  return finish(test, result, whole, alone, {
    path,
    file,
    notes,
    support_kgm2: ofSupport(held?.mass_kg ?? 0, test.wireDistance_m, test.wireLength_m, alone?.value_s ?? 0),
    largeAngleFactor: Math.sqrt(small / exact),
    pivotDistance: null,
  });
}

function compoundSwing(test: CompoundTest, swing: SwingFile, path: string, file: string): AxisSwing {
  return test.suspensions === undefined
    ? knownDistanceSwing(test, swing, path, file)
    : twoLengthSwing(test, swing, path, file);
}

function knownDistanceSwing(test: CompoundTest, swing: SwingFile, path: string, file: string): AxisSwing {
  const { tools, gravity_mps2: g } = swing;
  const amplitude = meanAmplitude(test);
  const whole = periodOf(test.timings ?? [], tools, 'craft');
  const held = test.support;
  const alone = held?.timings === undefined ? null : periodOf(held.timings, tools, 'support');
  const distance = test.pivotDistance_m ?? 0;
  const inputs: Input[] = [
    { name: 'mass', value: swing.mass_kg, sigma: stepSigma(tools.mass_kg) },
    { name: 'pivot distance', value: distance, sigma: stepSigma(tools.length_m) },
    { name: 'period', value: whole.value_s, sigma: whole.sigma_s },
    amplitudeInput(amplitude),
    {
      name: 'support mass',
      value: held?.mass_kg ?? 0,
      sigma: held === undefined ? 0 : stepSigma(tools.mass_kg),
    },
    {
      name: 'support distance',
      value: held?.pivotDistance_m ?? 0,
      sigma: held?.pivotDistance_m === undefined ? 0 : stepSigma(tools.length_m),
    },
    { name: 'support period', value: alone?.value_s ?? 0, sigma: alone?.sigma_s ?? 0 },
  ];
  // The support's inertia about the pivot, measured alone, or its own plus the parallel-axis part.
  const ofSupport = (mass: number, d: number, T: number): number =>
    alone !== null ? (mass * g * d * T ** 2) / (4 * Math.PI ** 2) : (held?.inertia_kgm2 ?? 0) + mass * d ** 2;
  const result = propagate('kg·m²', inputs, ([m, d, T, angle, mS, dS, tS]) => {
    const smallT = T * pendulumShortening(angle);
    const total = ((m * d + mS * dS) * g * smallT ** 2) / (4 * Math.PI ** 2);
    return total - ofSupport(mS, dS, tS) - m * d ** 2;
  });
  const notes = [...whole.notes, ...(alone?.notes ?? []), ...amplitudeNote(test)];
  const carried = swing.mass_kg * distance ** 2;
  if (carried > 5 * Math.abs(result.value)) {
    notes.push(
      `Most of what swings is m d² (${carried.toPrecision(3)} kg·m²), not the inertia looked for; a shorter pivot or a bifilar test tells it better.`,
    );
  }
  return finish(test, result, whole, alone, {
    path,
    file,
    notes,
    support_kgm2: ofSupport(held?.mass_kg ?? 0, held?.pivotDistance_m ?? 0, alone?.value_s ?? 0),
    largeAngleFactor: 1 / pendulumShortening(amplitude),
    pivotDistance: { value: distance, sigma: stepSigma(tools.length_m), unit: 'm' },
  });
}

/**
 * Two lengths: with a = g T²/(4π²) and the second suspension longer by Δ,
 * a₁d = k² + d² and a₂(d+Δ) = k² + (d+Δ)², hence d = Δ(Δ − a₂)/(a₂ − a₁ − 2Δ) and I = m k².
 */
function twoLengthSwing(test: CompoundTest, swing: SwingFile, path: string, file: string): AxisSwing {
  const { tools, gravity_mps2: g } = swing;
  const [short, long] = [...(test.suspensions ?? [])].sort((a, b) => a.length_m - b.length_m);
  const first = periodOf(short.timings, tools, 'craft');
  const second = periodOf(long.timings, tools, 'craft');
  const amplitude = meanAmplitude(test);
  const inputs: Input[] = [
    { name: 'mass', value: swing.mass_kg, sigma: stepSigma(tools.mass_kg) },
    {
      name: 'length difference',
      value: long.length_m - short.length_m,
      sigma: Math.SQRT2 * stepSigma(tools.length_m),
    },
    { name: 'period, short', value: first.value_s, sigma: first.sigma_s },
    { name: 'period, long', value: second.value_s, sigma: second.sigma_s },
    amplitudeInput(amplitude),
  ];
  const solved = ([m, delta, t1, t2, angle]: readonly number[]) => {
    const shortening = pendulumShortening(angle);
    const a1 = (g * (t1 * shortening) ** 2) / (4 * Math.PI ** 2);
    const a2 = (g * (t2 * shortening) ** 2) / (4 * Math.PI ** 2);
    const d = (delta * (delta - a2)) / (a2 - a1 - 2 * delta);
    return { d, inertia: m * (a1 * d - d * d) };
  };
  const centre = solved(inputs.map((input) => input.value));
  if (!(centre.d > 0)) {
    throw refuse(
      file,
      `${path}.suspensions`,
      Number(centre.d.toPrecision(3)),
      'two periods that give a pivot above the centre of mass',
    );
  }
  const result = propagate('kg·m²', inputs, (values) => solved(values).inertia);
  const pivot = propagate('m', inputs, (values) => solved(values).d);
  const notes = [...first.notes, ...second.notes, ...amplitudeNote(test)];
  const joined = { ...first, residuals: [...first.residuals, ...second.residuals] };
  return finish(test, result, joined, null, {
    path,
    file,
    notes,
    support_kgm2: 0,
    largeAngleFactor: 1 / pendulumShortening(amplitude),
    pivotDistance: { value: pivot.value, sigma: pivot.sigma, unit: 'm' },
  });
}

interface Rest {
  readonly path: string;
  readonly file: string;
  readonly notes: string[];
  readonly support_kgm2: number;
  readonly largeAngleFactor: number;
  readonly pivotDistance: Estimate | null;
}

function finish(
  test: SwingTest,
  result: Estimate & { contributions: readonly Contribution[] },
  whole: Period,
  alone: Period | null,
  rest: Rest,
): AxisSwing {
  if (!(result.value > 0) || !Number.isFinite(result.value) || !Number.isFinite(result.sigma)) {
    throw new InputError(rest.file, [
      {
        path: rest.path,
        value: `an inertia of ${showValue(Number(result.value.toPrecision(3)))} kg·m²`,
        allowed:
          'masses, lengths and times that give an inertia above 0 (check the distances and the number of swings)',
      },
    ]);
  }
  const [largest] = result.contributions;
  const notes = [...rest.notes];
  if (largest !== undefined && halfWidth95(result) > 0.03) {
    notes.push(
      `Most of the ±${percent(halfWidth95(result))} comes from the ${largest.name} (${largest.share_pct.toFixed(0)} %).`,
    );
  }
  if (rest.support_kgm2 > result.value) {
    notes.push('The support has more inertia than the craft: a lighter cradle makes the result surer.');
  }
  return {
    axis: test.axis,
    method: test.method,
    inertia: quantified(
      result,
      loopGainSentence(`The moment of inertia about ${test.axis}`, result, test.axis),
    ),
    period: { value: whole.value_s, sigma: whole.sigma_s, unit: 's' },
    support_kgm2: rest.support_kgm2,
    largeAngleFactor: rest.largeAngleFactor,
    pivotDistance: rest.pivotDistance,
    contributions: result.contributions,
    timings: [...whole.residuals, ...(alone?.residuals ?? [])],
    notes,
  };
}
