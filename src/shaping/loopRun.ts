/** The unlimited linear loop run tick by tick from rest; a long delay costs no more than a short one. */
import { control, movePlant, type RateLoop, type TickOutput } from './rateLoop.ts';

export class LoopRun {
  /** Rate at the sensor before the last tick, and the command it gave. */
  readonly out: TickOutput = { y: 0, u: 0 };
  private state: Float64Array;
  private next: Float64Array;
  /** Ring of past commands; `head` is where the next one goes. */
  private readonly past: Float64Array;
  private head = 0;

  constructor(private readonly loop: RateLoop) {
    this.state = new Float64Array(loop.layout.size);
    this.next = new Float64Array(loop.layout.size);
    this.past = new Float64Array(loop.plant.wholeTicks + 2);
  }

  /** Rate at the sensor now, deg/s. */
  get sensed_dps(): number {
    return this.row(this.loop.plant.C);
  }

  /** Rate of the body now, deg/s. */
  get bodyRate_dps(): number {
    return this.row(this.loop.plant.bodyRate);
  }

  /** @param push_dps2 angular acceleration from outside over this tick */
  tick(setpoint_dps: number, push_dps2: number): void {
    const { loop, past, state, next } = this;
    const { plant, layout } = loop;
    control(loop, state, setpoint_dps, 0, next, this.out);
    past[this.head] = this.out.u;
    movePlant(loop, state, this.back(plant.wholeTicks), this.back(plant.wholeTicks + 1), next);
    if (push_dps2 !== 0)
      for (let j = 0; j < plant.states; j++) next[layout.plant + j] += plant.disturbance[j] * push_dps2;
    this.head = (this.head + 1) % past.length;
    this.state = next;
    this.next = state;
  }

  /** Command of so many ticks ago, 0 the newest. */
  private back(ticks: number): number {
    const place = this.head - ticks;
    return this.past[place < 0 ? place + this.past.length : place];
  }

  private row(row: Float64Array): number {
    let sum = 0;
    for (let j = 0; j < row.length; j++) sum += row[j] * this.state[this.loop.layout.plant + j];
    return sum;
  }
}
