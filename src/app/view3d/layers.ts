/**
 * What lies over what. `renderOrder` of an object is its layer: flat things on the ground need no depth test
 * and never fight with each other; the canvas painter goes by the same numbers.
 */
import { CustomBlending, OneFactor, OneMinusSrcAlphaFactor } from 'three';

export const LAYER = {
  far: 0,
  ground: 1,
  water: 2,
  marking: 3,
  grid: 4,
  solid: 5,
  craft: 6,
  air: 7,
} as const;

/** Material settings of what is blended over the ground, yet drawn before the solids; the page never shows through. */
export const BLENDED_UNDER = {
  blending: CustomBlending,
  blendSrcAlpha: OneFactor,
  blendDstAlpha: OneMinusSrcAlphaFactor,
  depthWrite: false,
} as const;
