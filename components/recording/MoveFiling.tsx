'use client';

import { useRouter } from 'next/navigation';
import { useState } from 'react';
import { FileDialog } from '@/components/bedside/FileDialog';

interface Props {
  /** The recording's number. */
  number: string;
  version: number;
  /** Number of the encounter it is filed to; null while it is in the tray. */
  from: string | null;
}

/** Move a recording to another encounter, or file one that is in the tray. */
export function MoveFiling({ number, version, from }: Props) {
  const router = useRouter();
  const [open, setOpen] = useState(false);
  return (
    <>
      <button type="button" className="link min-h-11" onClick={() => setOpen(true)}>
        {from === null ? 'File to an encounter…' : 'Move to another encounter…'}
      </button>
      <FileDialog
        number={number}
        from={from === null ? undefined : { encounter: from, version }}
        open={open}
        onOpenChange={setOpen}
        onDone={() => {
          setOpen(false);
          router.refresh();
        }}
      />
    </>
  );
}
