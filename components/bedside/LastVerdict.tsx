'use client';

import Link from 'next/link';
import { useState } from 'react';
import { worstFirst } from '@/components/recording/FindingsTable';
import { VerdictMark } from '@/components/recording/VerdictMark';
import { Button } from '@/components/ui/Button';
import { cx } from '@/components/ui/cx';
import { Time } from '@/components/ui/Time';
import { findingSentence } from '@/lib/acoustics/sentences';
import { siteOf } from '@/lib/contract/sites';
import { KeepDialog } from './KeepDialog';
import type { Clip } from './session';

const BOXES = {
  usable: 'border-spruce bg-spruce-wash',
  care: 'border-brass bg-brass-wash',
  repeat: 'border-rust bg-rust-wash',
} as const;

interface Props {
  /** The latest clip with a verdict. */
  clip: Clip | null;
  /** The session is over. */
  over: boolean;
  /** A later clip is on its way. */
  arriving: boolean;
  onKept: () => void;
}

/** The last verdict, legible at arm's length: the word, where, why, and what to do. Announced when it changes. */
export function LastVerdict({ clip, over, arriving, onKept }: Props) {
  const [keeping, setKeeping] = useState(false);
  if (!clip?.verdict) return <NoVerdict over={over} arriving={arriving} />;
  return (
    <section
      aria-label="Last verdict"
      className={cx('rounded-plate border-l-[6px] px-[22px] py-[18px]', BOXES[clip.verdict])}
    >
      <div aria-live="polite" aria-atomic="true">
        <VerdictMark verdict={clip.verdict} size="large" />
        <Words clip={clip} />
      </div>
      <div className="mt-3 flex flex-wrap items-center gap-x-4 gap-y-2">
        {clip.verdict === 'repeat' && clip.keptAt === null ? (
          <Button className="min-h-11" onClick={() => setKeeping(true)}>
            Keep anyway…
          </Button>
        ) : null}
        {clip.keptAt === null ? null : <b>Kept anyway</b>}
        <span className="text-ink-soft">
          {clip.cleanStretch && clip.verdict !== 'usable'
            ? `${Math.round(clip.cleanStretch.from)} to ${Math.round(clip.cleanStretch.to)} s is clean · `
            : ''}
          received <Time at={clip.receivedAt} ago className="" />
          {' · '}
          <Link href={`/recordings/${clip.number}`} className="mono inline-block py-3">
            {clip.number}
          </Link>
          {arriving ? ' · another clip is on its way' : ''}
        </span>
      </div>
      <KeepDialog number={clip.number} open={keeping} onOpenChange={setKeeping} onKept={onKept} />
    </section>
  );
}

function Words({ clip }: { clip: Clip }) {
  const site = siteOf(clip.site);
  const where = site ? `Site ${site.number}, ${site.label.toLowerCase()}` : 'No site given';
  const told = worstFirst(clip.findings).filter((finding) => finding.severity !== 'note');
  const [first, ...others] = told.map((finding) => findingSentence(finding));
  return (
    <>
      <p className="mt-2 max-w-[52ch] text-17 min-[641px]:text-21">
        {where}: {first ? `${lowered(first.meaning)} ${first.action}` : 'no technical fault found.'}
      </p>
      {others.length > 0 ? (
        <p className="mt-1 text-ink-soft">
          Also: {others.map((other) => other.title.toLowerCase()).join(', ')}.
        </p>
      ) : null}
    </>
  );
}

/** The sentence goes on after "Site 4, right lower back:". A word of capitals stays as it is. */
const lowered = (sentence: string): string =>
  /^[A-Z][a-z]/.test(sentence) || /^A /.test(sentence)
    ? sentence.charAt(0).toLowerCase() + sentence.slice(1)
    : sentence;

function NoVerdict({ over, arriving }: { over: boolean; arriving: boolean }) {
  return (
    <section
      aria-label="Last verdict"
      aria-live="polite"
      className="rounded-plate border-l-[6px] border-line-strong bg-sheet px-[22px] py-[18px]"
    >
      <p className="text-21 font-semibold">
        {arriving ? 'A clip is on its way' : over ? 'No clip was recorded' : 'Waiting for the first clip'}
      </p>
      {over ? null : (
        <p className="mt-1 text-17 text-ink-soft">
          Put the chestpiece on the ringed site and record. The verdict shows here within a breath.
        </p>
      )}
    </section>
  );
}
