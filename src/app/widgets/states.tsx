/** The four states that are not the normal one, each designed: empty, loading, failed, stale. */
import type { ComponentChildren } from 'preact';
import { useEffect, useState } from 'preact/hooks';
import { en } from '../texts/en.ts';
import { Button } from './Button.tsx';

/** Nothing here yet: what would be here and how to get it. */
export function EmptyState(props: { title: string; children?: ComponentChildren }) {
  return (
    <section class="state">
      <h2>{props.title}</h2>
      <div class="faint">{props.children}</div>
    </section>
  );
}

/** Comes up only after a moment, so that fast loads do not flicker. */
export function LoadingState(props: { what?: string }) {
  const [late, setLate] = useState(false);
  useEffect(() => {
    const timer = setTimeout(() => setLate(true), 150);
    return () => clearTimeout(timer);
  }, []);
  return (
    <section class="state" aria-busy="true">
      {late ? <p class="faint">{props.what ?? en.states.loading}</p> : null}
    </section>
  );
}

/** What failed, that the rest goes on, the error's text to copy, and a way on. */
export function FailedState(props: {
  title: string;
  text: string;
  error: unknown;
  children?: ComponentChildren;
}) {
  const [copied, setCopied] = useState(false);
  const shown = errorText(props.error);
  return (
    <section class="state failed" role="alert">
      <h2>{props.title}</h2>
      <p>{props.text}</p>
      <pre tabIndex={0} aria-label={props.title}>
        {shown}
      </pre>
      <div class="row">
        {props.children}
        <Button
          onClick={() => {
            void navigator.clipboard.writeText(shown).then(
              () => setCopied(true),
              () => setCopied(false),
            );
          }}
        >
          {copied ? en.states.copied : en.states.copyError}
        </Button>
      </div>
    </section>
  );
}

/** Marks what it holds as computed for an earlier state; offers to compute again. */
export function Stale(props: { stale: boolean; onRecompute?: () => void; children: ComponentChildren }) {
  return (
    <div class={props.stale ? 'stale' : undefined}>
      {props.stale ? (
        <p class="stale-line">
          <strong>{en.states.stale}.</strong> <span class="faint">{en.states.staleText}</span>
          {props.onRecompute ? <Button onClick={props.onRecompute}>{en.states.recompute}</Button> : null}
        </p>
      ) : null}
      <div class="stale-body">{props.children}</div>
    </div>
  );
}

function errorText(error: unknown): string {
  return error instanceof Error ? (error.stack ?? `${error.name}: ${error.message}`) : String(error);
}
