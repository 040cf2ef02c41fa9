/**
 * Gyro (and accelerometer) recorded with the craft at rest, motors off or idling: sampling, noise density,
 * bias, resolution, drift, and the rotors' vibration lines.
 *
 * Density is one-sided: white noise sampled at f_s has σ = N √(f_s/2). Angle random walk, from the Allan
 * deviation at τ = 1 s (IEEE Std 952), is N/√2 of that density.
 */
import { refuse } from '../craft/problem.ts';
import { AXES, type AxisName } from '../craft/gains.ts';
import { allanDeviation, allanTerms, type AllanCurve } from './allan.ts';
import { columnInSI, proposeMapping, type ColumnKey, type ColumnMapping, type Table } from './columns.ts';
import { NORMAL_95, percent, quantified, type Estimate, type Quantified } from './estimate.ts';
import { recogniseHead } from './heads.ts';
import { extent, robustScale } from './regression.ts';
import { doubtRateUnit, resolutionOf, type RateUnitDoubt } from './resolution.ts';
import { timeBase, type TimeBase } from './sampling.ts';
import { fitNoise, powerSpectrum, segmentFor, type NoiseFit, type Spectrum } from './spectrum.ts';
import { estimateSpeed, findPeaks, matchOrders, type RotorSpeed, type VibrationPeak } from './vibration.ts';

const DEG = 180 / Math.PI;
const GRAVITY = 9.80665;
const LEAST_SAMPLES = 256;
/** Below this drift and flicker reach into the spectrum. */
const PLATEAU_FROM_HZ = 1;
/** A second this many times noisier than the usual one was a knock. */
const KNOCK = 4;

export interface StillOptions {
  readonly mapping?: ColumnMapping;
  /** Rotor speed while recording; absent: from a speed column, or estimated from the lines. */
  readonly speed_rpm?: number;
  readonly blades?: number;
  /** Rotors that turned; the line of one is the sum's over √rotors. */
  readonly rotorsTurning?: number;
}

export interface StillAxis {
  readonly axis: AxisName;
  /** deg/s per √Hz, one-sided (gyro); m/s² per √Hz (accelerometer). */
  readonly noise: Estimate;
  /** First-order bandwidth seen in the noise; 0: none below half the sampling rate. */
  readonly bandwidth_Hz: number;
  readonly bias: Estimate;
  readonly resolution: Estimate;
  readonly spectrum: { readonly frequency_Hz: Float64Array; readonly density: Float64Array };
  readonly allan: AllanCurve;
  readonly angleRandomWalk: Estimate | null;
  readonly biasInstability: (Estimate & { readonly reached: boolean }) | null;
  readonly rateRandomWalk: Estimate | null;
  readonly peaks: readonly VibrationPeak[];
  /** Once-per-turn amplitude of one rotor; null without a known speed. */
  readonly oncePerTurn: Estimate | null;
}

export interface StillResult {
  readonly measurement: 'still';
  readonly condition: 'rest' | 'turning';
  readonly quantities: Readonly<Record<string, Quantified>>;
  /** As the build file takes it; vibration at `rotor`'s speed. */
  readonly gyro: {
    readonly noise_dps_per_rtHz: number;
    readonly bandwidth_Hz: number;
    readonly resolution_dps: number;
    readonly bias_dps: readonly [number, number, number];
    readonly drift_dps_per_rts?: number;
    readonly vibration_dps?: readonly [number, number, number];
  };
  readonly accelerometer: {
    readonly noise_mps2_per_rtHz: number;
    readonly bandwidth_Hz: number;
    readonly resolution_mps2: number;
  } | null;
  readonly axes: Readonly<Partial<Record<AxisName, StillAxis>>>;
  readonly accelerometerAxes: Readonly<Partial<Record<AxisName, StillAxis>>>;
  readonly rotor: RotorSpeed | null;
  readonly sampling: {
    readonly rate_Hz: number;
    readonly jitter_s: number;
    readonly longest_s: number;
    readonly lost: number;
    readonly duration_s: number;
  };
  readonly unitDoubt: RateUnitDoubt | null;
  readonly notes: readonly string[];
}

