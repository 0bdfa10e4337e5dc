'use client';

import { Button } from '@/components/ui/Button';
import { LonePage } from '@/components/ui/LonePage';

export default function PageError({
  error,
  reset,
}: {
  error: Error & { digest?: string };
  reset: () => void;
}) {
  return (
    <LonePage title="This page could not be shown">
      <p>Nothing was half done: what was saved stays saved. Try again; if it happens twice, tell IT.</p>
      {error.digest ? (
        <p>
          Number for IT: <span className="mono">{error.digest}</span>
        </p>
      ) : null}
      <p>
        <Button variant="primary" onClick={reset}>
          Try again
        </Button>
      </p>
    </LonePage>
  );
}
