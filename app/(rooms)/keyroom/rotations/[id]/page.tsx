import type { Metadata } from 'next';
import Link from 'next/link';
import { RunView } from '@/components/credentials/RunView';
import { hrefWith } from '@/components/ui/address';
import { Chip, Filters } from '@/components/ui/Chip';
import { PageHead } from '@/components/ui/PageHead';
import { readSearch } from '@/lib/http/address';
import { orNotFound, requirePage } from '@/lib/http/page';
import { MemberFilter, readRun } from '@/lib/rotation/readRuns';

export const metadata: Metadata = { title: 'Rotation run' };

const VIEWS = [
  ['stragglers', 'Not done yet'],
  ['done', 'Done'],
  ['missed', 'Missed'],
  ['left-out', 'Ended otherwise'],
] as const;

/** One rotation run, followed live. */
export default async function RotationPage({
  params,
  searchParams,
}: {
  params: Promise<{ id: string }>;
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await requirePage('credential.read');
  const { id } = await params;
  const search = await searchParams;
  const { filter, query } = readSearch(MemberFilter, search);
  const answer = await orNotFound(readRun(services, person, id, filter));
  const { counts } = answer.run;
  const path = `/keyroom/rotations/${id}`;
  const link = (changes: Record<string, string | null>) =>
    hrefWith(path, search, { after: null, ...changes });
  const countOf = (view: (typeof VIEWS)[number][0]) =>
    view === 'stragglers' ? counts.waiting + counts.asked : counts[view];
  return (
    <>
      <PageHead
        title={`Rotation run ${answer.run.label}`}
        back={<Link href="/keyroom/rotations">Rotation runs</Link>}
      />
      <Filters>
        {VIEWS.map(([view, label]) => (
          <Chip
            key={view}
            href={link({ view: view === 'stragglers' ? null : view })}
            current={filter.view === view}
          >
            {label} {countOf(view)}
          </Chip>
        ))}
      </Filters>
      <RunView
        key={query}
        href={`/api/rotations/${id}${query}`}
        first={answer}
        olderHref={answer.next ? link({ after: answer.next }) : null}
        newerHref={filter.after ? link({}) : null}
      />
    </>
  );
}