/**
 * @throws InputError for missing columns, falling time, fewer than 256 samples, a gyro that shows no noise.
 */
export function analyseStill(table: Table, options: StillOptions = {}): StillResult {
  const mapping: ColumnMapping = { ...proposeMapping(table), ...options.mapping };
  const base = timeBase(table, mapping.time);
  const notes = [...table.notes, ...base.notes];
  const [from, to] = base.stretch;
  if (to - from < LEAST_SAMPLES) {
    throw refuse(
      table.file,
      '',
      `${to - from} samples without a gap`,
      `at least ${LEAST_SAMPLES}, better two minutes`,
    );
  }
  if (to - from < table.rows)
    notes.push(`Used: the longest stretch without a gap, rows ${from + 1} to ${to}.`);
  const raw = gyroColumns(table, mapping, base, notes);
  const segment = segmentFor(to - from, base.rate_Hz);
  const measured = raw.columns.map(([axis, values]) => ({ axis, ...noiseOf(values, base.rate_Hz, segment) }));
  const doubt =
    measured.length === 0
      ? null
      : doubtRateUnit(
          raw.unit,
          measured.map((one) => one.noise.density),
          measured[0].resolution.value,
        );
  const toDegrees = raw.unit === 'rad/s' ? DEG : 1;
  const blades = options.blades ?? 2;
  const peaks = new Map(measured.map((one) => [one.axis, findPeaks(one.spectrum, 4)]));
  const rotor =
    rotorOf(table, base, options) ?? estimatedRotor(measured, peaks, blades, base, segment, notes);
  const axes: Partial<Record<AxisName, StillAxis>> = {};
  const turning = options.rotorsTurning ?? 4;
  for (const one of measured) {
    const lines = matchOrders(peaks.get(one.axis) ?? [], rotor, blades, base.rate_Hz, base.rate_Hz / segment);
    axes[one.axis] = axisOf(one, base, toDegrees, 'deg/s', lines, rotor === null ? null : turning);
  }
  const accelerometerAxes = accelerations(table, mapping, base, segment, notes);
  notes.push(...stillNotes(measured, base, rotor, axes, doubt));
  return {
    measurement: 'still',
    condition: rotor === null ? 'rest' : 'turning',
    quantities: quantitiesOf(axes, base, accelerometerAxes),
    gyro: gyroOf(axes),
    accelerometer: accelerometerOf(accelerometerAxes),
    axes,
    accelerometerAxes,
    rotor,
    sampling: {
      rate_Hz: base.rate_Hz,
      jitter_s: base.jitter_s,
      longest_s: base.longest_s,
      lost: base.lost,
      duration_s: base.time_s[base.time_s.length - 1] - base.time_s[0],
    },
    unitDoubt: doubt,
    notes,
  };
}

interface Measured {
  readonly values: Float64Array;
  readonly spectrum: Spectrum;
  readonly noise: NoiseFit;
  readonly resolution: Estimate;
}

function noiseOf(values: Float64Array, rate_Hz: number, segment: number): Measured {
  const spectrum = powerSpectrum(values, rate_Hz, segment);
  const resolution = resolutionOf(values);
  return {
    values,
    spectrum,
    resolution,
    noise: fitNoise(spectrum, rate_Hz, PLATEAU_FROM_HZ, resolution.value),
  };
}

interface Raw {
  readonly unit: 'deg/s' | 'rad/s';
  /** Values in that unit over the longest stretch. */
  readonly columns: readonly (readonly [AxisName, Float64Array])[];
}

