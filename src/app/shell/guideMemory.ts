/** Where the guide stands, kept with the settings. A first visit shows it. */
import type { Settings } from '../store/document.ts';
import type { Store } from '../store/store.ts';

interface GuideMemory {
  readonly hidden: boolean;
  /** From 0. */
  readonly step: number;
}

export function guideMemory({ places }: Settings): GuideMemory {
  const { hidden, step } = (places.guide ?? {}) as Partial<Record<keyof GuideMemory, unknown>>;
  return {
    hidden: hidden === true,
    step: typeof step === 'number' && Number.isInteger(step) && step >= 0 ? step : 0,
  };
}

export function setGuide(store: Store, memory: GuideMemory): void {
  store.setPlaceMemory('guide', memory);
}
