'use client';

import { type RefObject, useEffect, useState } from 'react';

/**
 * Whether the first child of a box is wider than the box. Only then may the box scroll by itself: a scrolling box
 * would keep a sticky head from sticking to the page. True until it was measured, so that nothing spills meanwhile.
 */
export function useWiderThanItsBox(box: RefObject<HTMLElement | null>): boolean {
  const [wide, setWide] = useState(true);
  useEffect(() => {
    const element = box.current;
    const child = element?.firstElementChild;
    if (!element || !child) return;
    const measure = () => setWide(child.scrollWidth > element.clientWidth + 1);
    const observer = new ResizeObserver(measure);
    observer.observe(element);
    observer.observe(child);
    return () => observer.disconnect();
  }, [box]);
  return wide;
}
