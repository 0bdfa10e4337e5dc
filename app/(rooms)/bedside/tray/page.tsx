import type { Metadata } from 'next';
import { BedsideTabs } from '@/components/bedside/BedsideTabs';
import { CountsRefresh } from '@/components/bedside/CountsRefresh';
import { TrayList } from '@/components/bedside/TrayList';
import { PageHead } from '@/components/ui/PageHead';
import { countBedside } from '@/lib/filing/readEncounters';
import { readTray, TrayFilter } from '@/lib/filing/readTray';
import { readSearch } from '@/lib/http/address';
import { requirePage } from '@/lib/http/page';

export const metadata: Metadata = { title: 'Tray' };

/** Recordings that nothing ties to an encounter yet. */
export default async function TrayPage({
  searchParams,
}: {
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await requirePage('bedside.read');
  const { filter, query } = readSearch(TrayFilter, await searchParams);
  const [page, counts] = await Promise.all([
    readTray(services, person, filter),
    countBedside(services, person),
  ]);
  return (
    <>
      <CountsRefresh />
      <PageHead title="Tray">
        {counts.tray === 0
          ? 'Every clip of your wards’ devices is filed.'
          : `${counts.tray} ${counts.tray === 1 ? 'clip waits' : 'clips wait'} to be filed to the right encounter and no other.`}
      </PageHead>
      <BedsideTabs current="tray" tray={counts.tray} />
      <TrayList
        key={query}
        href={`/api/tray${query}`}
        first={page}
        olderHref={page.next === null ? null : `/bedside/tray?before=${page.next}`}
        newerHref={filter.before === undefined ? null : '/bedside/tray'}
      />
    </>
  );
}
