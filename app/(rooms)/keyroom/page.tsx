import type { Metadata } from 'next';
import Link from 'next/link';
import { CredentialsTable } from '@/components/credentials/CredentialsTable';
import { hrefWith } from '@/components/ui/address';
import { ButtonLink } from '@/components/ui/Button';
import { Chip, Filters } from '@/components/ui/Chip';
import { PageHead } from '@/components/ui/PageHead';
import { SearchInput } from '@/components/ui/SearchInput';
import { CredentialFilter, countCredentials, listCredentials } from '@/lib/credentials/readCredentials';
import { readSearch } from '@/lib/http/address';
import { requirePage } from '@/lib/http/page';

export const metadata: Metadata = { title: 'Credentials' };

const VIEWS = [
  ['living', 'Living'],
  ['ending', 'Ending in 14 days'],
  ['asked', 'Asked to renew'],
  ['superseded', 'In overlap'],
  ['bearer', 'Bearer only'],
  ['ended', 'Ended'],
] as const;

/** Every credential and when it ends. */
export default async function CredentialsPage({
  searchParams,
}: {
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await requirePage('credential.read');
  const search = await searchParams;
  const { filter, query } = readSearch(CredentialFilter, search);
  const [page, counts] = await Promise.all([
    listCredentials(services, person, filter),
    countCredentials(services, person),
  ]);
  const link = (changes: Record<string, string | null>) =>
    hrefWith('/keyroom', search, { after: null, ...changes });
  return (
    <>
      <PageHead title="Credentials" action={<ButtonLink href="/keyroom/people">People</ButtonLink>}>
        <Link href="/keyroom">
          {counts.living.toLocaleString('en-GB')}{' '}
          {counts.living === 1 ? 'credential lives' : 'credentials live'}
        </Link>
        ,{' '}
        {counts.ending > 0 ? (
          <Link href="/keyroom?view=ending">
            {counts.ending} {counts.ending === 1 ? 'ends' : 'end'} in 14 days
          </Link>
        ) : (
          'none ends in 14 days'
        )}
        {counts.bearer > 0 ? (
          <>
            ,{' '}
            <Link href="/keyroom?view=bearer">
              {counts.bearer} {counts.bearer === 1 ? 'is' : 'are'} bearer only
            </Link>
          </>
        ) : null}
        .
      </PageHead>
      <Filters>
        <SearchInput label="Asset tag, serial, credential or key" />
        {VIEWS.map(([value, label]) => (
          <Chip
            key={value}
            href={link({ view: value === 'living' ? null : value })}
            current={filter.view === value}
          >
            {label} {counts[value]}
          </Chip>
        ))}
      </Filters>
      <CredentialsTable
        key={query}
        href={`/api/credentials${query}`}
        first={page as never}
        olderHref={page.next ? link({ after: page.next }) : null}
        newerHref={filter.after ? link({}) : null}
        filtered={query !== ''}
      />
    </>
  );
}
