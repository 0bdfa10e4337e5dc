'use client';

import { useRouter } from 'next/navigation';
import { useState } from 'react';
import { KeepDialog } from '@/components/bedside/KeepDialog';

/** Keep a recording that should be made again, from its own page. */
export function KeepClip({ number }: { number: string }) {
  const router = useRouter();
  const [open, setOpen] = useState(false);
  return (
    <>
      <button type="button" className="link min-h-11" onClick={() => setOpen(true)}>
        Keep anyway…
      </button>
      <KeepDialog number={number} open={open} onOpenChange={setOpen} onKept={() => router.refresh()} />
    </>
  );
}
