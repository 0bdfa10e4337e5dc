import type { Metadata } from 'next';
import { NewRunButton } from '@/components/credentials/NewRunButton';
import { RunsTable } from '@/components/credentials/RunsTable';
import { hrefWith } from '@/components/ui/address';
import { PageHead } from '@/components/ui/PageHead';
import { fleetChoices } from '@/lib/fleet/readFleet';
import { readSearch } from '@/lib/http/address';
import { requirePage } from '@/lib/http/page';
import { RunFilter, readRuns } from '@/lib/rotation/readRuns';

export const metadata: Metadata = { title: 'Rotation runs' };

/** Rotation runs, and the way to start one. */
export default async function RotationsPage({
  searchParams,
}: {
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await requirePage('credential.read');
  const search = await searchParams;
  const { filter, query } = readSearch(RunFilter, search);
  const [page, choices] = await Promise.all([
    readRuns(services, person, filter),
    fleetChoices(services, person),
  ]);
  return (
    <>
      <PageHead title="Rotation runs" action={<NewRunButton choices={choices} />}>
        Many credentials renewed in one act, in waves, without an outage.
      </PageHead>
      <RunsTable
        key={query}
        href={`/api/rotations${query}`}
        first={page}
        olderHref={page.next ? hrefWith('/keyroom/rotations', search, { after: page.next }) : null}
        newerHref={filter.after ? '/keyroom/rotations' : null}
      />
    </>
  );
}