function gyroColumns(table: Table, mapping: ColumnMapping, base: TimeBase, notes: string[]): Raw {
  const keys: (readonly [AxisName, ColumnKey])[] = AXES.map((axis) => [axis, `gyro_${axis}`] as const);
  let found = keys.filter(([, key]) => mapping[key] !== undefined);
  if (found.length === 0 && mapping.gyro !== undefined) {
    found = [['roll', 'gyro']];
    notes.push(`"${mapping.gyro.column}" names no axis; it is shown as roll.`);
  }
  if (found.length === 0) {
    throw refuse(
      table.file,
      'gyro',
      undefined,
      `columns of body rates such as "gyro_x (deg/s)" or "p_rad/s" (found ${table.heads.join(', ')})`,
    );
  }
  const stated = mapping[found[0][1]]?.unit ?? null;
  const unit = stated !== null && /rad/.test(stated) ? 'rad/s' : 'deg/s';
  const columns = found.flatMap(([axis, key]): [AxisName, Float64Array][] => {
    const choice = mapping[key];
    if (choice === undefined) return [];
    const inSI = columnInSI(table, key, { ...choice, unit: choice.unit ?? 'deg/s' });
    const values = cut(table, inSI, base, choice.column);
    const scale = unit === 'deg/s' ? DEG : 1;
    const scaled = values.map((value) => value * scale);
    const [low, high] = extent(scaled);
    if (high - low === 0) {
      notes.push(`"${choice.column}" stands at ${low} throughout: not connected, or rounded away; left out.`);
      return [];
    }
    return [[axis, scaled]];
  });
  if (columns.length === 0) {
    throw refuse(
      table.file,
      `column ${mapping[found[0][1]]?.column ?? 'gyro'}`,
      'one value throughout',
      'a gyro that shows its noise',
    );
  }
  return stated === null ? settleUnit(columns, base, notes) : { unit, columns };
}

/** No unit in the head: the one that makes the noise usual. Values stand as written. */
function settleUnit(columns: Raw['columns'], base: TimeBase, notes: string[]): Raw {
  const segment = segmentFor(columns[0][1].length, base.rate_Hz);
  const measured = columns.map(([, values]) => noiseOf(values, base.rate_Hz, segment));
  const doubt = doubtRateUnit(
    'deg/s',
    measured.map((one) => one.noise.density),
    measured[0].resolution.value,
  );
  const unit = doubt === null ? 'deg/s' : 'rad/s';
  notes.push(
    `The gyro columns state no unit; they are read as ${unit}${doubt === null ? '' : `, because ${doubt.why}`}.`,
  );
  return { unit, columns };
}

/** The longest stretch of a column. @throws InputError for a gap or a value no sensor gives. */
function cut(table: Table, values: Float64Array, base: TimeBase, head: string): Float64Array {
  const [from, to] = base.stretch;
  for (let i = from; i < to; i++) {
    if (Number.isNaN(values[i])) {
      const odd = table.oddCells.find((cell) => cell.row === i + 1 && cell.head === head);
      throw refuse(table.file, `row ${i + 1}, ${head}`, odd?.text, 'a number');
    }
    if (Math.abs(values[i]) > 1e6)
      throw refuse(table.file, `row ${i + 1}, ${head}`, values[i], 'a value a sensor can give');
  }
  return values.subarray(from, to);
}

function rotorOf(table: Table, base: TimeBase, options: StillOptions): RotorSpeed | null {
  if (options.speed_rpm !== undefined) {
    return options.speed_rpm > 0
      ? { speed_Hz: options.speed_rpm / 60, spread_Hz: 0, estimated: false }
      : null;
  }
  const speeds: number[] = [];
  let spread = 0;
  table.heads.forEach((head, i) => {
    const found = table.texts[i] === null ? recogniseHead(head) : null;
    if (found?.quantity !== 'speed' || found.unit === null) return;
    const values = Array.from(
      table.columns[i].subarray(base.stretch[0], base.stretch[1]),
      (value) => (value * found.toSI) / (2 * Math.PI),
    );
    const mean = values.reduce((sum, value) => sum + value, 0) / values.length;
    if (!(mean > 1)) return;
    speeds.push(mean);
    spread = Math.max(spread, 2 * robustScale(values));
  });
  if (speeds.length === 0) return null;
  const [low, high] = extent(speeds);
  return {
    speed_Hz: speeds.reduce((sum, one) => sum + one, 0) / speeds.length,
    spread_Hz: spread + (high - low) / 2,
    estimated: false,
  };
}

