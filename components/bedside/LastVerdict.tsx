'use client';

import Link from 'next/link';
import { useState } from 'react';
import { VerdictMark } from '@/components/recording/VerdictMark';
import { sendJson } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { ConfirmDialog } from '@/components/ui/ConfirmDialog';
import { cx } from '@/components/ui/cx';
import { Time } from '@/components/ui/Time';
import { findingSentence } from '@/lib/acoustics/sentences';
import { siteOf } from '@/lib/contract/sites';
import type { Clip } from './session';

const BOXES = {
  usable: 'border-spruce bg-spruce-wash',
  care: 'border-brass bg-brass-wash',
  repeat: 'border-rust bg-rust-wash',
} as const;

/** The last verdict, legible at arm's length: the word, where, why, and what to do. Announced when it changes. */
export function LastVerdict({
  clip,
  waiting,
  onKept,
}: {
  clip: Clip | null;
  waiting: boolean;
  onKept: () => void;
}) {
  const [keeping, setKeeping] = useState(false);
  if (!clip?.verdict) {
    return (
      <section
        aria-live="polite"
        className="rounded-plate border-l-[6px] border-line-strong bg-sheet px-6 py-5"
      >
        <p className="text-21 font-semibold">
          {waiting ? 'Waiting for the first clip' : 'No clip was recorded'}
        </p>
        {waiting ? (
          <p className="mt-1 text-17 text-ink-soft">
            Put the chestpiece on the ringed site and record. The verdict shows here within a breath.
          </p>
        ) : null}
      </section>
    );
  }
  const site = siteOf(clip.site);
  const reasons = (clip.findings ?? [])
    .filter((finding) => finding.severity !== 'note')
    .sort((a, b) => (a.severity === 'repeat' ? 0 : 1) - (b.severity === 'repeat' ? 0 : 1));
  const [first, ...others] = reasons.map((finding) => findingSentence(finding));
  const where = site ? `Site ${site.number}, ${site.label.toLowerCase()}` : 'No site given';
  return (
    <section
      aria-live="polite"
      aria-atomic="true"
      className={cx('rounded-plate border-l-[6px] px-6 py-5', BOXES[clip.verdict])}
    >
      <VerdictMark verdict={clip.verdict} size="large" />
      <p className="mt-2 max-w-[60ch] text-17">
        {where}: {first ? `${first.meaning} ${first.action}` : 'no technical fault found.'}
      </p>
      {others.length > 0 ? (
        <p className="mt-1 text-ink-soft">
          Also: {others.map((other) => other.title.toLowerCase()).join(', ')}.
        </p>
      ) : null}
      <div className="mt-3 flex flex-wrap items-center gap-x-4 gap-y-2">
        {clip.verdict === 'repeat' && clip.keptAt === null ? (
          <Button className="min-h-11" onClick={() => setKeeping(true)}>
            Keep anyway…
          </Button>
        ) : null}
        {clip.keptAt !== null ? <span className="font-semibold">Kept anyway</span> : null}
        <span className="text-ink-soft">
          {clip.cleanStretch && clip.verdict !== 'usable'
            ? `${Math.round(clip.cleanStretch.from)} to ${Math.round(clip.cleanStretch.to)} s is clean · `
            : ''}
          received <Time at={clip.receivedAt} ago /> ·{' '}
          <Link href={`/recordings/${clip.number}`} className="mono">
            {clip.number}
          </Link>
        </span>
      </div>
      <ConfirmDialog
        open={keeping}
        onOpenChange={setKeeping}
        title={`Keep ${clip.number} anyway`}
        confirmLabel="Keep the clip"
        danger={false}
        reason={{ label: 'Why it is kept', help: 'For example: the child would not allow a second try.' }}
        onConfirm={async ({ reason }) => {
          await sendJson(`/api/recordings/${clip.number}/keep`, { reason }, crypto.randomUUID());
          onKept();
        }}
      >
        The verdict stays “record again”. The site counts as done, and your reason stands in the custody
        thread.
      </ConfirmDialog>
    </section>
  );
}
