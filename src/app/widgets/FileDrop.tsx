import { useRef, useState } from 'preact/hooks';
import { useStore } from '../store/context.ts';
import { Button } from './Button.tsx';

/** A place to drop files on, with a picker for those who do not drag. */
export function FileDrop(props: {
  label: string;
  /** As in an input's accept: ".csv,.txt". */
  accept?: string;
  multiple?: boolean;
  onFiles: (files: readonly File[]) => void;
}) {
  const words = useStore().texts.drop;
  const picker = useRef<HTMLInputElement>(null);
  const [over, setOver] = useState(false);
  const give = (list: FileList | null | undefined): void => {
    const files = [...(list ?? [])];
    if (files.length > 0) props.onFiles(props.multiple === true ? files : files.slice(0, 1));
  };
  return (
    <div
      class={over ? 'file-drop over' : 'file-drop'}
      role="group"
      aria-label={props.label}
      onDragOver={(event) => {
        event.preventDefault();
        event.stopPropagation();
        setOver(true);
      }}
      onDragLeave={() => setOver(false)}
      onDrop={(event) => {
        event.preventDefault();
        // The page around opens what is dropped elsewhere.
        event.stopPropagation();
        setOver(false);
        give(event.dataTransfer?.files);
      }}
    >
      <span>{over ? words.over : props.label}</span>
      <Button onClick={() => picker.current?.click()}>{words.choose}</Button>
      <input
        ref={picker}
        type="file"
        hidden
        aria-label={props.label}
        accept={props.accept}
        multiple={props.multiple}
        onChange={(event) => {
          give(event.currentTarget.files);
          // The same file may be chosen again after it was mended.
          event.currentTarget.value = '';
        }}
      />
    </div>
  );
}
