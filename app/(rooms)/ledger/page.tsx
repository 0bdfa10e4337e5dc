import type { Metadata } from 'next';
import Link from 'next/link';
import { EntriesTable } from '@/components/custody/EntriesTable';
import { KindFilter } from '@/components/custody/KindFilter';
import { LiveRefresh } from '@/components/shell/LiveEvents';
import { hrefWith } from '@/components/ui/address';
import { ButtonLink } from '@/components/ui/Button';
import { Chip, Filters } from '@/components/ui/Chip';
import { EmptyState } from '@/components/ui/EmptyState';
import { PageHead } from '@/components/ui/PageHead';
import { SearchInput } from '@/components/ui/SearchInput';
import { findSubjects } from '@/lib/custody/findSubjects';
import { LedgerSearch, ledgerQuery } from '@/lib/custody/ledgerSearch';
import { logSize, readLedger } from '@/lib/custody/readThread';
import { requirePage } from '@/lib/http/page';
import { may } from '@/lib/identity/permissions';

export const metadata: Metadata = { title: 'Ledger' };

const LIMIT = 50;

/** The ledger: search for anything that has a thread, or read the log itself. Who is no auditor sees their own entries. */
export default async function LedgerPage({
  searchParams,
}: {
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await requirePage('thread.read');
  const search = await searchParams;
  const wanted = LedgerSearch.parse(search);
  const whole = may(person.roles, 'ledger.read');
  const found = whole && wanted.q !== '' ? await findSubjects(services, wanted.q) : [];
  const base = ledgerQuery(wanted, services.env.BELLKEEP_TIME_ZONE, services.clock.now());
  const [page, size] = await Promise.all([
    readLedger(services, {
      ...base,
      limit: LIMIT,
      ...(whole ? {} : { actor: { kind: 'person' as const, id: person.id } }),
      ...(wanted.q === '' || !whole ? {} : { subjects: found.map(({ kind, id }) => ({ kind, id })) }),
    }),
    logSize(services),
  ]);
  const link = (changes: Record<string, string | null>) =>
    hrefWith('/ledger', search, { before: null, ...changes });
  return (
    <>
      <LiveRefresh subjects={[{ kind: 'recording' }, { kind: 'device' }, { kind: 'person' }]} />
      <PageHead
        title="Ledger"
        action={whole ? <ButtonLink href="/ledger/heads">Tree heads</ButtonLink> : null}
      >
        {whole
          ? `The log holds ${size.toLocaleString('en-GB')} entries. Each is one line of what happened; none can be changed, removed or moved.`
          : 'What you did yourself. A recording’s whole thread is reached from its own page.'}
      </PageHead>
      <Filters>
        {whole ? (
          <SearchInput label="Recording, device, patient, encounter or person" className="max-w-[420px]" />
        ) : null}
        <KindFilter value={wanted.kind ?? ''} />
        <Chip href={link({ day: 'today' })} current={wanted.day === 'today'}>
          Today
        </Chip>
        <Chip href={link({ day: 'yesterday' })} current={wanted.day === 'yesterday'}>
          Yesterday
        </Chip>
        <Chip href={link({ day: null })} current={wanted.day === undefined}>
          Any day
        </Chip>
      </Filters>
      {found.length > 0 ? (
        <ul aria-label="Threads" className="mb-4 flex flex-wrap gap-x-6 gap-y-2">
          {found.map((subject) => (
            <li key={`${subject.kind} ${subject.id}`}>
              <Link
                className="link font-mono"
                href={
                  subject.kind === 'recording'
                    ? `/ledger/recordings/${subject.label}`
                    : `/ledger/${subject.kind}/${subject.id}`
                }
              >
                {subject.label}
              </Link>{' '}
              <span className="text-13 text-ink-soft">
                {subject.kind}
                {subject.detail ? `, ${subject.detail}` : ''}
              </span>
            </li>
          ))}
        </ul>
      ) : null}
      <EntriesTable
        rows={page.rows}
        olderHref={page.next === null ? null : link({ before: String(page.next) })}
        newerHref={wanted.before === undefined ? null : link({})}
        empty={
          <EmptyState
            title={
              wanted.q === ''
                ? 'No entries of this kind or day'
                : `Nothing in the log speaks of “${wanted.q}”`
            }
          >
            Search by a recording’s number, an asset tag, a record number, an encounter’s number or a name, or
            take a filter away.
          </EmptyState>
        }
      />
    </>
  );
}
