/**
 * Continuous turbulence in turbulence axes (x along the horizontal flight path through the air, y to its right,
 * z down): three velocities and three rotations with the Dryden spectra of MIL-F-8785C 3.7 and the
 * same document's gust gradients, the span b being that of the rotor tips.
 *
 * Φ_u = σ_u² 2L_u/π · 1/(1 + (L_uΩ)²), Φ_v, Φ_w = σ² L/π · (1 + 3(LΩ)²)/(1 + (LΩ)²)²,
 * Φ_p = σ_w²/L_w · 0.8 (πL_w/4b)^⅓/(1 + (4bΩ/π)²), Φ_q = Ω²/(1 + (4bΩ/π)²) Φ_w, Φ_r = Ω²/(1 + (3bΩ/π)²) Φ_v
 * (MIL-HDBK-1797: 2L in place of L in all but Φ_u). Rotations are those of the air as a solid body,
 * q_g = −∂w/∂x, r_g = ∂v/∂x: they come out of the vertical and lateral gusts' own filters, as in the
 * standard, and p_g has its own noise.
 */
import { RandomStream } from '../math/random.ts';
import type { SnapshotReader, SnapshotWriter, Stateful } from '../math/snapshot.ts';
import { FirstOrderFilter, TransverseFilter } from './formingFilters.ts';
import type { TurbulenceLevels } from './turbulenceLevels.ts';

/** Time in which a new level of turbulence is taken up, so that a change of wind in flight is no jump. */
const LEVEL_GLIDE_S = 0.1;

const U = 0;
const V = 1;
const W = 2;
const P = 3;
const Q = 4;
const R = 5;

export class Turbulence implements Stateful {
  /** u, v, w in m/s and p, q, r in rad/s, turbulence axes, after the last `step`. */
  readonly air = new Float64Array(6);
  private readonly u: FirstOrderFilter;
  private readonly v: TransverseFilter;
  private readonly w: TransverseFilter;
  private readonly p: FirstOrderFilter;
  /** Physical size of each unit-variance output, now and where it glides to. */
  private readonly scale = new Float64Array(6);
  private readonly scaleTarget = new Float64Array(6);
  private readonly glide: number;
  private readonly longitudinalSpan_m: number;
  private readonly lateralSpan_m: number;

  /**
   * @param name first part of the streams' names, "turbulence" gives "turbulence.u", ….
   * @param span_m b of the standard, above 0.
   */
  constructor(
    private readonly step_s: number,
    span_m: number,
    seed: number,
    name: string,
  ) {
    this.u = new FirstOrderFilter(new RandomStream(seed, `${name}.u`));
    this.v = new TransverseFilter(new RandomStream(seed, `${name}.v`));
    this.w = new TransverseFilter(new RandomStream(seed, `${name}.w`));
    this.p = new FirstOrderFilter(new RandomStream(seed, `${name}.p`));
    this.glide = -Math.expm1(-step_s / LEVEL_GLIDE_S);
    this.longitudinalSpan_m = (4 * span_m) / Math.PI;
    this.lateralSpan_m = (3 * span_m) / Math.PI;
  }

  /**
   * Draws all states from their stationary distributions.
   * @param atOnce takes the levels up at once, else they are glided to from nothing.
   */
  start(levels: TurbulenceLevels, airspeed_mps: number, atOnce: boolean): void {
    const c = levels.transverseFactor;
    this.u.start();
    this.v.start(this.lateralSpan_m / (c * levels.lengthV_m));
    this.w.start(this.longitudinalSpan_m / (c * levels.lengthW_m));
    this.p.start();
    this.set(levels, airspeed_mps);
    if (atOnce) this.scale.set(this.scaleTarget);
  }

  /** Coefficients for `levels` at `airspeed_mps` > 0; states stay. */
  set(levels: TurbulenceLevels, airspeed_mps: number): void {
    const flown_m = airspeed_mps * this.step_s;
    const longitudinal = this.longitudinalSpan_m;
    const lateral = this.lateralSpan_m;
    const lengthV_m = levels.transverseFactor * levels.lengthV_m;
    const lengthW_m = levels.transverseFactor * levels.lengthW_m;
    this.u.set(flown_m / levels.lengthU_m);
    this.v.set(flown_m / lengthV_m, lateral / lengthV_m);
    this.w.set(flown_m / lengthW_m, longitudinal / lengthW_m);
    this.p.set(flown_m / longitudinal);
    const { scaleTarget } = this;
    scaleTarget[U] = levels.sigmaU_mps;
    scaleTarget[V] = levels.sigmaV_mps;
    scaleTarget[W] = levels.sigmaW_mps;
    // ∫Φ_p dΩ = σ²/L · 0.8 (πL/4b)^⅓ · (π/2)/(4b/π)
    scaleTarget[P] =
      levels.sigmaW_mps *
      Math.sqrt((0.4 * Math.PI * Math.cbrt(lengthW_m / longitudinal)) / (lengthW_m * longitudinal));
    scaleTarget[Q] = -levels.sigmaW_mps / Math.sqrt(lengthW_m * longitudinal);
    scaleTarget[R] = levels.sigmaV_mps / Math.sqrt(lengthV_m * lateral);
  }

  /** Whether nothing is left of it. */
  isStill(): boolean {
    return Math.abs(this.scale[U]) < 1e-6 && this.scaleTarget[U] === 0;
  }

  /** One step on. */
  step(): void {
    const { u, v, w, p, air, scale, scaleTarget, glide } = this;
    u.step();
    v.step();
    w.step();
    p.step();
    for (let i = 0; i < 6; i++) scale[i] += glide * (scaleTarget[i] - scale[i]);
    air[U] = scale[U] * u.value;
    air[V] = scale[V] * v.gust;
    air[W] = scale[W] * w.gust;
    air[P] = scale[P] * p.value;
    air[Q] = scale[Q] * w.scaledGradient;
    air[R] = scale[R] * v.scaledGradient;
  }

  save(out: SnapshotWriter): void {
    this.u.save(out);
    this.v.save(out);
    this.w.save(out);
    this.p.save(out);
    out.putAll(this.scale);
    out.putAll(this.air);
  }

  load(from: SnapshotReader): void {
    this.u.load(from);
    this.v.load(from);
    this.w.load(from);
    this.p.load(from);
    from.takeInto(this.scale);
    from.takeInto(this.air);
  }
}
