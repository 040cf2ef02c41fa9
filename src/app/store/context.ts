/** Hands the one store and the theme to every component. */
import { createContext } from 'preact';
import { useContext } from 'preact/hooks';
import type { WorkStorage } from '../storage/workStorage.ts';
import type { Store } from './store.ts';
import type { Theme } from './theme.ts';

export interface Bench {
  readonly store: Store;
  readonly theme: Theme;
  /** Null when this browser keeps nothing for the page. */
  readonly storage: WorkStorage | null;
  /** What a place leaves running while another is open (a paused flight), by its own name. */
  readonly running: Map<string, unknown>;
}

export const BenchContext = createContext<Bench | null>(null);

function useBench(): Bench {
  const bench = useContext(BenchContext);
  if (bench === null) throw new Error('no BenchContext around this component');
  return bench;
}

/** The page's store. */
export function useStore(): Store {
  return useBench().store;
}

/** Theme, canvas colours and motion preference, as signals. */
export function useTheme(): Theme {
  return useBench().theme;
}

/** Where the work is kept, for those who look after what was put aside. */
export function useStorage(): WorkStorage | null {
  return useBench().storage;
}

/** What places leave running while another is open. */
export function useRunning(): Map<string, unknown> {
  return useBench().running;
}
