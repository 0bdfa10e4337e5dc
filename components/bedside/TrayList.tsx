'use client';

import Link from 'next/link';
import { useState } from 'react';
import { PassageStrip } from '@/components/custody/PassageStrip';
import { VerdictMark } from '@/components/recording/VerdictMark';
import { concerns } from '@/components/shell/LiveEvents';
import { useData } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { Dialog } from '@/components/ui/Dialog';
import { EmptyState } from '@/components/ui/EmptyState';
import { Notice } from '@/components/ui/Notice';
import { Pager } from '@/components/ui/Pager';
import { Time } from '@/components/ui/Time';
import { tell } from '@/components/ui/Toast';
import { siteOf } from '@/lib/contract/sites';
import { IdentifiersForm } from './IdentifiersForm';
import type { Clip } from './session';
import { bornInWords } from './words';

interface Candidate {
  encounterId: string;
  encounterNumber: string;
  patientName: string;
  recordNumber: string;
  birthDate: string | null;
  ward: string | null;
  bed: string | null;
  why: string[];
}
interface Line extends Clip {
  assetTag: string;
  ward: string | null;
  why: string;
  candidates: Candidate[];
}
interface Answer {
  rows: Line[];
  next: number | null;
}

/** Stray clips, each with the encounters it may belong to and why. Choose one, read two identifiers, file. */
export function TrayList({
  href,
  first,
  olderHref,
  newerHref,
}: {
  href: string;
  first: Answer;
  olderHref: string | null;
  newerHref: string | null;
}) {
  const { data, error, mutate } = useData<Answer>(href, first, (event) => concerns(event, 'recording'));
  const [filing, setFiling] = useState<{ clip: Line; to: Candidate } | null>(null);
  const rows = data?.rows ?? [];
  return (
    <>
      {error && !data ? (
        <Notice
          tone="alarm"
          title="The tray could not be fetched"
          action={<Button onClick={() => void mutate()}>Try again</Button>}
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
          <li key={clip.id} className="rounded-plate border border-line bg-sheet">
            <div className="flex flex-wrap items-center gap-x-5 gap-y-1 border-b border-line px-4 py-3">
              <Link href={`/recordings/${clip.number}`} className="link-quiet mono">
                {clip.number}
              </Link>
              {clip.verdict ? <VerdictMark verdict={clip.verdict} /> : null}
              <PassageStrip stage={clip.stage} stopped={clip.stopped !== null} verdict={clip.verdict} />
              <span>{siteOf(clip.site)?.label ?? 'no site given'}</span>
              <span>
                <span className="mono">{clip.assetTag}</span>
                {clip.ward ? `, ${clip.ward}` : ''}
              </span>
              <span className="text-ink-soft">
                recorded <Time at={clip.recordedAt} mode="minute" />
              </span>
            </div>
            <div className="grid gap-2 px-4 py-3">
              <p className="text-ink-soft">In the tray because {clip.why}.</p>
              {clip.candidates.length === 0 ? (
                <p>
                  No encounter on your wards is near it. Search for the patient on{' '}
                  <Link href="/bedside">Bedside</Link>, or ask whoever used the device.
                </p>
              ) : null}
              <ol className="grid gap-2">
                {clip.candidates.map((candidate) => (
                  <li
                    key={candidate.encounterId}
                    className="grid items-center gap-x-4 gap-y-1 border-t border-line pt-2 min-[641px]:grid-cols-[minmax(0,1fr)_auto]"
                  >
                    <div className="min-w-0">
                      <p className="break-words">
                        <b>{candidate.patientName}</b>, born {bornInWords(candidate.birthDate)},{' '}
                        <span className="mono">{candidate.encounterNumber}</span>
                        {candidate.bed ? `, ${candidate.bed}` : ''}
                      </p>
                      <p className="text-13 text-ink-soft">Because {candidate.why.join('; ')}.</p>
                    </div>
                    <Button className="min-h-11" onClick={() => setFiling({ clip, to: candidate })}>
                      File here…
                    </Button>
                  </li>
                ))}
              </ol>
            </div>
          </li>
        ))}
      </ul>
      {olderHref || newerHref ? <Pager olderHref={olderHref} newerHref={newerHref} /> : null}
      <Dialog
        open={filing !== null}
        onOpenChange={(open) => {
          if (!open) setFiling(null);
        }}
        title={filing ? `File ${filing.clip.number} to ${filing.to.encounterNumber}` : ''}
        description={
          filing
            ? `${filing.to.patientName}${filing.to.ward ? `, ${filing.to.ward}` : ''}. Two identifiers are read before a clip is filed.`
            : undefined
        }
      >
        {filing ? (
          <IdentifiersForm
            url={`/api/recordings/${filing.clip.number}/file`}
            encounterId={filing.to.encounterId}
            submitLabel={`File ${filing.clip.number}`}
            onDone={() => {
              tell(`${filing.clip.number} is filed to ${filing.to.encounterNumber}`);
              setFiling(null);
              void mutate();
            }}
          />
        ) : null}
      </Dialog>
    </>
  );
}
