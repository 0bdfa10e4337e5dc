'use client';

import { type RefObject, useEffect, useState } from 'react';
import type { Surface } from './drawWaveform';

/** Changes whenever colours may have: the person fixed day or night, or the system turned. */
export function useThemeTurns(): number {
  const [turns, setTurns] = useState(0);
  useEffect(() => {
    const turned = () => setTurns((before) => before + 1);
    const observer = new MutationObserver(turned);
    observer.observe(document.documentElement, { attributes: true, attributeFilter: ['data-theme'] });
    const dark = window.matchMedia('(prefers-color-scheme: dark)');
    dark.addEventListener('change', turned);
    return () => {
      observer.disconnect();
      dark.removeEventListener('change', turned);
    };
  }, []);
  return turns;
}

/** Size of an element in CSS pixels; 0 by 0 until it was measured. */
export function useSize(element: RefObject<HTMLElement | null>): { width: number; height: number } {
  const [size, setSize] = useState({ width: 0, height: 0 });
  useEffect(() => {
    const target = element.current;
    if (!target) return;
    const observer = new ResizeObserver(([entry]) => {
      const box = entry?.contentRect;
      if (box) setSize({ width: Math.round(box.width), height: Math.round(box.height) });
    });
    observer.observe(target);
    return () => observer.disconnect();
  }, [element]);
  return size;
}

/**
 * Keeps a canvas as sharp as the screen and has it drawn at the next frame after any of `causes` changed.
 *
 * @param draw given device pixels; not called while the canvas has no size
 */
export function useSurface(
  canvas: RefObject<HTMLCanvasElement | null>,
  draw: ((surface: Surface) => void) | null,
): void {
  const { width, height } = useSize(canvas);
  const turns = useThemeTurns();
  // biome-ignore lint/correctness/useExhaustiveDependencies: a turn of the theme draws again
  useEffect(() => {
    const target = canvas.current;
    if (!target || !draw || width === 0 || height === 0) return;
    const frame = requestAnimationFrame(() => {
      const ratio = window.devicePixelRatio || 1;
      target.width = Math.round(width * ratio);
      target.height = Math.round(height * ratio);
      const context = target.getContext('2d');
      if (context) draw({ context, width: target.width, height: target.height });
    });
    return () => cancelAnimationFrame(frame);
  }, [canvas, draw, width, height, turns]);
}
