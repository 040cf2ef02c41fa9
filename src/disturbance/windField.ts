/**
 * The air where the craft is: mean wind with height, wakes of the scene's solids, turbulence and gusts, summed
 * into one sample that holds over a step.
 *
 * What is slow (mean wind, wakes, turbulence) is renewed once a millisecond, or each step if that is longer;
 * gusts and the turn into body axes each step. Turbulence is sampled exactly for that tick, so its spectra and
 * variances are the standard's for any tick.
 *
 * Turbulence axes: x points level into the mean wind, the path through the air of a craft that holds its
 * place (MIL-F-8785C lays u along the horizontal relative mean wind). They do not follow a craft that flies
 * about: the flight path of a small craft turns about faster than the air it is in could, and near the
 * ground u and v differ by their form only (L_u = L_v, σ_u = σ_v). When the wind is changed in flight the axes
 * swing round at TURN_RATE.
 */
import type { Scene } from '../craft/scene.ts';
import type { Wind } from '../craft/wind.ts';
import { RAD_PER_DEG } from '../math/angles.ts';
import type { SnapshotReader, SnapshotWriter, Stateful } from '../math/snapshot.ts';
import { ATTITUDE, POSITION, VELOCITY } from '../physics/state.ts';
import {
  GUST_AIRSPEED,
  GUST_DOWN,
  GUST_EAST,
  GUST_NORTH,
  GUST_TIME,
  GustTrain,
  LEAST_AIRSPEED_MPS,
} from './gusts.ts';
import { meanSpeed } from './meanWind.ts';
import { Turbulence } from './turbulence.ts';
import { emptyLevels, heldHeight, levelsAt, type TurbulenceLevels } from './turbulenceLevels.ts';
import { Wakes } from './wakes.ts';

/** Air of one step; owned by its WindField and overwritten each step. */
export interface WindSample {
  /** Air velocity in world axes (north, east, down), the direction the air moves to, m/s. */
  north_mps: number;
  east_mps: number;
  down_mps: number;
  /** Turbulent rotation of the air, body axes, rad/s. */
  p_radps: number;
  q_radps: number;
  r_radps: number;
}

/** Slow parts are renewed this often, s; turbulence has nothing to say near 1 kHz. */
const TICK_S = 1e-3;
/** Filter coefficients are renewed when airspeed, height or eddy size moved by more than this share: the
 * spectrum is then never off by more than 0.2 dB. */
const COEFFICIENT_TOLERANCE = 0.02;
/** Airspeed above which a diverged craft meets turbulence no faster, m/s. */
const GREATEST_AIRSPEED_MPS = 1000;
/** Rate at which turbulence axes swing round to a new wind direction, rad/s. */
const TURN_RATE_RADPS = 1;

export class WindField implements Stateful {
  readonly sample: WindSample = {
    north_mps: 0,
    east_mps: 0,
    down_mps: 0,
    p_radps: 0,
    q_radps: 0,
    r_radps: 0,
  };
  private wind: Wind;
  private readonly scene: Scene;
  private readonly stepsPerTick: number;
  private readonly tick_s: number;
  private readonly gusts: GustTrain;
  private readonly turbulence: Turbulence;
  private readonly eddies: Turbulence;
  private readonly levels: TurbulenceLevels = emptyLevels();
  private readonly eddyLevels: TurbulenceLevels = {
    ...emptyLevels(),
    sigmaU_mps: 1,
    sigmaV_mps: 1,
    sigmaW_mps: 1,
  };
  private wakes: Wakes;
  /** Constants of the wind, none of them state. */
  private turbulent = false;
  private meanNorth = 0;
  private meanEast = 0;
  private axesTarget_rad = 0;
  private axesNorth = 1;
  private axesEast = 0;

