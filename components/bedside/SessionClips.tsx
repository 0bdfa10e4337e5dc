import Link from 'next/link';
import { PassageStrip } from '@/components/custody/PassageStrip';
import { worstFirst } from '@/components/recording/FindingsTable';
import { VerdictMark } from '@/components/recording/VerdictMark';
import { Time } from '@/components/ui/Time';
import { findingSentence } from '@/lib/acoustics/sentences';
import { siteOf } from '@/lib/contract/sites';
import type { Clip } from './session';

/** Clips of a session, the latest first; each opens its recording. */
export function SessionClips({ clips, empty }: { clips: readonly Clip[]; empty: string }) {
  if (clips.length === 0)
    return <p className="rounded-plate border border-line bg-sheet px-4 py-6 text-ink-soft">{empty}</p>;
  return (
    <ul aria-label="Clips of this session" className="rounded-plate border border-line bg-sheet">
      {clips.map((clip) => (
        <li key={clip.id} className="border-b border-line last:border-b-0">
          <ClipLink clip={clip} />
        </li>
      ))}
    </ul>
  );
}

function ClipLink({ clip }: { clip: Clip }) {
  const site = siteOf(clip.site);
  const [worst] = worstFirst(clip.findings).filter((finding) => finding.severity !== 'note');
  return (
    <Link
      href={`/recordings/${clip.number}`}
      className="grid min-h-[52px] grid-cols-[1.75rem_minmax(0,1fr)_auto] items-center gap-x-3 gap-y-1 px-4 py-2 text-ink no-underline hover:bg-spruce-wash min-[641px]:grid-cols-[1.75rem_minmax(0,1fr)_9.5rem_72px_4.75rem]"
    >
      <b>{site?.number ?? '–'}</b>
      <span className="min-w-0 break-words">
        {site?.label ?? 'No site given'}
        {worst ? (
          <span className="text-13 text-ink-soft"> {findingSentence(worst).title.toLowerCase()}</span>
        ) : null}
        {clip.keptAt === null ? null : <span className="text-13 text-ink-soft">, kept anyway</span>}
      </span>
      {clip.verdict ? (
        <VerdictMark verdict={clip.verdict} />
      ) : (
        <span className="text-ink-soft">{clip.stopped === null ? 'on its way' : 'stopped'}</span>
      )}
      <span className="max-[640px]:hidden">
        <PassageStrip stage={clip.stage} stopped={clip.stopped !== null} verdict={clip.verdict} />
      </span>
      <Time
        at={clip.receivedAt ?? clip.recordedAt}
        ago
        className="text-right text-13 text-ink-soft max-[640px]:hidden"
      />
    </Link>
  );
}
