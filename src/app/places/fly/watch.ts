/** Watches the newest rows for what a person should know at once: strikes, tipping, limits, screaming motors. */
import { signal, type Signal } from '@preact/signals';
import { CORNERS, type Corner } from '../../../craft/build.ts';
import { signalIndex } from '../../../flight/signals.ts';

export type Concern =
  | { readonly kind: 'struck'; readonly corners: readonly Corner[] }
  | { readonly kind: 'tipped' }
  | { readonly kind: 'saturated'; readonly corners: readonly Corner[] }
  | { readonly kind: 'screaming' };

/** How much the motors are made to work by noise: the bench's own words, no source. */
export type Roughness = (typeof WORDS)[number];
const WORDS = ['quiet', 'rough', 'screaming'] as const;

/** Commands moving above 20 Hz by this share of their range, rms. */
const ROUGH = 0.015;
const SCREAMING = 0.03;
/** A command is said to stand at its limit when it did for half of about this time, s. */
const MEMORY_S = 0.4;
/** Motors are called rough or screaming once they were so for this long: a stick's jerk is no noise, s. */
const LASTING_S = 1;
/** A craft that leans on something by more than this does not stand on its legs: cosine of 50 degrees. */
const TIPPED_COSINE = 0.64;
const TIPPED_S = 0.6;

const STRUCK = signalIndex('struck_FL');
const SATURATED = signalIndex('saturated_FL');
const TOUCHING = signalIndex('touching');
const QX = signalIndex('qx');

export class Watch {
  /** The gravest of what is going on; null: nothing. */
  readonly concern: Signal<Concern | null> = signal(null);
  /** How the motors are, once it lasts. */
  readonly roughness: Signal<Roughness> = signal('quiet');
  private since_s = 0;
  private lately: Roughness = 'quiet';
  private readonly held = new Float64Array(4);
  private tipped_s = 0;

  /**
   * One look.
   * @param row newest row of signals
   * @param activity rms movement of the commands above 20 Hz, share of their range
   */
  look(row: ArrayLike<number>, activity: number, dt_s: number): void {
    const touching = row[TOUCHING] > 0.5;
    const follow = 1 - Math.exp(-dt_s / MEMORY_S);
    for (let i = 0; i < 4; i++) {
      const now = !touching && row[SATURATED + i] !== 0 ? 1 : 0;
      this.held[i] += follow * (now - this.held[i]);
    }
    const upright = 1 - 2 * (row[QX] * row[QX] + row[QX + 1] * row[QX + 1]);
    this.tipped_s = touching && upright < TIPPED_COSINE ? this.tipped_s + dt_s : 0;
    this.hear(touching ? 'quiet' : roughnessOf(activity), dt_s);
    this.say(this.gravest(row));
  }

  /** A word that lasts becomes the motors' word; a milder one at once. */
  private hear(now: Roughness, dt_s: number): void {
    this.since_s = now === this.lately ? this.since_s + dt_s : 0;
    this.lately = now;
    const milder = WORDS.indexOf(now) < WORDS.indexOf(this.roughness.value);
    if (milder || this.since_s >= LASTING_S) this.roughness.value = now;
  }

  private gravest(row: ArrayLike<number>): Concern | null {
    const struck = CORNERS.filter((_, i) => row[STRUCK + i] > 0.5);
    if (struck.length > 0) return { kind: 'struck', corners: struck };
    if (this.tipped_s > TIPPED_S) return { kind: 'tipped' };
    const saturated = CORNERS.filter((_, i) => this.held[i] > 0.5);
    if (saturated.length > 0) return { kind: 'saturated', corners: saturated };
    return this.roughness.value === 'screaming' ? { kind: 'screaming' } : null;
  }

  /** Writes only what changed, so that nothing is rendered anew each frame. */
  private say(next: Concern | null): void {
    const old = this.concern.value;
    if (JSON.stringify(old) !== JSON.stringify(next)) this.concern.value = next;
  }
}

function roughnessOf(activity: number): Roughness {
  return activity > SCREAMING ? 'screaming' : activity > ROUGH ? 'rough' : 'quiet';
}
