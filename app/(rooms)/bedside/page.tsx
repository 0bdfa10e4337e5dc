import type { Metadata } from 'next';
import Link from 'next/link';
import { BedsideTabs } from '@/components/bedside/BedsideTabs';
import { CountsRefresh } from '@/components/bedside/CountsRefresh';
import { EncountersTable } from '@/components/bedside/EncountersTable';
import { ReasonAsked, ReasonButton } from '@/components/bedside/ReasonForm';
import { counted, joined } from '@/components/bedside/words';
import { hrefWith } from '@/components/ui/address';
import { ButtonLink } from '@/components/ui/Button';
import { Chip, Filters } from '@/components/ui/Chip';
import { PageHead } from '@/components/ui/PageHead';
import { SearchInput } from '@/components/ui/SearchInput';
import {
  type BedsideCounts,
  countBedside,
  EncounterFilter,
  listEncounters,
} from '@/lib/filing/readEncounters';
import { readSearch } from '@/lib/http/address';
import { requirePage } from '@/lib/http/page';
import { asksReasonFor } from '@/lib/http/reach';

export const metadata: Metadata = { title: 'Bedside' };

const TAP = 'min-h-11';

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
  const reason = page.rows.length === 0 ? await asksReasonFor(services, person, filter.q) : null;
  const link = (changes: Record<string, string | null>) =>
    hrefWith('/bedside', search, { after: null, ...changes });
  const filtered = filter.q !== '' || filter.ward !== undefined || filter.listening !== undefined;
  return (
    <>
      <CountsRefresh />
      <PageHead
        title="Bedside"
        action={
          <ButtonLink href="/bedside/sessions/new" variant="primary" className={TAP}>
            Open a listening session
          </ButtonLink>
        }
      >
        <Sentence counts={counts} />
      </PageHead>
      <BedsideTabs current="encounters" tray={counts.tray} />
      <Filters>
        <SearchInput label="Name, record, encounter or bed" className={TAP} />
        {counts.wards.length > 1 ? (
          <>
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
          </>
        ) : null}
        <Chip
          className={TAP}
          href={link({ listening: filter.listening ? null : 'open' })}
          current={filter.listening === 'open'}
        >
          Session open
        </Chip>
        <Chip
          className={TAP}
          href={link({ status: filter.status === 'all' ? null : 'all' })}
          current={filter.status === 'all'}
        >
          Ended ones too
        </Chip>
      </Filters>
      {reason ? (
        <ReasonAsked identifier={reason} />
      ) : (
        <>
          <EncountersTable
            key={query}
            href={`/api/encounters${query}`}
            first={page}
            nextHref={page.next ? link({ after: page.next }) : null}
            firstHref={filter.after ? link({}) : null}
            filtered={filtered}
          />
          <div className="mt-6">
            <ReasonButton />
          </div>
        </>
      )}
    </>
  );
}

function Sentence({ counts }: { counts: BedsideCounts }) {
  if (counts.wards.length === 0)
    return 'You are on no ward. Ask IT to put you on one; until then only patients you open with a reason are shown.';
  return (
    <>
      <Link href="/bedside">{counted(counts.encounters, 'encounter')}</Link> on{' '}
      {joined(counts.wards.map((ward) => ward.name))},{' '}
      <Link href="/bedside?listening=open">{counted(counts.listening, 'listening session')} open</Link>,{' '}
      <Link href="/bedside/tray">{counted(counts.tray, 'clip')} in the tray</Link>.
    </>
  );
}