/** Lines below this share of the noise's rms are mains hum or chance, not turning rotors. */
const LEAST_LINE_SHARE = 0.5;

function estimatedRotor(
  measured: readonly (Measured & { readonly axis: AxisName })[],
  peaks: ReadonlyMap<AxisName, readonly { frequency_Hz: number; amplitude: number }[]>,
  blades: number,
  base: TimeBase,
  segment: number,
  notes: string[],
): RotorSpeed | null {
  const strong = measured.flatMap((one) => {
    const rms = one.noise.density * Math.sqrt(base.rate_Hz / 2);
    return (peaks.get(one.axis) ?? []).filter((peak) => peak.amplitude > LEAST_LINE_SHARE * rms);
  });
  const rotor = estimateSpeed(strong, blades, base.rate_Hz, base.rate_Hz / segment);
  if (rotor !== null) {
    notes.push(
      `Rotor speed estimated from the lines: ${(60 * rotor.speed_Hz).toFixed(0)} rev/min. Give it if it is known.`,
    );
  }
  return rotor;
}

function axisOf(
  one: Measured & { readonly axis: AxisName },
  base: TimeBase,
  scale: number,
  unit: string,
  lines: readonly VibrationPeak[],
  turning: number | null,
): StillAxis {
  const { values, noise, spectrum } = one;
  const interval = 1 / base.rate_Hz;
  const scaled = scale === 1 ? values : values.map((value) => value * scale);
  const curve = allanDeviation(scaled, interval);
  // White noise shows only at averages longer than the bandwidth's memory.
  const terms = allanTerms(curve, noise.bandwidth_Hz === 0 ? 0 : 2 / (2 * Math.PI * noise.bandwidth_Hz));
  const duration = values.length * interval;
  const mean = scaled.reduce((sum, value) => sum + value, 0) / scaled.length;
  const density = noise.density * scale;
  const drift = terms?.rateRandomWalk ?? 0;
  return {
    axis: one.axis,
    noise: { value: density, sigma: noise.sigma * scale, unit: `${unit}/√Hz` },
    bandwidth_Hz: noise.bandwidth_Hz,
    bias: {
      value: mean,
      sigma: Math.hypot(density / Math.sqrt(2 * duration), drift * Math.sqrt(duration / 3)),
      unit,
    },
    resolution: { value: one.resolution.value * scale, sigma: one.resolution.sigma * scale, unit },
    spectrum: {
      frequency_Hz: spectrum.frequency_Hz,
      density: spectrum.density.map((value) => value * scale * scale),
    },
    allan: curve,
    angleRandomWalk:
      terms === null || terms.randomWalk === 0
        ? null
        : {
            value: terms.randomWalk,
            sigma: terms.randomWalkSigma,
            unit: unit === 'deg/s' ? 'deg/√s' : 'm/s/√s',
          },
    biasInstability:
      terms === null
        ? null
        : {
            value: terms.instability,
            sigma: terms.instabilitySigma,
            unit,
            reached: terms.instabilityReached,
          },
    rateRandomWalk:
      terms === null || terms.rateRandomWalk === null
        ? null
        : { value: terms.rateRandomWalk, sigma: terms.rateRandomWalkSigma, unit: `${unit}/√s` },
    peaks: lines.map((line) => ({ ...line, amplitude: line.amplitude * scale })),
    oncePerTurn: turning === null ? null : oncePerTurn(one, lines, scale, turning, duration, unit),
  };
}

/**
 * One rotor's line: the sum's power shared among the rotors. Noise of density N moves an amplitude by N/√T; a
 * line that wanders in speed or phase shows as much scatter as its spectrum has averages.
 */
function oncePerTurn(
  one: Measured,
  lines: readonly VibrationPeak[],
  scale: number,
  turning: number,
  duration_s: number,
  unit: string,
): Estimate {
  const square = lines.reduce((sum, line) => sum + (line.order === 1 ? line.amplitude ** 2 : 0), 0);
  const value = (scale * Math.sqrt(square)) / Math.sqrt(turning);
  const wander = value / (2 * Math.sqrt(one.spectrum.averages));
  const chance = (scale * one.noise.density) / Math.sqrt(duration_s * turning);
  return { value, sigma: Math.hypot(wander, chance), unit };
}

