'use client';

import { Button } from '@/components/ui/Button';
import { LonePage } from '@/components/ui/LonePage';
import './globals.css';

/** Stands in for the whole document when the root layout itself fails. */
export default function GlobalError({
  error,
  reset,
}: {
  error: Error & { digest?: string };
  reset: () => void;
}) {
  return (
    <html lang="en">
      <body>
        <title>Bellkeep could not be shown · Bellkeep</title>
        <LonePage title="Bellkeep could not be shown">
          <p>Nothing was half done: what was saved stays saved. Recordings keep coming in.</p>
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
      </body>
    </html>
  );
}
