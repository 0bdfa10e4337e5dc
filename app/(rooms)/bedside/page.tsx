import type { Metadata } from 'next';
import Link from 'next/link';
import { EncountersTable } from '@/components/bedside/EncountersTable';
import { ReasonForm } from '@/components/bedside/ReasonForm';
import { hrefWith } from '@/components/ui/address';
import { ButtonLink } from '@/components/ui/Button';
import { Chip, Filters } from '@/components/ui/Chip';
import { PageHead } from '@/components/ui/PageHead';
import { SearchInput } from '@/components/ui/SearchInput';
import { countBedside, EncounterFilter, listEncounters } from '@/lib/filing/readEncounters';
import { readSearch } from '@/lib/http/address';
import { requirePage } from '@/lib/http/page';

export const metadata: Metadata = { title: 'Bedside' };

const joined = (names: string[]): string =>
  names.length < 2 ? (names[0] ?? '') : `${names.slice(0, -1).join(', ')} and ${names.at(-1)}`;

/** The wards' encounters: who can be listened to, and what was heard last. */
export default async function BedsidePage({
  searchParams,
}: {
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await requirePage('bedside.read');
  const search = await searchParams;
  const { filter, query } = readSearch(EncounterFilter, search);
  const [page, counts] = await Promise.all([
    listEncounters(services, person, filter),
    countBedside(services, person),
  ]);
  const link = (changes: Record<string, string | null>) =>
    hrefWith('/bedside', search, { after: null, ...changes });
  return (
    <>
      <PageHead
        title="Bedside"
        action={
          <ButtonLink href="/bedside/sessions/new" variant="primary">
            Open a listening session
          </ButtonLink>
        }
      >
        {counts.wards.length === 0 ? (
          'You are on no ward. Ask IT to put you on one; until then only patients you open with a reason are shown.'
        ) : (
          <>
            <Link href="/bedside">
              {counts.encounters} {counts.encounters === 1 ? 'encounter' : 'encounters'}
            </Link>{' '}
            on {joined(counts.wards.map((ward) => ward.name))}, {counts.sessions}{' '}
            {counts.sessions === 1 ? 'listening session' : 'listening sessions'} open,{' '}
            <Link href="/bedside/tray">
              {counts.tray} {counts.tray === 1 ? 'clip' : 'clips'} in the tray
            </Link>
            .
          </>
        )}
      </PageHead>
      <Filters>
        <SearchInput label="Name, record, encounter or bed" />
        {counts.wards.length > 1 ? (
          <Chip href={link({ ward: null })} current={filter.ward === undefined}>
            All my wards
          </Chip>
        ) : null}
        {counts.wards.length > 1
          ? counts.wards.map((ward) => (
              <Chip key={ward.id} href={link({ ward: ward.id })} current={filter.ward === ward.id}>
                {ward.name}
              </Chip>
            ))
          : null}
        <Chip
          href={link({ status: filter.status === 'all' ? null : 'all' })}
          current={filter.status === 'all'}
        >
          Ended ones too
        </Chip>
        <Chip href="/bedside/tray" current={false}>
          Tray {counts.tray}
        </Chip>
        <Chip href="/bedside/recordings" current={false}>
          Recordings
        </Chip>
      </Filters>
      <EncountersTable
        key={query}
        href={`/api/encounters${query}`}
        first={page}
        olderHref={page.next ? link({ after: page.next }) : null}
        newerHref={filter.after ? link({}) : null}
        filtered={filter.q !== '' || filter.ward !== undefined}
      />
      <div className="mt-4">
        <ReasonForm />
      </div>
    </>
  );
}
