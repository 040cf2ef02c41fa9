/** The page's start: store, theme, frame. */
import { render } from 'preact';
import './styles/tokens.css';
import './styles/base.css';
import './styles/widgets.css';
import './styles/plots.css';
import './styles/shell.css';
import { App } from './shell/App.tsx';
import { BenchContext } from './store/context.ts';
import { firstDocument } from './store/demos.ts';
import { Store } from './store/store.ts';
import { startTheme } from './store/theme.ts';

function start(root: HTMLElement): void {
  const store = new Store(firstDocument());
  const theme = startTheme(store.settings);
  render(
    <BenchContext.Provider value={{ store, theme }}>
      <App />
    </BenchContext.Provider>,
    root,
  );
}

const root = document.getElementById('app');
if (root !== null) start(root);
