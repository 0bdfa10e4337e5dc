import type { Metadata } from 'next';
import { InvitationsTable } from '@/components/identity/InvitationsTable';
import { InviteButton } from '@/components/identity/InviteButton';
import { PeopleTabs } from '@/components/identity/PeopleTabs';
import { LiveRefresh } from '@/components/shell/LiveEvents';
import { hrefWith } from '@/components/ui/address';
import { Chip, Filters } from '@/components/ui/Chip';
import { PageHead } from '@/components/ui/PageHead';
import { readSearch } from '@/lib/http/address';
import { requirePage } from '@/lib/http/page';
import { listWards } from '@/lib/identity/describePerson';
import { countInvitations, InvitationFilter, listInvitations } from '@/lib/identity/listInvitations';

export const metadata: Metadata = { title: 'Invitations' };

const VIEWS = { open: 'Open', accepted: 'Taken up', withdrawn: 'Withdrawn', ended: 'Ended by themselves' };

/** Who was invited, and what came of it. */
export default async function InvitationsPage({
  searchParams,
}: {
  searchParams: Promise<Record<string, string | string[] | undefined>>;
}) {
  const { person, services } = await requirePage('people.read');
  const search = await searchParams;
  const { filter, query } = readSearch(InvitationFilter, search);
  const [page, counts, wards] = await Promise.all([
    listInvitations(services, person, filter),
    countInvitations(services, person),
    listWards(services),
  ]);
  const link = (changes: Record<string, string | null>) =>
    hrefWith('/keyroom/people/invitations', search, { after: null, ...changes });
  const here = link({});
  return (
    <>
      <LiveRefresh subjects={[{ kind: 'invitation' }]} />
      <PageHead title="Invitations" action={<InviteButton wards={wards} />}>
        {counts.open === 0
          ? 'No invitation is open.'
          : `${counts.open} ${counts.open === 1 ? 'invitation is' : 'invitations are'} open.`}{' '}
        Each works once, within seven days.
      </PageHead>
      <PeopleTabs current="invitations" open={counts.open} />
      <Filters>
        {(Object.keys(VIEWS) as (keyof typeof VIEWS)[]).map((view) => (
          <Chip
            key={view}
            href={link({ view: view === 'open' ? null : view })}
            current={filter.view === view}
          >
            {VIEWS[view]} {counts[view]}
          </Chip>
        ))}
      </Filters>
      <InvitationsTable
        key={query}
        view={filter.view}
        query={query}
        first={page}
        firstHref={filter.after === undefined ? null : here}
        nextHref={`${here}${here.includes('?') ? '&' : '?'}`}
      />
    </>
  );
}
