/** How well each quantity of the build is known, in words, kept with the craft; Carry prints it on the sheet. */
import { halfWidth95, percent, type Estimate } from '../../measuring/estimate.ts';
import type { Store } from '../store/store.ts';

/** Entry among the craft's sheets. */
const SHEET = 'measure';

/** Text like "±2.1 % (bifilar swing, 5 timings)" by the quantity's name on the sheet. */
export type Known = Readonly<Record<string, string>>;

export function keepKnown(store: Store, known: Known, label: string): void {
  store.setSheet(SHEET, { known }, label);
}

export const knownNow = (store: Store): Known => knownIn(store.craft.value.sheets[SHEET]);

/** What a sheet keeps; one of another shape counts as none. */
export function knownIn(sheet: unknown): Known {
  const known = typeof sheet === 'object' && sheet !== null && 'known' in sheet ? sheet.known : null;
  if (typeof known !== 'object' || known === null) return {};
  return Object.fromEntries(
    Object.entries(known).filter((one): one is [string, string] => typeof one[1] === 'string'),
  );
}

/** "±2.1 % (how)"; the way alone where no share can be said. */
export function knownTo(estimate: Pick<Estimate, 'value' | 'sigma'>, how: string): string {
  const share = halfWidth95(estimate);
  return Number.isFinite(share) ? `±${percent(share)} (${how})` : how;
}