/** Accelerometer axes in m/s²; a head without a unit is read by the size of gravity. */
function accelerations(
  table: Table,
  mapping: ColumnMapping,
  base: TimeBase,
  segment: number,
  notes: string[],
): Partial<Record<AxisName, StillAxis>> {
  const axes: Partial<Record<AxisName, StillAxis>> = {};
  const found: [AxisName, Float64Array][] = [];
  for (const axis of AXES) {
    const choice = mapping[`acceleration_${axis}`];
    if (choice === undefined) continue;
    const inSI = columnInSI(table, `acceleration_${axis}`, { ...choice, unit: choice.unit ?? 'm/s²' });
    found.push([axis, cut(table, inSI, base, choice.column)]);
  }
  const size = Math.hypot(
    ...found.map(([, values]) => values.reduce((sum, value) => sum + value, 0) / values.length),
  );
  let scale = 1;
  if (found.length === 3) {
    const stated = mapping.acceleration_roll?.unit ?? null;
    if (Math.abs(size - 1) < 0.2) scale = GRAVITY;
    if (scale !== 1 || Math.abs(size / GRAVITY ** 2 - 1) < 0.2) {
      if (scale === 1) scale = 1 / GRAVITY;
      notes.push(
        `At rest the accelerometer reads ${size.toPrecision(3)} m/s² as ${stated ?? 'm/s² (no unit stated)'}: it is taken to be in ${scale > 1 ? 'g' : 'm/s²'}.`,
      );
    } else if (Math.abs(size / GRAVITY - 1) > 0.2) {
      notes.push(
        `At rest the accelerometer reads ${size.toPrecision(3)} m/s² instead of 9.81: wrong unit, or not at rest.`,
      );
    }
  }
  for (const [axis, values] of found) {
    const [low, high] = extent(values);
    if (high === low) continue;
    axes[axis] = axisOf({ axis, ...noiseOf(values, base.rate_Hz, segment) }, base, scale, 'm/s²', [], null);
  }
  return axes;
}

function stillNotes(
  measured: readonly (Measured & { readonly axis: AxisName })[],
  base: TimeBase,
  rotor: RotorSpeed | null,
  axes: StillResult['axes'],
  doubt: RateUnitDoubt | null,
): string[] {
  const notes: string[] = [];
  if (doubt !== null)
    notes.push(
      `The gyro's head says ${doubt.stated}, but ${doubt.why}. If it is ${doubt.likely}, give the column that unit.`,
    );
  const knocks = measured.flatMap((one) => knocksIn(one.values, base));
  if (knocks.length > 0) {
    notes.push(
      `The craft was moved or knocked, first at ${knocks[0].toFixed(1)} s: noise and bias are spoilt there; record it again.`,
    );
  }
  const duration = base.time_s[base.time_s.length - 1] - base.time_s[0];
  if (rotor === null && duration < 60)
    notes.push(
      `${duration.toFixed(0)} s are short for bias and drift: two minutes at rest are better, ten for drift.`,
    );
  for (const one of Object.values(axes)) {
    const sigma = one.noise.value * Math.sqrt(base.rate_Hz / 2);
    if (one.bandwidth_Hz === 0 && one.resolution.value > 2.5 * sigma) {
      notes.push(
        `${one.axis}: the steps of ${one.resolution.value.toPrecision(2)} ${one.resolution.unit} hide the noise; the density is a guess.`,
      );
    }
  }
  if (Object.values(axes).some((one) => one.peaks.some((peak) => peak.folded))) {
    notes.push(
      'Some lines lie above half the sampling rate and are seen folded down: no filter after sampling can tell them from motion.',
    );
  }
  const loose = Object.values(axes).flatMap((one) => one.peaks.filter((peak) => peak.order === null));
  if (rotor !== null && loose.length > 0) {
    notes.push(
      `The line at ${loose[0].frequency_Hz.toFixed(1)} Hz belongs to no rotor order: a resonance of frame or mount, or a rotor at another speed.`,
    );
  }
  return notes;
}

