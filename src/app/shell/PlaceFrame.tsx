import { Component, type ComponentChildren, type ComponentType } from 'preact';
import { useEffect, useState } from 'preact/hooks';
import type { Place } from '../places/registry.ts';
import { useStore } from '../store/context.ts';
import { Button } from '../widgets/Button.tsx';
import { FailedState, LoadingState } from '../widgets/states.tsx';

type Loaded =
  | { readonly kind: 'loading' }
  | { readonly kind: 'ready'; readonly View: ComponentType }
  | { readonly kind: 'failed'; readonly error: unknown };

/** Loads a place when it is first opened and keeps its failures to itself. */
export function PlaceFrame(props: { place: Place }) {
  const { texts } = useStore();
  const title = texts.places[props.place.name];
  const [state, setState] = useState<Loaded>({ kind: 'loading' });
  const [attempt, setAttempt] = useState(0);
  useEffect(() => {
    let wanted = true;
    setState({ kind: 'loading' });
    props.place.load().then(
      (module) => wanted && setState({ kind: 'ready', View: module.default }),
      (error: unknown) => wanted && setState({ kind: 'failed', error }),
    );
    return () => {
      wanted = false;
    };
  }, [props.place, attempt]);

  if (state.kind === 'loading') return <LoadingState />;
  if (state.kind === 'failed') {
    return (
      <FailedState
        title={texts.states.failedLoad(title)}
        text={texts.states.failedLoadText}
        error={state.error}
      >
        <Button primary onClick={() => setAttempt(attempt + 1)}>
          {texts.states.tryAgain}
        </Button>
        <Button onClick={() => location.reload()}>{texts.states.reload}</Button>
      </FailedState>
    );
  }
  return (
    <Boundary
      fallback={(error, retry) => (
        <FailedState
          title={texts.states.failedPlace(title)}
          text={texts.states.failedPlaceText}
          error={error}
        >
          <Button primary onClick={retry}>
            {texts.states.tryAgain}
          </Button>
        </FailedState>
      )}
    >
      <state.View />
    </Boundary>
  );
}

interface BoundaryProps {
  readonly children: ComponentChildren;
  readonly fallback: (error: unknown, retry: () => void) => ComponentChildren;
}

class Boundary extends Component<BoundaryProps, { failed: { error: unknown } | null }> {
  override state = { failed: null };

  static override getDerivedStateFromError(error: unknown) {
    return { failed: { error } };
  }

  override render(props: BoundaryProps, state: { failed: { error: unknown } | null }) {
    if (state.failed === null) return props.children;
    return props.fallback(state.failed.error, () => this.setState({ failed: null }));
  }
}
