import type { RefObject } from 'preact';
import { useEffect, useRef } from 'preact/hooks';

/**
 * Draws on a canvas that fills its parent: again whenever the size, the screen's density or one of `deps` changes.
 * `draw` works in CSS pixels on a cleared canvas.
 */
export function useCanvas(
  draw: (pen: CanvasRenderingContext2D, width: number, height: number) => void,
  deps: readonly unknown[],
): RefObject<HTMLCanvasElement> {
  const canvas = useRef<HTMLCanvasElement>(null);
  const latest = useRef(draw);
  latest.current = draw;
  const again = useRef<() => void>(() => undefined);

  useEffect(() => {
    const element = canvas.current;
    const parent = element?.parentElement;
    const pen = element?.getContext('2d');
    if (!element || !parent || !pen) return;
    const paint = () => {
      const { clientWidth: width, clientHeight: height } = parent;
      if (width === 0 || height === 0) return;
      const ratio = devicePixelRatio;
      element.width = Math.round(width * ratio);
      element.height = Math.round(height * ratio);
      element.style.width = `${width}px`;
      element.style.height = `${height}px`;
      pen.setTransform(ratio, 0, 0, ratio, 0, 0);
      latest.current(pen, width, height);
    };
    again.current = paint;
    const observer = new ResizeObserver(paint);
    observer.observe(parent);
    return () => observer.disconnect();
  }, []);
  useEffect(() => again.current(), deps as unknown[]);
  return canvas;
}