  // State.
  private firstTick = true;
  private coefficientsStale = true;
  private stepsToTick = 0;
  private started = false;
  private eddiesStarted = false;
  /** Airspeed, height and eddy length that the coefficients belong to. */
  private coefficientAirspeed_mps = 0;
  private coefficientHeight_m = 0;
  private eddyAirspeed_mps = 0;
  private eddyLength_m = 0;
  private axes_rad: number;
  /** Where the craft is, scratch: north, east, height m, velocity m/s. */
  private readonly place = new Float64Array(6);
  /** Slow part of the air: velocity and rotation, world axes. */
  private readonly slow = new Float64Array(6);

  /**
   * @param options.step_s length of a step, above 0.
   * @param options.span_m distance between outer rotor tips, b of the standard, above 0.
   * @throws RangeError when step or span is not above 0.
   */
  constructor(options: { wind: Wind; scene: Scene; step_s: number; seed: number; span_m: number }) {
    const { wind, scene, step_s, seed, span_m } = options;
    if (!(step_s > 0 && span_m > 0 && Number.isFinite(step_s) && Number.isFinite(span_m))) {
      throw new RangeError(`step ${step_s} s and span ${span_m} m must be above 0`);
    }
    this.scene = scene;
    this.stepsPerTick = Math.max(1, Math.floor(TICK_S / step_s + 1e-9));
    this.tick_s = this.stepsPerTick * step_s;
    this.gusts = new GustTrain(step_s);
    this.turbulence = new Turbulence(this.tick_s, span_m, seed, 'turbulence');
    this.eddies = new Turbulence(this.tick_s, span_m, seed, 'wake');
    this.wind = wind;
    this.wakes = new Wakes(scene, wind.from_deg);
    this.takeUpWind();
    this.axes_rad = this.axesTarget_rad;
    this.pointAxes();
  }

  /**
   * Changes the wind in flight, from the next tick on. Filters keep their states and streams go on; levels of
   * turbulence are taken up smoothly; gusts that are in both winds go on.
   */
  setWind(wind: Wind): void {
    this.wind = wind;
    this.wakes = new Wakes(this.scene, wind.from_deg);
    this.takeUpWind();
  }

  private takeUpWind(): void {
    const { wind } = this;
    this.gusts.setGusts(wind.gusts);
    const { model, windAt20ft_mps, scale } = wind.turbulence;
    this.turbulent = model !== 'none' && windAt20ft_mps * (scale ?? 1) > 0;
    this.axesTarget_rad = wind.from_deg * RAD_PER_DEG;
    this.meanNorth = -Math.cos(this.axesTarget_rad);
    this.meanEast = -Math.sin(this.axesTarget_rad);
    this.coefficientsStale = true;
  }

  /**
   * The air for the step that begins at `time_s`, into `sample`.
   * @param state flight state: place, velocity and attitude are read from it
   */
  advance(time_s: number, state: Float64Array): void {
    const { place } = this;
    place[0] = state[POSITION];
    place[1] = state[POSITION + 1];
    place[2] = -state[POSITION + 2];
    place[3] = state[VELOCITY];
    place[4] = state[VELOCITY + 1];
    place[5] = state[VELOCITY + 2];
    this.gusts.air[GUST_TIME] = time_s;
    this.renew();
    this.turnIntoBody(state, ATTITUDE);
  }

  private renew(): void {
    if (this.stepsToTick === 0) {
      this.stepsToTick = this.stepsPerTick;
      this.tick();
    }
    this.stepsToTick--;
    this.gusts.advance();
    const { sample, slow } = this;
    const gusts = this.gusts.air;
    sample.north_mps = slow[0] + gusts[GUST_NORTH];
    sample.east_mps = slow[1] + gusts[GUST_EAST];
    sample.down_mps = slow[2] + gusts[GUST_DOWN];
  }

