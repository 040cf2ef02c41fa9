/**
 * Wakes behind the solids of a scene: less wind and more turbulence downwind of each box that has a `wake`.
 *
 * The deficit of the wind behind the box's frontal projection is carried downwind and spread sideways and
 * upward by a constant eddy viscosity: the linearised wake equation U ∂u/∂x = ε ∂²u/∂y², which keeps the
 * deficit of momentum, gives flat sheltered air with smooth edges near the box and, far behind a tall box, the
 * self-similar plane wake: deficit ∝ x^−½, Gaussian across, width ∝ x^½ (Schlichting, Boundary-Layer Theory,
 * chapter on free turbulent flows, value from memory: ε = 0.0222 U C_D d). A top-hat of deficit δ and width d
 * carries the momentum of C_D = 2δ. The ground reflects. Beyond half the wake's `length_m` it fades to
 * nothing at the full length.
 */
import type { Scene } from '../craft/scene.ts';
import { RAD_PER_DEG } from '../math/angles.ts';

/** σ² grows by 2ε/U a metre, with ε = 0.0222 U · 2δ d. */
const SPREAD_PER_DEFICIT = 4 * 0.0222;
/** Thickness of the shear layer at the box, in wake widths (common practice, no source). */
const EDGE_THICKNESS = 0.1;
/** Size of the eddies in wake widths, the scale length of the added turbulence (common practice, no source). */
const EDDY_SIZE = 0.5;
/** Beyond this many σ outside its edge a wake is nothing: 3e-7. */
const REACH_SIGMA = 5;
/** A thing narrower than this casts no wake worth computing, m. */
const LEAST_WIDTH_M = 0.02;
const EDDY_LIMIT = 1e-6;

/** Offsets in one wake's block of constants. */
const NORTH = 0;
const EAST = 1;
const HALF_WIDTH = 2;
const HALF_DEPTH = 3;
const TOP = 4;
const BOTTOM = 5;
const DEFICIT = 6;
const SHARE = 7;
const LENGTH = 8;
const SPREAD = 9;
const EDGE_VARIANCE = 10;
const EDDY_LENGTH = 11;
const SIZE = 12;

export class Wakes {
  /** What is left of the mean wind, 0…1. */
  windShare = 1;
  /** Root mean square of the added turbulence over the undisturbed mean wind speed. */
  turbulenceShare = 0;
  /** Scale length of the added turbulence, m; holds its last value outside. */
  eddyLength_m = 1;
  private readonly blocks: Float64Array;
  private readonly downwindNorth: number;
  private readonly downwindEast: number;

  /** @param from_deg where the mean wind comes from. */
  constructor(scene: Scene, from_deg: number) {
    this.downwindNorth = -Math.cos(from_deg * RAD_PER_DEG);
    this.downwindEast = -Math.sin(from_deg * RAD_PER_DEG);
    const blocks: number[] = [];
    for (const solid of scene.solids) {
      if (solid.wake === undefined) continue;
      const [sizeX, sizeY, sizeZ] = solid.size_m;
      const turn = (solid.heading_deg - from_deg) * RAD_PER_DEG;
      const across = Math.abs(sizeX * Math.sin(turn)) + Math.abs(sizeY * Math.cos(turn));
      const along = Math.abs(sizeX * Math.cos(turn)) + Math.abs(sizeY * Math.sin(turn));
      const top = sizeZ / 2 - solid.centre_m[2];
      const bottom = Math.max(0, -sizeZ / 2 - solid.centre_m[2]);
      // The narrower extent rules the spreading; on the ground the height counts with its mirror image.
      const width = Math.min(across, bottom > 0 ? top - bottom : 2 * top);
      if (!(width > LEAST_WIDTH_M)) continue;
      const { deficit, turbulence_share, length_m } = solid.wake;
      blocks.push(solid.centre_m[0], solid.centre_m[1], across / 2, along / 2, top, bottom);
      blocks.push(deficit, turbulence_share, length_m);
      blocks.push(SPREAD_PER_DEFICIT * deficit * width, (EDGE_THICKNESS * width) ** 2, EDDY_SIZE * width);
    }
    this.blocks = Float64Array.from(blocks);
  }

  get none(): boolean {
    return this.blocks.length === 0;
  }

  /** Sets the fields for a place in the scene. Shares of several wakes: winds multiply, variances add. */
  at(north_m: number, east_m: number, height_m: number): void {
    const b = this.blocks;
    let windShare = 1;
    let variance = 0;
    let lengthSum = 0;
    for (let at = 0; at < b.length; at += SIZE) {
      const strength = this.strength(at, north_m, east_m, height_m);
      if (strength === 0) continue;
      windShare *= 1 - strength * b[at + DEFICIT];
      const share = strength * b[at + SHARE];
      variance += share * share;
      lengthSum += share * share * b[at + EDDY_LENGTH];
    }
    this.windShare = windShare;
    this.turbulenceShare = Math.sqrt(variance);
    if (this.turbulenceShare > EDDY_LIMIT) this.eddyLength_m = lengthSum / variance;
    else this.turbulenceShare = 0;
  }

  /** Strength of the wake at offset `at`: 1 in its core at the box, 0 outside. */
  private strength(at: number, north_m: number, east_m: number, height_m: number): number {
    const b = this.blocks;
    const dn = north_m - b[at + NORTH];
    const de = east_m - b[at + EAST];
    const behind = dn * this.downwindNorth + de * this.downwindEast - b[at + HALF_DEPTH];
    const length = b[at + LENGTH];
    const halfWidth = b[at + HALF_WIDTH];
    // It grows from nothing at the front of the box (or half its width ahead of its back, if it is thin).
    const onset = Math.max(2 * b[at + HALF_DEPTH], halfWidth);
    if (!(behind > -onset && behind < length)) return 0;
    const variance = b[at + EDGE_VARIANCE] + b[at + SPREAD] * Math.max(0, behind);
    const reach = REACH_SIGMA * Math.sqrt(variance);
    const aside = Math.abs(dn * this.downwindEast - de * this.downwindNorth);
    const top = b[at + TOP];
    const bottom = b[at + BOTTOM];
    if (!(aside < halfWidth + reach && height_m < top + reach && height_m > bottom - reach)) return 0;
    const per = 1 / Math.sqrt(2 * variance);
    const acrossShare = 0.5 * (erf((halfWidth - aside) * per) + erf((halfWidth + aside) * per));
    const heightShare =
      0.5 *
      (erf((top - height_m) * per) -
        erf((bottom - height_m) * per) +
        erf((top + height_m) * per) -
        erf((bottom + height_m) * per));
    const fade = 1 - smoothStep(2 * (behind / length) - 1);
    return smoothStep(1 + behind / onset) * fade * acrossShare * heightShare;
  }
}

function smoothStep(x: number): number {
  if (x <= 0) return 0;
  if (x >= 1) return 1;
  return x * x * (3 - 2 * x);
}

/** Error function, Abramowitz & Stegun 7.1.26, |error| ≤ 1.5e-7. */
function erf(x: number): number {
  const a = Math.abs(x);
  const t = 1 / (1 + 0.3275911 * a);
  const tail =
    t * (0.254829592 + t * (-0.284496736 + t * (1.421413741 + t * (-1.453152027 + t * 1.061405429))));
  const value = 1 - tail * Math.exp(-a * a);
  return x < 0 ? -value : value;
}
