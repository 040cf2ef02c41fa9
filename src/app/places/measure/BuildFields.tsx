/** The plain numbers of a build, each with its unit and its saved value. */
import type { Build } from '../../../craft/build.ts';
import { useStore } from '../../store/context.ts';
import { NumberField } from '../../widgets/NumberField.tsx';
import { forgetKnown } from './accept.ts';
import { RotorFields } from './RotorFields.tsx';
import { measureTexts as words } from './texts.ts';

type Group = keyof typeof words.groups;
interface Field {
  readonly path: readonly string[];
  readonly label: string;
  readonly unit: string;
  readonly min: number;
  readonly max: number;
}

const f = (path: string, label: string, unit: string, min: number, max: number): Field => ({
  path: path.split('.'),
  label,
  unit,
  min,
  max,
});

/** Fields whose measured uncertainty is kept with the craft, by the name of the quantity. */
const KNOWN_AS: Readonly<Record<string, string>> = {
  'airframe.mass_kg': 'all-up mass',
  'airframe.inertia_kgm2.xx': 'inertia roll',
  'airframe.inertia_kgm2.yy': 'inertia pitch',
  'airframe.inertia_kgm2.zz': 'inertia yaw',
  'propeller.thrustCoefficient': 'thrust coefficient',
  'propeller.powerCoefficient': 'power coefficient',
  'gyro.noise_dps_per_rtHz': 'gyro noise',
};

const FIELDS: Readonly<Record<Group, readonly Field[]>> = {
  airframe: [
    f('airframe.mass_kg', 'All-up mass', 'kg', 0.01, 150),
    f('airframe.inertia_kgm2.xx', 'Inertia roll', 'kg·m²', 1e-7, 500),
    f('airframe.inertia_kgm2.yy', 'Inertia pitch', 'kg·m²', 1e-7, 500),
    f('airframe.inertia_kgm2.zz', 'Inertia yaw', 'kg·m²', 1e-7, 500),
    f('airframe.centreOfMass_m.0', 'Centre of mass forward', 'm', -5, 5),
    f('airframe.centreOfMass_m.1', 'Centre of mass right', 'm', -5, 5),
    f('airframe.centreOfMass_m.2', 'Centre of mass down', 'm', -5, 5),
  ],
  propeller: [
    f('propeller.diameter_m', 'Diameter', 'm', 0.02, 5),
    f('propeller.thrustCoefficient', 'Thrust coefficient', '', 0.005, 0.5),
    f('propeller.powerCoefficient', 'Power coefficient', '', 0.001, 0.5),
    f('propeller.inertia_kgm2', 'Inertia with bell', 'kg·m²', 1e-9, 10),
  ],
  motor: [
    f('motor.kv_rpm_per_V', 'KV', 'rev/min/V', 1, 50_000),
    f('motor.resistance_ohm', 'Resistance', 'Ω', 1e-4, 50),
    f('motor.noLoadCurrent_A', 'No-load current', 'A', 0, 50),
    f('motor.lag_s', 'Lag up', 's', 0.001, 2),
    f('motor.lagDown_s', 'Lag down', 's', 0.001, 2),
    f('motor.maxSpeed_rpm', 'Top speed', 'rev/min', 1, 200_000),
  ],
  battery: [
    f('battery.cells', 'Cells', '', 1, 24),
    f('battery.capacity_Ah', 'Capacity', 'A·h', 0.01, 200),
    f('battery.resistance_ohm', 'Resistance, whole pack', 'Ω', 0, 10),
    f('battery.charge', 'Charge at take-off', '', 0, 1),
  ],
  esc: [
    f('esc.min_us', 'Command at rest', 'µs', 0, 5000),
    f('esc.idle_us', 'Command at idle', 'µs', 0, 5000),
    f('esc.max_us', 'Command at full', 'µs', 1, 5000),
    f('esc.update_Hz', 'Update rate', 'Hz', 25, 64_000),
  ],
  gyro: [
    f('gyro.noise_dps_per_rtHz', 'Noise density', 'deg/s/√Hz', 0, 10),
    f('gyro.bandwidth_Hz', 'Bandwidth (0 = none)', 'Hz', 0, 20_000),
    f('gyro.resolution_dps', 'Resolution', 'deg/s', 0, 10),
    f('gyro.delay_s', 'Delay', 's', 0, 0.05),
  ],
};

function read(build: Build, path: readonly string[]): number | null {
  let at: unknown = build;
  for (const key of path)
    at = typeof at === 'object' && at !== null ? (at as Record<string, unknown>)[key] : undefined;
  return typeof at === 'number' ? at : null;
}

function written(build: Build, path: readonly string[], value: number): Build {
  const copy = structuredClone(build) as unknown as Record<string, unknown>;
  let at = copy;
  for (const key of path.slice(0, -1)) at = at[key] as Record<string, unknown>;
  at[path[path.length - 1]] = value;
  return copy as unknown as Build;
}

export function BuildFields() {
  const store = useStore();
  const build = store.build.value;
  const saved = store.craft.value.savedBuild;
  return (
    <div class="measure-groups">
      {(Object.keys(FIELDS) as Group[]).map((group) => (
        <fieldset key={group} class="panel">
          <legend>{words.groups[group]}</legend>
          {FIELDS[group].map((field) => {
            const value = read(build, field.path);
            if (value === null) return null;
            const kept = read(saved, field.path);
            return (
              <NumberField
                key={field.label}
                label={field.label}
                value={value}
                {...(kept === null ? {} : { saved: kept })}
                unit={field.unit}
                min={field.min}
                max={field.max}
                noSlider
                onChange={(next) => {
                  const problem = store.setBuild((now) => written(now, field.path, next), field.label, {
                    quiet: true,
                  })[0];
                  const quantity = KNOWN_AS[field.path.join('.')];
                  if (problem === undefined && quantity !== undefined)
                    forgetKnown(store, quantity, field.label);
                  return problem === undefined ? null : `${problem.path}: ${problem.allowed}`;
                }}
              />
            );
          })}
        </fieldset>
      ))}
      <RotorFields key={store.craft.value.id} />
    </div>
  );
}
