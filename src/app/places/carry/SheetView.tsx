/** The sheet as it will print, to scale: never wider than there is room, never larger than on paper. */
import type { RefObject } from 'preact';
import { useEffect, useRef, useState } from 'preact/hooks';

/** A page of A4 with a little air around it, CSS px. */
const SHEET_WIDTH = 830;

export function SheetView(props: { html: string; title: string; frame: RefObject<HTMLIFrameElement> }) {
  const box = useRef<HTMLDivElement>(null);
  const [room, setRoom] = useState({ width: SHEET_WIDTH, height: 0 });
  useEffect(() => {
    if (box.current === null) return;
    const watch = new ResizeObserver(([{ contentRect }]) =>
      setRoom({ width: contentRect.width, height: contentRect.height }),
    );
    watch.observe(box.current);
    return () => watch.disconnect();
  }, []);
  const scale = Math.min(1, room.width / SHEET_WIDTH);
  return (
    <div class="carry-room" ref={box}>
      <iframe
        ref={props.frame}
        class="carry-sheet"
        title={props.title}
        sandbox="allow-same-origin allow-modals"
        srcdoc={props.html}
        style={{
          width: `${room.width / scale}px`,
          height: `${room.height / scale}px`,
          transform: scale < 1 ? `scale(${scale})` : 'none',
        }}
      />
    </div>
  );
}