/** Times of seconds that are much noisier than the usual one. */
function knocksIn(values: Float64Array, base: TimeBase): number[] {
  const window = Math.max(16, Math.round(base.rate_Hz));
  const spreads: number[] = [];
  for (let start = 0; start + window <= values.length; start += window) {
    const part = values.subarray(start, start + window);
    const mean = part.reduce((sum, value) => sum + value, 0) / window;
    spreads.push(Math.sqrt(part.reduce((sum, value) => sum + (value - mean) ** 2, 0) / window));
  }
  if (spreads.length < 4) return [];
  const usual = [...spreads].sort((a, b) => a - b)[Math.floor(spreads.length / 2)];
  return spreads.flatMap((spread, i) =>
    spread > KNOCK * usual ? [base.time_s[base.stretch[0] + i * window]] : [],
  );
}

const across = (axes: StillResult['axes'], pick: (one: StillAxis) => number): number => {
  const values = Object.values(axes).map(pick);
  return values.length === 0
    ? 0
    : Math.sqrt(values.reduce((sum, value) => sum + value ** 2, 0) / values.length);
};

const triple = (axes: StillResult['axes'], pick: (one: StillAxis) => number): [number, number, number] => {
  const [x, y, z] = AXES.map((axis) => {
    const one = axes[axis];
    return one === undefined ? 0 : pick(one);
  });
  return [x, y, z];
};

function gyroOf(axes: StillResult['axes']): StillResult['gyro'] {
  const drifts = Object.values(axes).flatMap((one) =>
    one.rateRandomWalk === null ? [] : [one.rateRandomWalk.value],
  );
  const turning = Object.values(axes).some((one) => one.oncePerTurn !== null);
  return {
    noise_dps_per_rtHz: across(axes, (one) => one.noise.value),
    bandwidth_Hz: bandwidthOf(axes),
    resolution_dps: extent(Object.values(axes).map((one) => one.resolution.value))[1],
    bias_dps: triple(axes, (one) => one.bias.value),
    ...(drifts.length === 0
      ? {}
      : { drift_dps_per_rts: drifts.reduce((sum, one) => sum + one, 0) / drifts.length }),
    ...(turning ? { vibration_dps: triple(axes, (one) => one.oncePerTurn?.value ?? 0) } : {}),
  };
}

function bandwidthOf(axes: StillResult['axes']): number {
  const found = Object.values(axes).map((one) => one.bandwidth_Hz);
  return found.includes(0) ? 0 : across(axes, (one) => one.bandwidth_Hz);
}

function accelerometerOf(axes: StillResult['accelerometerAxes']): StillResult['accelerometer'] {
  if (Object.keys(axes).length === 0) return null;
  return {
    noise_mps2_per_rtHz: across(axes, (one) => one.noise.value),
    bandwidth_Hz: bandwidthOf(axes),
    resolution_mps2: extent(Object.values(axes).map((one) => one.resolution.value))[1],
  };
}

