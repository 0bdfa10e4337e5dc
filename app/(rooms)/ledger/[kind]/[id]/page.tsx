import type { Metadata } from 'next';
import { notFound } from 'next/navigation';
import { EntriesTable } from '@/components/custody/EntriesTable';
import { VerifyThread } from '@/components/custody/VerifyThread';
import { EmptyState } from '@/components/ui/EmptyState';
import { PageHead } from '@/components/ui/PageHead';
import { Time } from '@/components/ui/Time';
import { nameSubject } from '@/lib/custody/nameSubject';
import { readThread, threadExtent } from '@/lib/custody/readThread';
import { requirePage } from '@/lib/http/page';
import { mayReadThread } from '@/lib/http/threadAccess';

export const metadata: Metadata = { title: 'Thread' };

type Props = {
  params: Promise<{ kind: string; id: string }>;
  searchParams: Promise<{ before?: string | string[] }>;
};

/** Everything that speaks of one device, patient, person, encounter, session or credential. */
export default async function SubjectThreadPage({ params, searchParams }: Props) {
  const { person, services } = await requirePage('thread.read');
  const { kind, id } = await params;
  const subject = await nameSubject(services, kind, id);
  if (!subject || !mayReadThread(person, subject.kind)) notFound();
  const before = Number((await searchParams).before) || undefined;
  const [page, extent] = await Promise.all([
    readThread(services, subject, { before, limit: 50 }),
    threadExtent(services, subject),
  ]);
  const path = `/ledger/${kind}/${id}`;
  return (
    <>
      <PageHead title={`Entries on ${subject.label}`}>
        {extent.count === 0 ? (
          'Nothing in the log speaks of it yet.'
        ) : (
          <>
            {extent.count.toLocaleString('en-GB')} {extent.count === 1 ? 'entry' : 'entries'}, from{' '}
            <Time at={extent.first} mode="minute" /> to <Time at={extent.last} mode="minute" withZone />.
          </>
        )}
      </PageHead>
      <EntriesTable
        rows={page.rows}
        olderHref={page.next === null ? null : `${path}?before=${page.next}`}
        newerHref={before === undefined ? null : path}
        empty={
          <EmptyState title="No entries">
            Whatever happens to {subject.label} from now on will stand here.
          </EmptyState>
        }
      />
      {page.rows.length > 0 ? (
        <div className="mt-6 max-w-[480px]">
          <VerifyThread
            number={null}
            mayOpen={false}
            thread={{
              sha256: null,
              entries: page.rows.map(({ sequence, canonical, leafHash }) => ({
                sequence,
                canonical,
                leafHash,
              })),
            }}
          />
        </div>
      ) : null}
    </>
  );
}
