/** Classical fourth-order Runge–Kutta step over one Float64Array, inputs held; nothing is allocated. */

export interface RateOfChange {
  /** Writes dS/dt of `s` into `d`. */
  derivative(s: Float64Array, d: Float64Array): void;
}

export class RungeKutta4 {
  private readonly k1: Float64Array;
  private readonly k2: Float64Array;
  private readonly k3: Float64Array;
  private readonly k4: Float64Array;
  private readonly stage: Float64Array;

  constructor(private readonly size: number) {
    this.k1 = new Float64Array(size);
    this.k2 = new Float64Array(size);
    this.k3 = new Float64Array(size);
    this.k4 = new Float64Array(size);
    this.stage = new Float64Array(size);
  }

  /** Moves `s` on by `h`. */
  step(system: RateOfChange, s: Float64Array, h: number): void {
    const { k1, k2, k3, k4, stage, size } = this;
    const half = h / 2;
    system.derivative(s, k1);
    for (let i = 0; i < size; i++) stage[i] = s[i] + half * k1[i];
    system.derivative(stage, k2);
    for (let i = 0; i < size; i++) stage[i] = s[i] + half * k2[i];
    system.derivative(stage, k3);
    for (let i = 0; i < size; i++) stage[i] = s[i] + h * k3[i];
    system.derivative(stage, k4);
    const sixth = h / 6;
    for (let i = 0; i < size; i++) s[i] += sixth * (k1[i] + 2 * (k2[i] + k3[i]) + k4[i]);
  }
}
