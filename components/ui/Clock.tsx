'use client';

import { createContext, type ReactNode, useContext, useEffect, useState } from 'react';

interface ClockValue {
  now: number | undefined;
  zone: string;
}
const ClockContext = createContext<ClockValue>({ now: undefined, zone: 'UTC' });

/**
 * The time by the server's clock, and the hospital's zone, for every Time below. The first frame is drawn with the
 * server's `now`, so that server and browser agree; from then on it advances here.
 *
 * @param now UTC milliseconds at the moment the server drew the page
 */
export function Clock({ now, zone, children }: { now: number; zone: string; children: ReactNode }) {
  const [current, setCurrent] = useState(now);
  useEffect(() => {
    // The browser's own clock may be wrong; how long it ran since is not.
    const started = performance.now();
    const advance = () => setCurrent(now + (performance.now() - started));
    const timer = setInterval(advance, 10_000);
    return () => clearInterval(timer);
  }, [now]);
  return <ClockContext value={{ now: current, zone }}>{children}</ClockContext>;
}

export const useClock = (): ClockValue => useContext(ClockContext);