function quantitiesOf(
  axes: StillResult['axes'],
  base: TimeBase,
  accelerometerAxes: StillResult['accelerometerAxes'],
): Record<string, Quantified> {
  const out: Record<string, Quantified> = {};
  for (const [axis, one] of Object.entries(axes)) {
    out[`noise_${axis}_dps_per_rtHz`] = quantified(one.noise, noiseSentence(one, base.rate_Hz));
    out[`bias_${axis}_dps`] = quantified(
      one.bias,
      `Taken out by the zero at arming; what is left, ±${(NORMAL_95 * one.bias.sigma).toPrecision(2)} deg/s and its drift, turns the craft slowly and does not touch the gains.`,
    );
    if (one.angleRandomWalk !== null) {
      out[`angleRandomWalk_${axis}_deg_per_rts`] = quantified(
        one.angleRandomWalk,
        'Allan deviation at 1 s from white noise alone; the attitude of self-levelling wanders by it.',
      );
    }
    if (one.biasInstability?.reached === true) {
      out[`biasInstability_${axis}_dps`] = quantified(
        one.biasInstability,
        'Least of the Allan deviation over 0.664: the best that averaging can make of the bias.',
      );
    }
    if (one.rateRandomWalk !== null) {
      out[`drift_${axis}_dps_per_rts`] = quantified(
        one.rateRandomWalk,
        'Rate random walk: how fast the bias wanders; it bears on self-levelling, not on the rate gains.',
      );
    }
    if (one.oncePerTurn !== null) {
      out[`vibration_${axis}_dps`] = quantified(
        one.oncePerTurn,
        'One rotor’s once-per-turn line at the recorded speed; it grows with the square of speed. It passes through P and, times its frequency, through D to the motors.',
      );
    }
  }
  const resolution = extent(Object.values(axes).map((one) => one.resolution.value))[1];
  out.resolution_dps = quantified(
    {
      value: resolution,
      sigma: extent(Object.values(axes).map((one) => one.resolution.sigma))[1],
      unit: 'deg/s',
    },
    `Smallest step of the record; at ${base.rate_Hz.toFixed(0)} Hz one step is ${(resolution * base.rate_Hz).toPrecision(3)} deg/s² to a derivative without low-pass.`,
  );
  out.samplingRate_Hz = quantified(
    {
      value: base.rate_Hz,
      sigma: (base.jitter_s * base.rate_Hz ** 2) / Math.sqrt(base.time_s.length),
      unit: 'Hz',
    },
    `Intervals scatter by ${(1e6 * base.jitter_s).toFixed(0)} µs (${percent(base.jitter_s * base.rate_Hz)}).`,
  );
  for (const [axis, one] of Object.entries(accelerometerAxes)) {
    out[`accelerometerNoise_${axis}_mps2_per_rtHz`] = quantified(
      one.noise,
      'Only self-levelling uses it; the rate gains do not.',
    );
  }
  return out;
}

/** Backward difference of white noise σ at f_s has rms √2 σ f_s. */
function noiseSentence(one: StillAxis, rate_Hz: number): string {
  const sigma =
    one.bandwidth_Hz === 0
      ? one.noise.value * Math.sqrt(rate_Hz / 2)
      : one.noise.value * Math.sqrt((Math.PI / 2) * one.bandwidth_Hz);
  const alike = one.bandwidth_Hz === 0 ? 0 : Math.exp((-2 * Math.PI * one.bandwidth_Hz) / rate_Hz);
  const derivative = sigma * Math.sqrt(2 * (1 - alike)) * rate_Hz;
  return (
    `Known to ±${percent((NORMAL_95 * one.noise.sigma) / one.noise.value)} (95 %), ${sigma.toPrecision(2)} deg/s rms at ${rate_Hz.toFixed(0)} Hz: ` +
    `each 0.01 µs per deg/s² of derivative gain shakes the motors by ${(0.01 * derivative).toPrecision(2)} µs rms without a low-pass.`
  );
}

/**
 * Noise, bias and resolution from the record at rest, vibration from the one with rotors turning.
 * @param results at least one, in any order
 */
export function joinStill(results: readonly StillResult[]): StillResult {
  const rest = results.find((one) => one.condition === 'rest') ?? results[0];
  const turning = results.find((one) => one.condition === 'turning');
  if (turning === undefined || turning === rest) return rest;
  const vibration = Object.entries(turning.quantities).filter(([name]) => name.startsWith('vibration_'));
  return {
    ...rest,
    condition: 'turning',
    quantities: { ...rest.quantities, ...Object.fromEntries(vibration) },
    gyro: {
      ...rest.gyro,
      ...(turning.gyro.vibration_dps === undefined ? {} : { vibration_dps: turning.gyro.vibration_dps }),
    },
    rotor: turning.rotor,
    notes: results.flatMap((one) => one.notes),
  };
}
