import type { ComponentChildren } from 'preact';
import { useEffect, useId, useRef } from 'preact/hooks';
import { en } from '../texts/en.ts';
import { Button } from './Button.tsx';
import { NoticeStack } from './NoticeStack.tsx';

/** A modal sheet over the page; Escape or Close ends it, focus goes back to where it was. */
export function Dialog(props: {
  title: string;
  onClose: () => void;
  wide?: boolean;
  children: ComponentChildren;
}) {
  const box = useRef<HTMLDialogElement>(null);
  const heading = useId();
  useEffect(() => {
    const dialog = box.current;
    const before = document.activeElement;
    dialog?.showModal();
    return () => {
      dialog?.close();
      if (before instanceof HTMLElement) before.focus();
    };
  }, []);
  return (
    <dialog
      ref={box}
      class={props.wide ? 'dialog wide' : 'dialog'}
      aria-labelledby={heading}
      onCancel={(event) => {
        event.preventDefault();
        props.onClose();
      }}
    >
      <header>
        <h2 id={heading}>{props.title}</h2>
        <Button quiet onClick={props.onClose}>
          {en.dialog.close}
        </Button>
      </header>
      <div class="dialog-body">
        <NoticeStack />
        {props.children}
      </div>
    </dialog>
  );
}
