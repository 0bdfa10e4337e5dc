import type { Metadata } from 'next';
import Link from 'next/link';
import { BedsideTabs } from '@/components/bedside/BedsideTabs';
import { ClipFilters } from '@/components/bedside/ClipFilters';
import { ClipsTable } from '@/components/bedside/ClipsTable';
import { CountsRefresh } from '@/components/bedside/CountsRefresh';
import { hrefWith } from '@/components/ui/address';
import { Chip, Filters } from '@/components/ui/Chip';
import { EmptyState } from '@/components/ui/EmptyState';
import { PageHead } from '@/components/ui/PageHead';
import { SearchInput } from '@/components/ui/SearchInput';
import { countBedside } from '@/lib/filing/readEncounters';
import { ClipFilter, listClips } from '@/lib/filing/readRecordings';
import { readSearch } from '@/lib/http/address';
import { requirePage } from '@/lib/http/page';

export const metadata: Metadata = { title: 'Recordings' };

const VERDICTS = [
  ['usable', 'Usable'],
  ['care', 'Use with care'],
  ['repeat', 'Record again'],
] as const;
const TAP = 'min-h-11';

/** What was recorded on one's wards, newest first. */
export default async function RecordingsPage({
  searchParams,
}: {
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await requirePage('bedside.read');
  const search = await searchParams;
  const { filter, query } = readSearch(ClipFilter, search);
  const [page, counts] = await Promise.all([
    listClips(services, person, filter),
    countBedside(services, person),
  ]);
  const link = (changes: Record<string, string | null>) =>
    hrefWith('/bedside/recordings', search, { before: null, ...changes });
  return (
    <>
      <CountsRefresh />
      <PageHead title="Recordings">
        What was recorded on your wards and filed, newest first. Stray clips are in the{' '}
        <Link href="/bedside/tray">tray</Link>.
      </PageHead>
      <BedsideTabs current="recordings" tray={counts.tray} />
      <Filters>
        <SearchInput label="Recording, record, encounter or family name" className={TAP} />
        <Chip className={TAP} href={link({ verdict: null })} current={filter.verdict === undefined}>
          Any verdict
        </Chip>
        {VERDICTS.map(([value, word]) => (
          <Chip
            key={value}
            className={TAP}
            href={link({ verdict: value })}
            current={filter.verdict === value}
          >
            {word}
          </Chip>
        ))}
      </Filters>
      {counts.wards.length > 1 ? (
        <Filters label="Wards">
          <Chip className={TAP} href={link({ ward: null })} current={filter.ward === undefined}>
            All my wards
          </Chip>
          {counts.wards.map((ward) => (
            <Chip
              key={ward.id}
              className={TAP}
              href={link({ ward: ward.id })}
              current={filter.ward === ward.id}
            >
              {ward.name}
            </Chip>
          ))}
        </Filters>
      ) : null}
      <ClipFilters from={filter.from} to={filter.to} device={filter.device} />
      <ClipsTable
        key={query}
        href={`/api/recordings${query}`}
        first={page}
        withPatient
        olderHref={page.next ? link({ before: page.next }) : null}
        newerHref={filter.before ? link({}) : null}
        empty={
          <EmptyState title={query === '' ? 'No recordings on your wards yet' : 'No recording matches'}>
            {query === ''
              ? 'Open a listening session and record: the clip files itself.'
              : 'Take a filter away.'}
          </EmptyState>
        }
      />
    </>
  );
}
