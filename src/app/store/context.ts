/** Hands the one store and the theme to every component. */
import { createContext } from 'preact';
import { useContext } from 'preact/hooks';
import type { Store } from './store.ts';
import type { Theme } from './theme.ts';

export interface Bench {
  readonly store: Store;
  readonly theme: Theme;
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
