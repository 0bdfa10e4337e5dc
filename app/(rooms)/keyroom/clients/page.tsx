import type { Metadata } from 'next';
import { ClientsTable } from '@/components/keyroom/ClientsTable';
import { NewClientButton } from '@/components/keyroom/NewClientButton';
import { hrefWith } from '@/components/ui/address';
import { Chip, Filters } from '@/components/ui/Chip';
import { PageHead } from '@/components/ui/PageHead';
import { SearchInput } from '@/components/ui/SearchInput';
import { ClientFilter, readClients } from '@/lib/clients/readClients';
import { readSearch } from '@/lib/http/address';
import { requirePage } from '@/lib/http/page';

export const metadata: Metadata = { title: 'API clients' };

/** Other systems that read from here. */
export default async function ClientsPage({
  searchParams,
}: {
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await requirePage('connections.read');
  const search = await searchParams;
  const { filter, query } = readSearch(ClientFilter, search);
  const page = await readClients(services, person, filter);
  const link = (changes: Record<string, string | null>) =>
    hrefWith('/keyroom/clients', search, { after: null, ...changes });
  return (
    <>
      <PageHead title="API clients" action={<NewClientButton />}>
        Other systems read at <span className="mono">{services.env.BELLKEEP_ORIGIN}/api/v1</span>, with a
        token from <span className="mono">/api/v1/token</span> that lives ten minutes.
      </PageHead>
      <Filters>
        <SearchInput label="Name or client id" />
        <Chip href={link({ view: null })} current={filter.view === 'living'}>
          In use
        </Chip>
        <Chip href={link({ view: 'revoked' })} current={filter.view === 'revoked'}>
          Revoked
        </Chip>
      </Filters>
      <ClientsTable
        key={query}
        href={`/api/clients${query}`}
        first={page}
        olderHref={page.next ? link({ after: page.next }) : null}
        newerHref={filter.after ? link({}) : null}
        filtered={query !== ''}
      />
      <p className="mt-6 max-w-line text-13 text-ink-soft">
        A token: POST <span className="mono">grant_type=client_credentials</span> as a form, with client id
        and secret by HTTP Basic (RFC 6749), or with an assertion signed by the client’s own key (RFC 7523).
        Then <span className="mono">/recordings</span>, <span className="mono">/devices</span> and{' '}
        <span className="mono">/ledger</span>, each a page at a time: give <span className="mono">next</span>{' '}
        back as <span className="mono">after</span>.
      </p>
    </>
  );
}
