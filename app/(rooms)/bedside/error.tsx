'use client';

import { Button } from '@/components/ui/Button';
import { Notice } from '@/components/ui/Notice';
import { PageHead } from '@/components/ui/PageHead';

/** Keeps the rooms in reach when one page fails. */
export default function BedsideError({
  error,
  reset,
}: {
  error: Error & { digest?: string };
  reset: () => void;
}) {
  return (
    <>
      <PageHead title="Bedside" />
      <Notice
        tone="alarm"
        title="This page could not be shown"
        action={
          <Button className="min-h-11" onClick={reset}>
            Try again
          </Button>
        }
      >
        Clips are still taken in and filed, and nothing was half done. If it happens twice, tell IT
        {error.digest ? `, with the number ${error.digest}` : ''}.
      </Notice>
    </>
  );
}
