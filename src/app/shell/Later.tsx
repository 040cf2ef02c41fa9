/** A part of the frame that is loaded when it is first wanted; nothing stands there until it has come. */
import type { ComponentType } from 'preact';
import { useEffect, useState } from 'preact/hooks';

export function Later<P extends object>(props: {
  load: () => Promise<{ default: ComponentType<P> }>;
  with: P;
  /** Told when it cannot be loaded. */
  onFailure?: (error: unknown) => void;
}) {
  const [part, setPart] = useState<{ readonly View: ComponentType<P> } | null>(null);
  useEffect(() => {
    let wanted = true;
    props.load().then(
      (module) => wanted && setPart({ View: module.default }),
      (error: unknown) => wanted && props.onFailure?.(error),
    );
    return () => {
      wanted = false;
    };
  }, []);
  return part === null ? null : <part.View {...props.with} />;
}
