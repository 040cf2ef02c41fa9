/** The few complex operations that frequency responses need. */
export interface Complex {
  readonly re: number;
  readonly im: number;
}

export const complex = (re: number, im = 0): Complex => ({ re, im });
export const plus = (a: Complex, b: Complex): Complex => ({ re: a.re + b.re, im: a.im + b.im });
export const times = (a: Complex, b: Complex): Complex => ({
  re: a.re * b.re - a.im * b.im,
  im: a.re * b.im + a.im * b.re,
});
export const scaled = (a: Complex, s: number): Complex => ({ re: a.re * s, im: a.im * s });
/** Plain root: no value here comes near overflow, and hypot is many times slower. */
export const magnitude = (a: Complex): number => Math.sqrt(a.re * a.re + a.im * a.im);
export const argument = (a: Complex): number => Math.atan2(a.im, a.re);

export function over(a: Complex, b: Complex): Complex {
  const d = b.re * b.re + b.im * b.im;
  return { re: (a.re * b.re + a.im * b.im) / d, im: (a.im * b.re - a.re * b.im) / d };
}

/** e^{jθ}. */
export const unit = (theta: number): Complex => ({ re: Math.cos(theta), im: Math.sin(theta) });

/** Polynomial with real coefficients, highest power first, at `x`. */
export function polynomialAt(coefficients: readonly number[], x: Complex): Complex {
  let value = complex(0);
  for (const c of coefficients) value = plus(times(value, x), complex(c));
  return value;
}
