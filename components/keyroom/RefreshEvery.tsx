'use client';

import { useRouter } from 'next/navigation';
import { useEffect } from 'react';

/** Draw the page anew every so often, while somebody looks at it. */
export function RefreshEvery({ seconds }: { seconds: number }) {
  const router = useRouter();
  useEffect(() => {
    const timer = setInterval(() => {
      if (document.visibilityState === 'visible') router.refresh();
    }, seconds * 1000);
    return () => clearInterval(timer);
  }, [router, seconds]);
  return null;
}
