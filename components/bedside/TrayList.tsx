'use client';

import { useState } from 'react';
import { useData } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { EmptyState } from '@/components/ui/EmptyState';
import { Notice } from '@/components/ui/Notice';
import { Pager } from '@/components/ui/Pager';
import type { EncounterChoice } from './EncounterPicker';
import { FileDialog } from './FileDialog';
import { changed } from './live';
import { TrayClip, type TrayLine } from './TrayClip';

interface Answer {
  rows: TrayLine[];
  next: string | null;
}

interface Props {
  href: string;
  first: Answer;
  olderHref: string | null;
  newerHref: string | null;
}

/** Stray clips, each with the encounters it may belong to and why. Choose one, read two identifiers, file. */
export function TrayList({ href, first, olderHref, newerHref }: Props) {
  const { data, error, mutate } = useData<Answer>(href, first, (event) => changed(event, 'recording'));
  const [filing, setFiling] = useState<{ number: string; to: EncounterChoice | null } | null>(null);
  const rows = data?.rows ?? [];
  return (
    <>
      {error ? (
        <Notice
          tone="alarm"
          title="The tray is not up to date"
          action={
            <Button className="min-h-11" onClick={() => void mutate()}>
              Try again
            </Button>
          }
        >
          {error.message}
        </Notice>
      ) : null}
      {rows.length === 0 ? (
        <EmptyState title="The tray is empty">
          Clips turn up here when no listening session was open on their device and nothing was scanned with
          them.
        </EmptyState>
      ) : null}
      <ul aria-label="Clips in the tray" className="grid gap-4">
        {rows.map((clip) => (
          <li key={clip.id}>
            <TrayClip clip={clip} onFile={(to) => setFiling({ number: clip.number, to })} />
          </li>
        ))}
      </ul>
      {olderHref || newerHref ? <Pager olderHref={olderHref} newerHref={newerHref} /> : null}
      <FileDialog
        key={filing ? `${filing.number} ${filing.to?.id ?? ''}` : 'none'}
        number={filing?.number ?? ''}
        to={filing?.to ?? null}
        open={filing !== null}
        onOpenChange={(open) => {
          if (!open) setFiling(null);
        }}
        onDone={() => {
          setFiling(null);
          void mutate();
        }}
      />
    </>
  );
}