  /** Renews the slow part at `place`. */
  private tick(): void {
    const { slow, wakes, place } = this;
    const height_m = place[2];
    const free_mps = meanSpeed(this.wind, height_m);
    let local_mps = free_mps;
    if (!wakes.none) {
      wakes.at(place[0], place[1], height_m);
      local_mps *= wakes.windShare;
    }
    const north = place[3] - free_mps * this.meanNorth;
    const east = place[4] - free_mps * this.meanEast;
    const airspeed = Math.sqrt(north * north + east * east + place[5] * place[5]);
    // Written so that an airspeed that is not a number gives the greatest one.
    this.gusts.air[GUST_AIRSPEED] =
      airspeed < GREATEST_AIRSPEED_MPS ? Math.max(LEAST_AIRSPEED_MPS, airspeed) : GREATEST_AIRSPEED_MPS;
    slow[0] = local_mps * this.meanNorth;
    slow[1] = local_mps * this.meanEast;
    slow[2] = slow[3] = slow[4] = slow[5] = 0;
    if (this.axes_rad !== this.axesTarget_rad) this.swingAxes();
    this.addTurbulence(heldHeight(height_m));
    if (!wakes.none) this.addEddies(free_mps * wakes.turbulenceShare, wakes.eddyLength_m);
    this.firstTick = false;
  }

  private addTurbulence(height_m: number): void {
    const { turbulence } = this;
    if (!this.turbulent && turbulence.isStill()) return;
    const airspeed_mps = this.gusts.air[GUST_AIRSPEED];
    if (
      this.coefficientsStale ||
      differs(airspeed_mps, this.coefficientAirspeed_mps) ||
      differs(height_m, this.coefficientHeight_m)
    ) {
      this.coefficientAirspeed_mps = airspeed_mps;
      this.coefficientHeight_m = height_m;
      this.setCoefficients();
      this.coefficientsStale = false;
    }
    turbulence.step();
    this.addAir(turbulence.air, 1);
  }

  private setCoefficients(): void {
    const { model, windAt20ft_mps, scale } = this.wind.turbulence;
    const { turbulence, levels, coefficientAirspeed_mps } = this;
    // Turbulence that was switched off dies down in filters that need coefficients still; any model's do.
    const running = model === 'none' ? 'MIL-F-8785C' : model;
    const level_mps = this.turbulent ? windAt20ft_mps * (scale ?? 1) : 0;
    levelsAt(running, this.coefficientHeight_m, level_mps, levels);
    if (this.started) turbulence.set(levels, coefficientAirspeed_mps);
    else turbulence.start(levels, coefficientAirspeed_mps, this.firstTick);
    this.started = true;
  }

  /** Turbulence of the wakes, of unit intensity in its own filters; they rest while the craft is outside. */
  private addEddies(sigma_mps: number, length_m: number): void {
    if (sigma_mps === 0) return;
    const airspeed_mps = this.gusts.air[GUST_AIRSPEED];
    if (differs(airspeed_mps, this.eddyAirspeed_mps) || differs(length_m, this.eddyLength_m)) {
      this.eddyAirspeed_mps = airspeed_mps;
      this.eddyLength_m = length_m;
      this.setEddyCoefficients();
    }
    this.eddies.step();
    this.addAir(this.eddies.air, sigma_mps);
  }

  private setEddyCoefficients(): void {
    const { eddies, eddyLevels, eddyLength_m } = this;
    eddyLevels.lengthU_m = eddyLevels.lengthV_m = eddyLevels.lengthW_m = eddyLength_m;
    if (this.eddiesStarted) eddies.set(eddyLevels, this.eddyAirspeed_mps);
    else eddies.start(eddyLevels, this.eddyAirspeed_mps, true);
    this.eddiesStarted = true;
  }

  /** Adds air in turbulence axes to the slow part. */
  private addAir(air: Float64Array, factor: number): void {
    const { slow, axesNorth, axesEast } = this;
    slow[0] += factor * (air[0] * axesNorth - air[1] * axesEast);
    slow[1] += factor * (air[0] * axesEast + air[1] * axesNorth);
    slow[2] += factor * air[2];
    slow[3] += factor * (air[3] * axesNorth - air[4] * axesEast);
    slow[4] += factor * (air[3] * axesEast + air[4] * axesNorth);
    slow[5] += factor * air[5];
  }

