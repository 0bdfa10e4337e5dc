import type { Metadata } from 'next';
import Link from 'next/link';
import { FleetFilters } from '@/components/fleet/FleetFilters';
import { FleetTable } from '@/components/fleet/FleetTable';
import { hrefWith } from '@/components/ui/address';
import { ButtonLink } from '@/components/ui/Button';
import { PageHead } from '@/components/ui/PageHead';
import { countFleet, FleetFilter, fleetChoices, readFleet } from '@/lib/fleet/readFleet';
import { readSearch } from '@/lib/http/address';
import { requirePage } from '@/lib/http/page';
import { may } from '@/lib/identity/permissions';

export const metadata: Metadata = { title: 'Fleet' };

const devices = (n: number) => `${n.toLocaleString('en-GB')} ${n === 1 ? 'device' : 'devices'}`;

/** The fleet: who is in service, due, quiet, quarantined. */
export default async function FleetPage({
  searchParams,
}: {
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await requirePage('fleet.read');
  const search = await searchParams;
  const { filter, query } = readSearch(FleetFilter, search);
  const [page, counts, choices] = await Promise.all([
    readFleet(services, person, filter),
    countFleet(services, person),
    fleetChoices(services, person),
  ]);
  const link = (changes: Record<string, string | null>) =>
    hrefWith('/bench', search, { after: null, ...changes });
  const mayWrite = may(person.roles, 'fleet.write');
  return (
    <>
      <PageHead
        title="Fleet"
        action={
          mayWrite ? (
            <>
              <ButtonLink href="/bench/models">Models</ButtonLink>
              <ButtonLink href="/bench/add" variant="primary">
                Add a device
              </ButtonLink>
            </>
          ) : null
        }
      >
        <Link href="/bench?state=in-service">{devices(counts.inService)}</Link> in service.{' '}
        {counts.due > 0 ? (
          <>
            <Link href="/bench?due=check">
              {counts.due} {counts.due === 1 ? 'is' : 'are'} due
            </Link>{' '}
            for an acoustic check this week
          </>
        ) : (
          'None is due for an acoustic check this week'
        )}
        {counts.quarantined > 0 ? (
          <>
            ,{' '}
            <Link href="/bench?state=quarantined">
              {counts.quarantined} {counts.quarantined === 1 ? 'is' : 'are'} quarantined
            </Link>
          </>
        ) : null}
        {counts.quiet > 0 ? (
          <>
            , and{' '}
            <Link href="/bench?due=quiet">
              {counts.quiet} {counts.quiet === 1 ? 'has' : 'have'} gone quiet
            </Link>
          </>
        ) : null}
        .
      </PageHead>
      <FleetFilters search={search} counts={counts} choices={choices} filter={filter} />
      <FleetTable
        key={query}
        href={`/api/devices${query}`}
        first={page}
        csvHref={`/api/devices/csv${query.replace(/[?&](after|limit)=[^&]*/g, '').replace(/^&/, '?')}`}
        olderHref={page.next ? link({ after: page.next }) : null}
        newerHref={filter.after ? link({}) : null}
        mayWrite={mayWrite}
        filtered={query !== ''}
      />
    </>
  );
}
