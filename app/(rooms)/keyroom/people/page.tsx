import type { Metadata } from 'next';
import Link from 'next/link';
import { InviteButton } from '@/components/identity/InviteButton';
import { PeopleTable } from '@/components/identity/PeopleTable';
import { PeopleTabs } from '@/components/identity/PeopleTabs';
import { LiveRefresh } from '@/components/shell/LiveEvents';
import { hrefWith } from '@/components/ui/address';
import { Chip, Filters } from '@/components/ui/Chip';
import { PageHead } from '@/components/ui/PageHead';
import { SearchInput } from '@/components/ui/SearchInput';
import { readSearch } from '@/lib/http/address';
import { requirePage } from '@/lib/http/page';
import { listWards } from '@/lib/identity/describePerson';
import { countInvitations } from '@/lib/identity/listInvitations';
import { countPeople, listPeople, type PeopleCounts, PeopleFilter } from '@/lib/identity/listPeople';
import { ROLE_NAMES, ROLES } from '@/lib/identity/permissions';

export const metadata: Metadata = { title: 'People' };

const people = (n: number) => `${n.toLocaleString('en-GB')} ${n === 1 ? 'person has' : 'people have'}`;

/** Who has an account, with which roles. */
export default async function PeoplePage({
  searchParams,
}: {
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await requirePage('people.read');
  const search = await searchParams;
  const { filter, query } = readSearch(PeopleFilter, search);
  const [page, counts, invitations, wards] = await Promise.all([
    listPeople(services, person, filter),
    countPeople(services, person),
    countInvitations(services, person),
    listWards(services),
  ]);
  const link = (changes: Record<string, string | null>) =>
    hrefWith('/keyroom/people', search, { after: null, ...changes });
  const here = link({});
  return (
    <>
      <LiveRefresh subjects={[{ kind: 'person' }, { kind: 'invitation' }]} />
      <PageHead title="People" action={<InviteButton wards={wards} />}>
        {people(counts.here)} an account.{' '}
        {counts.withoutSecondFactor > 0 ? (
          <>
            <Link href="/keyroom/people?role=itadmin">
              {counts.withoutSecondFactor} IT{' '}
              {counts.withoutSecondFactor === 1 ? 'administrator has' : 'administrators have'}
            </Link>{' '}
            no second factor yet and can do nothing until it is set up.
          </>
        ) : (
          'Every IT administrator has a second factor.'
        )}
      </PageHead>
      <PeopleTabs current="people" open={invitations.open} />
      <PeopleFilters filter={filter} counts={counts} link={link} />
      <PeopleTable
        key={query}
        query={query}
        first={page}
        left={filter.left === 'yes'}
        firstHref={filter.after === undefined ? null : here}
        nextHref={`${here}${here.includes('?') ? '&' : '?'}`}
      />
    </>
  );
}

function PeopleFilters({
  filter,
  counts,
  link,
}: {
  filter: PeopleFilter;
  counts: PeopleCounts;
  link: (changes: Record<string, string | null>) => string;
}) {
  return (
    <Filters>
      <SearchInput label="Name, address or work" />
      <Chip
        href={link({ role: null, left: null })}
        current={filter.role === undefined && filter.left === undefined}
      >
        All
      </Chip>
      {ROLES.map((role) => (
        <Chip key={role} href={link({ role, left: null })} current={filter.role === role}>
          {ROLE_NAMES[role]} {counts.byRole[role]}
        </Chip>
      ))}
      {counts.left > 0 ? (
        <Chip href={link({ role: null, left: 'yes' })} current={filter.left === 'yes'}>
          Left {counts.left}
        </Chip>
      ) : null}
    </Filters>
  );
}
