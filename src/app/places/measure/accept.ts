/** Taking a result into the build, and keeping with the craft how well each quantity is known. */
import { buildFromMeasurements, type Measurement } from '../../../measuring/buildFromMeasurements.ts';
import { halfWidth95 } from '../../../measuring/estimate.ts';
import type { SwingResult } from '../../../measuring/swing.ts';
import type { Store } from '../../store/store.ts';
import { keepKnown, knownNow, knownTo, type Known } from '../known.ts';
import { measureTexts } from './texts.ts';

const words = measureTexts.knownBy;
const INERTIAS = {
  'inertia roll': { axis: 'roll', key: 'inertia_xx_kgm2' },
  'inertia pitch': { axis: 'pitch', key: 'inertia_yy_kgm2' },
  'inertia yaw': { axis: 'yaw', key: 'inertia_zz_kgm2' },
} as const;
const INERTIA_NAMES = Object.keys(INERTIAS) as (keyof typeof INERTIAS)[];

/** @returns whether the build took it; a refusal stands in the notices. Build and sheet are one step of Undo. */
export function acceptResult(store: Store, result: Measurement, label: string): boolean {
  store.sealEdit();
  const problems = store.attempt({}, () => {
    const { build } = buildFromMeasurements(store.build.value, [result], label);
    const refused = store.setBuild(build, label);
    if (refused.length === 0) keepKnown(store, { ...knownNow(store), ...knownOf(result) }, label);
  });
  store.sealEdit();
  return problems.length === 0;
}

/** A quantity was typed in: what was known of its measured value no longer holds. */
export function forgetKnown(store: Store, quantity: string, label: string): void {
  const { [quantity]: gone, ...others } = knownNow(store);
  if (gone !== undefined) keepKnown(store, others, label);
}

/** "±2.1 % (bifilar swing, 5 timings)" by the name of the quantity. */
function knownOf(result: Measurement): Known {
  switch (result.measurement) {
    case 'swing':
      return knownOfSwing(result);
    case 'parts': {
      const inertias = INERTIA_NAMES.map((name) => [
        name,
        knownTo(result.quantities[INERTIAS[name].key], words.parts),
      ]);
      return { ...Object.fromEntries(inertias), 'all-up mass': knownTo(result.mass_kg, words.partsMass) };
    }
    case 'balance':
      return result.mass_kg === null ? {} : { 'all-up mass': words.scales };
    case 'stand': {
      const { thrustCoefficient, powerCoefficient } = result.quantities;
      const how = words.stand(result.residuals.length - result.outliers.length);
      return {
        ...(thrustCoefficient === undefined ? {} : { 'thrust coefficient': knownTo(thrustCoefficient, how) }),
        ...(powerCoefficient === undefined ? {} : { 'power coefficient': knownTo(powerCoefficient, how) }),
      };
    }
    case 'still': {
      const noises = Object.values(result.axes).map((axis) => axis.noise);
      if (noises.length === 0 || !(result.gyro.noise_dps_per_rtHz > 0)) return {};
      const widest = noises.reduce((a, b) => (halfWidth95(a) > halfWidth95(b) ? a : b));
      return { 'gyro noise': knownTo(widest, words.still(result.sampling.duration_s.toFixed(0))) };
    }
    case 'spinup':
      return {};
  }
}

function knownOfSwing(result: SwingResult): Known {
  return Object.fromEntries(
    INERTIA_NAMES.flatMap((name) => {
      const { axis, key } = INERTIAS[name];
      const estimate = result.quantities[key];
      const tests = result.tests.filter((test) => test.axis === axis);
      if (estimate === undefined || tests.length === 0) return [];
      const timings = tests.flatMap((test) =>
        test.timings.filter((one) => one.leftOut === null && one.body === 'craft'),
      );
      return [[name, knownTo(estimate, words.swing(tests[0].method, timings.length))]];
    }),
  );
}
