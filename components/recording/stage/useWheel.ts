'use client';

import { type RefObject, useEffect, useRef } from 'react';
import { fitView, type Stretch, zoomAbout } from './view';

/** With Ctrl the wheel zooms about the pointer, sideways (or with Shift) it moves; else the page scrolls as ever. */
export function useWheel(
  element: RefObject<HTMLElement | null>,
  view: Stretch,
  setView: (view: Stretch) => void,
  durationSeconds: number,
): void {
  const latest = useRef({ view, setView });
  useEffect(() => {
    latest.current = { view, setView };
  });
  useEffect(() => {
    const target = element.current;
    if (!target) return;
    const onWheel = (event: WheelEvent) => {
      const { view: now, setView: set } = latest.current;
      const length = now.to - now.from;
      const box = target.getBoundingClientRect();
      if (event.ctrlKey || event.metaKey) {
        event.preventDefault();
        const about = now.from + ((event.clientX - box.left) / box.width) * length;
        set(zoomAbout(now, about, Math.exp(event.deltaY / 300), durationSeconds));
        return;
      }
      const sideways = event.shiftKey ? event.deltaY || event.deltaX : event.deltaX;
      if (Math.abs(sideways) <= (event.shiftKey ? 0 : Math.abs(event.deltaY))) return;
      event.preventDefault();
      const shift = (sideways / box.width) * length;
      set(fitView({ from: now.from + shift, to: now.to + shift }, durationSeconds));
    };
    // React listens passively to the wheel, where the page's own zoom cannot be held back.
    target.addEventListener('wheel', onWheel, { passive: false });
    return () => target.removeEventListener('wheel', onWheel);
  }, [element, durationSeconds]);
}
