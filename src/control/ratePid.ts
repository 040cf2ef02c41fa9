/**
 * Rate PID of one axis in discrete form, once a tick T:
 *
 *   e_k = sp_k − y_k
 *   u_k = p·(b·sp_k − y_k) + I_k + D_k + ff·sp_k,  limited to ± outputLimit
 *   I_k = I_{k−1} + i·(T/2)·(e_k + e_{k−1}),       limited to ± integralLimit
 *   D_k = LP[ d·(x_k − x_{k−1})/T ],               x = −y (derivative of measurement) or e
 *
 * y is the gyro after its low-pass and notches. Anti-windup (Åström & Hägglund, PID Controllers, ch. 3):
 * clamping holds the integral while the axis is saturated and e would drive it further; back-calculation
 * bleeds it by what the limit took, with tracking time √(T_i·T_d) or T_i.
 */
import type { AxisGains, AxisName, Gains } from '../craft/gains.ts';
import type { SnapshotReader, SnapshotWriter, Stateful } from '../math/snapshot.ts';
import { biquadNotch, FilterChain, lowPass, type BiquadCoefficients } from './filters.ts';

export class RatePid implements Stateful {
  /** Terms of the last tick, µs; rate after the gyro filters, deg/s. */
  p_us = 0;
  i_us = 0;
  d_us = 0;
  ff_us = 0;
  output_us = 0;
  filteredRate_dps = 0;
  /** 1 when the output limit acted in the last tick. */
  limited = 0;

  private gains: AxisGains;
  private lastError = 0;
  private lastDerivativeInput = 0;
  private fresh = true;
  private readonly gyroFilters: FilterChain;
  private readonly derivativeFilter: FilterChain;
  private tick_s: number;
  private tracking_s = 0;

  constructor(
    private all: Gains,
    private readonly axis: AxisName,
  ) {
    this.gains = all.axes[axis];
    this.tick_s = 1 / all.loop_Hz;
    this.gyroFilters = new FilterChain(gyroFilters(all));
    this.derivativeFilter = new FilterChain(derivativeFilters(all));
    this.tracking_s = trackingTime_s(this.gains);
  }

  /** New gains in flight; the integral and the filters' memories go on. */
  setGains(all: Gains): void {
    this.all = all;
    this.gains = all.axes[this.axis];
    this.tick_s = 1 / all.loop_Hz;
    this.gyroFilters.retune(gyroFilters(all), this.filteredRate_dps);
    this.derivativeFilter.retune(derivativeFilters(all), 0);
    this.tracking_s = trackingTime_s(this.gains);
  }

  /** Empties the integral and forgets the last samples: before arming. */
  reset(rate_dps: number): void {
    this.i_us = 0;
    this.lastError = 0;
    this.fresh = true;
    this.gyroFilters.settle(rate_dps);
    this.derivativeFilter.settle(0);
  }

  /**
   * One tick.
   * @param holdIntegral the integral is held at zero (low throttle)
   * @param windupSign −1, 0 or 1: direction in which the mixer could not follow in the last tick
   * @returns axis command, µs
   */
  update(setpoint_dps: number, gyro_dps: number, holdIntegral: boolean, windupSign: number): number {
    const { gains, all, tick_s } = this;
    const y = this.gyroFilters.next(gyro_dps);
    this.filteredRate_dps = y;
    const error = setpoint_dps - y;
    const derivativeInput = all.derivativeOn === 'error' ? error : -y;
    if (this.fresh) {
      this.lastError = error;
      this.lastDerivativeInput = derivativeInput;
      this.fresh = false;
    }
    this.p_us = gains.p_us_per_dps * ((gains.setpointWeight ?? 1) * setpoint_dps - y);
    this.d_us = this.derivativeFilter.next(
      (gains.d_us_per_dps2 * (derivativeInput - this.lastDerivativeInput)) / tick_s,
    );
    this.ff_us = gains.feedforward_us_per_dps * setpoint_dps;
    this.integrate(error, holdIntegral, windupSign);

    const wanted = this.p_us + this.i_us + this.d_us + this.ff_us;
    const limit = all.outputLimit_us;
    this.output_us = Math.max(-limit, Math.min(limit, wanted));
    this.limited = this.output_us === wanted ? 0 : 1;
    if (all.antiWindup === 'back-calculation' && this.tracking_s > 0) {
      this.i_us += (tick_s / this.tracking_s) * (this.output_us - wanted);
    }
    this.lastError = error;
    this.lastDerivativeInput = derivativeInput;
    return this.output_us;
  }

  private integrate(error: number, hold: boolean, windupSign: number): void {
    if (hold) {
      this.i_us = 0;
      return;
    }
    const change = this.gains.i_us_per_deg * (this.tick_s / 2) * (error + this.lastError);
    const clamping = (this.all.antiWindup ?? 'clamping') === 'clamping';
    const stuck = this.limited === 1 ? Math.sign(this.output_us) : windupSign;
    if (clamping && stuck !== 0 && Math.sign(change) === stuck) return;
    const limit = this.all.integralLimit_us;
    this.i_us = Math.max(-limit, Math.min(limit, this.i_us + change));
  }

  save(out: SnapshotWriter): void {
    out.putAll([this.p_us, this.i_us, this.d_us, this.ff_us, this.output_us, this.filteredRate_dps]);
    out.putAll([this.limited, this.lastError, this.lastDerivativeInput, this.fresh ? 1 : 0]);
    this.gyroFilters.save(out);
    this.derivativeFilter.save(out);
  }

  load(from: SnapshotReader): void {
    this.p_us = from.take();
    this.i_us = from.take();
    this.d_us = from.take();
    this.ff_us = from.take();
    this.output_us = from.take();
    this.filteredRate_dps = from.take();
    this.limited = from.take();
    this.lastError = from.take();
    this.lastDerivativeInput = from.take();
    this.fresh = from.take() === 1;
    this.gyroFilters.load(from);
    this.derivativeFilter.load(from);
  }
}

/** Gyro low-pass, then the notches. */
function gyroFilters(all: Gains): BiquadCoefficients[] {
  const first = lowPass(all.gyroLowPass_Hz, all.gyroLowPassKind ?? 'first-order', all.loop_Hz);
  const notches = all.notches.map((one) => biquadNotch(one.centre_Hz, one.q, all.loop_Hz));
  return first === null ? notches : [first, ...notches];
}

function derivativeFilters(all: Gains): BiquadCoefficients[] {
  const only = lowPass(all.derivativeLowPass_Hz, all.derivativeLowPassKind ?? 'first-order', all.loop_Hz);
  return only === null ? [] : [only];
}

function trackingTime_s(gains: AxisGains): number {
  if (gains.i_us_per_deg <= 0 || gains.p_us_per_dps <= 0) return 0;
  const integral_s = gains.p_us_per_dps / gains.i_us_per_deg;
  const derivative_s = gains.d_us_per_dps2 / gains.p_us_per_dps;
  return derivative_s > 0 ? Math.sqrt(integral_s * derivative_s) : integral_s;
}
