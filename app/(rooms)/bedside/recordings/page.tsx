import type { Metadata } from 'next';
import Link from 'next/link';
import { ClipsTable } from '@/components/bedside/ClipsTable';
import { hrefWith } from '@/components/ui/address';
import { Chip, Filters } from '@/components/ui/Chip';
import { EmptyState } from '@/components/ui/EmptyState';
import { PageHead } from '@/components/ui/PageHead';
import { SearchInput } from '@/components/ui/SearchInput';
import { ClipFilter, listClips } from '@/lib/filing/readClips';
import { readSearch } from '@/lib/http/address';
import { requirePage } from '@/lib/http/page';

export const metadata: Metadata = { title: 'Recordings' };

const VERDICTS = [
  ['usable', 'Usable'],
  ['care', 'Use with care'],
  ['repeat', 'Record again'],
] as const;

/** What was recorded on one's wards, newest first. */
export default async function RecordingsPage({
  searchParams,
}: {
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await requirePage('bedside.read');
  const search = await searchParams;
  const { filter, query } = readSearch(ClipFilter, search);
  const page = await listClips(services, person, filter);
  const link = (changes: Record<string, string | null>) =>
    hrefWith('/bedside/recordings', search, { before: null, ...changes });
  return (
    <>
      <PageHead title="Recordings" back={<Link href="/bedside">Bedside</Link>}>
        What was recorded on your wards and filed, newest first. Stray clips are in the{' '}
        <Link href="/bedside/tray">tray</Link>.
      </PageHead>
      <Filters>
        <SearchInput label="Recording, record number or family name" />
        <Chip href={link({ verdict: null })} current={filter.verdict === undefined}>
          Any verdict
        </Chip>
        {VERDICTS.map(([value, word]) => (
          <Chip key={value} href={link({ verdict: value })} current={filter.verdict === value}>
            {word}
          </Chip>
        ))}
        {filter.device ? (
          <Chip href={link({ device: null })} current>
            Only {filter.device}
          </Chip>
        ) : null}
      </Filters>
      <ClipsTable
        key={query}
        href={`/api/recordings${query}`}
        first={JSON.parse(JSON.stringify(page))}
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