  /** Slow rotation from world into body axes. */
  private turnIntoBody(q: Float64Array, at: number): void {
    const { sample, slow } = this;
    const vx = slow[3];
    const vy = slow[4];
    const vz = slow[5];
    if (vx === 0 && vy === 0 && vz === 0) {
      sample.p_radps = sample.q_radps = sample.r_radps = 0;
      return;
    }
    const w = q[at];
    const x = -q[at + 1];
    const y = -q[at + 2];
    const z = -q[at + 3];
    const tx = 2 * (y * vz - z * vy);
    const ty = 2 * (z * vx - x * vz);
    const tz = 2 * (x * vy - y * vx);
    sample.p_radps = vx + w * tx + (y * tz - z * ty);
    sample.q_radps = vy + w * ty + (z * tx - x * tz);
    sample.r_radps = vz + w * tz + (x * ty - y * tx);
  }

  /** Swings the axes toward the mean wind by the shorter way. */
  private swingAxes(): void {
    const turn = 2 * Math.PI;
    let away = (this.axesTarget_rad - this.axes_rad) % turn;
    if (away > Math.PI) away -= turn;
    else if (away < -Math.PI) away += turn;
    const most = TURN_RATE_RADPS * this.tick_s;
    if (Math.abs(away) <= most) this.axes_rad = this.axesTarget_rad;
    else this.axes_rad += away > 0 ? most : -most;
    this.pointAxes();
  }

  private pointAxes(): void {
    this.axesNorth = Math.cos(this.axes_rad);
    this.axesEast = Math.sin(this.axes_rad);
  }

  save(out: SnapshotWriter): void {
    const { sample } = this;
    out.put(this.stepsToTick);
    out.put(this.firstTick ? 1 : 0);
    out.put(this.coefficientsStale ? 1 : 0);
    out.put(this.started ? 1 : 0);
    out.put(this.eddiesStarted ? 1 : 0);
    out.put(this.coefficientAirspeed_mps);
    out.put(this.coefficientHeight_m);
    out.put(this.eddyAirspeed_mps);
    out.put(this.eddyLength_m);
    out.put(this.axes_rad);
    out.putAll(this.slow);
    out.put(sample.north_mps);
    out.put(sample.east_mps);
    out.put(sample.down_mps);
    out.put(sample.p_radps);
    out.put(sample.q_radps);
    out.put(sample.r_radps);
    this.gusts.save(out);
    this.turbulence.save(out);
    this.eddies.save(out);
  }

  /** Restores a state; the wind is not part of it: set it first if it was another one then. */
  load(from: SnapshotReader): void {
    const { sample } = this;
    this.stepsToTick = from.take();
    this.firstTick = from.take() === 1;
    this.coefficientsStale = from.take() === 1;
    this.started = from.take() === 1;
    this.eddiesStarted = from.take() === 1;
    this.coefficientAirspeed_mps = from.take();
    this.coefficientHeight_m = from.take();
    this.eddyAirspeed_mps = from.take();
    this.eddyLength_m = from.take();
    this.axes_rad = from.take();
    from.takeInto(this.slow);
    sample.north_mps = from.take();
    sample.east_mps = from.take();
    sample.down_mps = from.take();
    sample.p_radps = from.take();
    sample.q_radps = from.take();
    sample.r_radps = from.take();
    this.gusts.load(from);
    this.turbulence.load(from);
    this.eddies.load(from);
    this.pointAxes();
    if (this.started) this.setCoefficients();
    if (this.eddiesStarted) this.setEddyCoefficients();
  }
}

/** Whether a number moved by more than the tolerance, or is not a number. */
function differs(now: number, then: number): boolean {
  return Math.abs(now - then) > COEFFICIENT_TOLERANCE * Math.abs(then);
}
