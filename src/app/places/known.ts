/** How well each quantity of the build is known, in words, kept with the craft; Carry prints it on the sheet. */
import type { Store } from '../store/store.ts';

/** Entry among the craft's sheets. */
const SHEET = 'measure';

/** Text like "±2.1 % (bifilar swing, 5 timings)" by the quantity's name on the sheet. */
export type Known = Readonly<Record<string, string>>;

export function keepKnown(store: Store, known: Known, label: string): void {
  store.setSheet(SHEET, { known }, label);
}

/** What is kept now; a sheet of another shape counts as none. */
export function knownNow(store: Store): Known {
  const sheet: unknown = store.craft.value.sheets[SHEET];
  const known = typeof sheet === 'object' && sheet !== null && 'known' in sheet ? sheet.known : null;
  if (typeof known !== 'object' || known === null) return {};
  return Object.fromEntries(
    Object.entries(known).filter((one): one is [string, string] => typeof one[1] === 'string'),
  );
}
