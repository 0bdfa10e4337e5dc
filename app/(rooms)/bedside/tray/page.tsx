import type { Metadata } from 'next';
import Link from 'next/link';
import { TrayList } from '@/components/bedside/TrayList';
import { PageHead } from '@/components/ui/PageHead';
import { readTray } from '@/lib/filing/readClips';
import { countBedside } from '@/lib/filing/readEncounters';
import { requirePage } from '@/lib/http/page';

export const metadata: Metadata = { title: 'Tray' };

/** Recordings that nothing ties to an encounter yet. */
export default async function TrayPage({
  searchParams,
}: {
  searchParams: Promise<{ before?: string | string[] }>;
}) {
  const { person, services } = await requirePage('bedside.read');
  const before = Number([(await searchParams).before].flat()[0]) || undefined;
  const [page, counts] = await Promise.all([
    readTray(services, person, before),
    countBedside(services, person),
  ]);
  return (
    <>
      <PageHead title="Tray" back={<Link href="/bedside">Bedside</Link>}>
        {counts.tray === 0
          ? 'Every clip of your wards’ devices is filed.'
          : `${counts.tray} ${counts.tray === 1 ? 'clip waits' : 'clips wait'} to be filed to the right encounter and no other.`}
      </PageHead>
      <TrayList
        key={before ?? 0}
        href={`/api/tray${before === undefined ? '' : `?before=${before}`}`}
        first={JSON.parse(JSON.stringify(page))}
        olderHref={page.next === null ? null : `/bedside/tray?before=${page.next}`}
        newerHref={before === undefined ? null : '/bedside/tray'}
      />
    </>
  );
}
